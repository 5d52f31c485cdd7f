//! What is said at the end, and the exit code.

use std::io::{self, IsTerminal, Write};
use std::process::ExitCode;

use gradeline::finding::Error;

/// Done.
const DONE: u8 = 0;
/// Done, with findings at or above `--fail-at`.
const FINDINGS: u8 = 1;
/// Not understood, or could not be done.
const COULD_NOT: u8 = 2;
/// Done, but a case is not proved.
const NOT_PROVED: u8 = 3;

/// What was done.
#[derive(Debug, Default)]
pub struct Done {
    /// What to print; empty for nothing.
    pub text: String,
    /// Whether there are findings at or above the severity that was asked about.
    pub failing_findings: bool,
    /// Whether a case did not settle.
    pub not_proved: bool,
}

impl Done {
    /// Prints, and gives the exit code. That a case is not proved weighs more than any finding.
    pub fn say(&self) -> ExitCode {
        if let Err(cause) = print(&self.text) {
            return Stop::Output(cause).say();
        }
        ExitCode::from(self.code())
    }

    fn code(&self) -> u8 {
        match (self.not_proved, self.failing_findings) {
            (true, _) => NOT_PROVED,
            (false, true) => FINDINGS,
            (false, false) => DONE,
        }
    }
}

/// Why the program stops early.
#[derive(Debug)]
pub enum Stop {
    /// Help or version that was asked for, or words that were not understood.
    Usage(clap::Error),
    /// The run could not go on.
    Run(Error),
    /// A code that no finding has, in a sentence.
    UnknownCode(String),
    /// The results could not be printed.
    Output(io::Error),
}

impl Stop {
    /// Prints why, and gives the exit code.
    pub fn say(&self) -> ExitCode {
        let sentence = match self {
            Stop::Usage(usage) => {
                // Nothing is left to tell anyone when this print fails.
                let _ = usage.print();
                return ExitCode::from(if usage.use_stderr() { COULD_NOT } else { DONE });
            }
            Stop::Run(error) => error.to_string(),
            Stop::UnknownCode(sentence) => sentence.clone(),
            Stop::Output(cause) => format!("cannot print the results: {cause}"),
        };
        let label = if io::stderr().is_terminal() {
            "\u{1b}[1;31merror\u{1b}[0m"
        } else {
            "error"
        };
        // As above.
        let _ = writeln!(io::stderr(), "{label}: {sentence}");
        ExitCode::from(COULD_NOT)
    }
}

/// Prints to stdout. A reader that has gone away (`gradeline ... | head`) is no trouble.
fn print(text: &str) -> io::Result<()> {
    let mut out = io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(cause) if cause.kind() == io::ErrorKind::BrokenPipe => Ok(()),
        other => other,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn that_a_case_is_not_proved_weighs_more_than_any_finding() {
        let code = |not_proved, failing_findings| {
            let text = String::new();
            Done {
                text,
                failing_findings,
                not_proved,
            }
            .code()
        };
        assert_eq!(
            [
                code(false, false),
                code(false, true),
                code(true, false),
                code(true, true)
            ],
            [0, 1, 3, 3]
        );
    }
}
