//! The command line: arguments as typed, text on the terminal, exit codes. It sees the library's public interface alone.

mod args;
mod check;
mod explain;
mod progress;
mod say;

pub use args::parse;
pub use say::{Done, Stop};

use args::{Command, Typed};

/// Does what was typed.
///
/// # Errors
/// What stopped it, to be said on stderr.
pub fn run(typed: &Typed) -> Result<Done, Stop> {
    match &typed.command {
        Command::Check(asked) => check::run(asked, false),
        Command::Map(asked) => check::run(asked, true),
        Command::Explain(asked) => explain::run(asked.code.as_deref()),
    }
}
