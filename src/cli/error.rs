//! A failure as the person at the command line sees it.

use std::io;
use std::path::Path;

use crate::store::StoreError;

/// What ends a command early: a message and an exit code.
#[derive(Debug)]
pub struct CliError {
    message: String,
    code: u8,
    closed_pipe: bool,
}

impl CliError {
    /// A mistake in what was given: exit code 2.
    pub fn input(message: impl Into<String>) -> Self {
        CliError {
            message: message.into(),
            code: 2,
            closed_pipe: false,
        }
    }

    /// A failure of the machine: exit code 1.
    pub fn failed(message: impl Into<String>) -> Self {
        CliError {
            code: 1,
            ..CliError::input(message)
        }
    }

    /// A file that could not be read or written.
    pub fn file(path: &Path, doing: &str, error: &io::Error) -> Self {
        CliError::failed(format!("{}: {doing}: {error}", path.display()))
    }

    /// The exit code.
    pub fn exit_code(&self) -> u8 {
        self.code
    }

    /// The message.
    pub fn message(&self) -> &str {
        &self.message
    }

    /// Whether the reader of our output went away, which is not a failure
    /// (`strandline ranking RUN | head -3`).
    pub fn is_closed_pipe(&self) -> bool {
        self.closed_pipe
    }
}

impl From<StoreError> for CliError {
    fn from(error: StoreError) -> Self {
        match error {
            StoreError::Damaged { .. } => CliError::failed(error.to_string()),
            StoreError::Write { .. } => CliError::failed(error.to_string()),
            _ => CliError::input(error.to_string()),
        }
    }
}

impl From<io::Error> for CliError {
    fn from(error: io::Error) -> Self {
        CliError {
            closed_pipe: error.kind() == io::ErrorKind::BrokenPipe,
            ..CliError::failed(format!("the output cannot be written: {error}"))
        }
    }
}
