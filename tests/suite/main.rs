//! The one test binary. Each module is one kind of test.

mod hydraulic;
mod numbers;
mod properties;
mod sample_town;
