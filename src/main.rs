//! The command line: understand what was typed, do it, say what came of it, exit.

mod cli;

use std::process::ExitCode;

fn main() -> ExitCode {
    let typed = match cli::parse(std::env::args_os()) {
        Ok(typed) => typed,
        Err(stop) => return stop.say(),
    };
    match cli::run(&typed) {
        Ok(done) => done.say(),
        Err(stop) => stop.say(),
    }
}
