//! Errors: the run cannot go on. Each is a sentence that names the file and says what to do.

use std::path::{Path, PathBuf};

/// Why a run could not go on.
#[derive(Debug, thiserror::Error)]
pub enum Error {
    /// A file could not be opened, read or written.
    #[error("{}: cannot {doing}: {cause}", path.display())]
    File {
        /// The file.
        path: PathBuf,
        /// What was being done, as a verb: "open", "read", "write", "rename".
        doing: &'static str,
        /// What the system said.
        cause: std::io::Error,
    },
    /// A file was read, but what stands in it cannot be used.
    #[error("{}: {what}. {todo}", path.display())]
    Input {
        /// The file.
        path: PathBuf,
        /// What is wrong, with the row, column or key, without a full stop.
        what: String,
        /// What to do, as a full sentence.
        todo: String,
    },
    /// The study asks for something that cannot be done.
    #[error("{}: {what}. {todo}", path.display())]
    Study {
        /// The study file.
        path: PathBuf,
        /// What is wrong, with the key, without a full stop.
        what: String,
        /// What to do, as a full sentence.
        todo: String,
    },
    /// The caller asked to stop.
    #[error("stopped before the end; nothing was written")]
    Cancelled,
}

impl Error {
    /// A file that could not be opened, read or written.
    pub fn file(path: &Path, doing: &'static str, cause: std::io::Error) -> Self {
        Error::File {
            path: path.to_path_buf(),
            doing,
            cause,
        }
    }

    /// A file whose content cannot be used.
    pub fn input(path: &Path, what: impl Into<String>, todo: impl Into<String>) -> Self {
        Error::Input {
            path: path.to_path_buf(),
            what: what.into(),
            todo: todo.into(),
        }
    }

    /// A study that asks for what cannot be done.
    pub fn study(path: &Path, what: impl Into<String>, todo: impl Into<String>) -> Self {
        Error::Study {
            path: path.to_path_buf(),
            what: what.into(),
            todo: todo.into(),
        }
    }
}
