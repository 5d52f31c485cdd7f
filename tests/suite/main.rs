//! The one test binary. Each module is one kind of test.

mod calculation;
mod cases;
mod columns;
mod command;
mod damaged_files;
mod generated;
mod hydraulic;
mod numbers;
mod poor_maps;
mod properties;
mod recheck;
mod sample_town;
mod study_file;
mod tidy;
mod verdicts;
