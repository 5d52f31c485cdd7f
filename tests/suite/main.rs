//! The one test binary. Each module is one kind of test.
