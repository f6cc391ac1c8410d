//! What the commands share when they write to the terminal.

use std::io::{self, IsTerminal, Write};

use super::error::CliError;

/// The width to wrap text at: that of the terminal, within reason.
pub(super) fn width() -> usize {
    let columns = std::env::var("COLUMNS")
        .ok()
        .and_then(|text| text.parse::<usize>().ok());
    columns.unwrap_or(100).clamp(60, 120)
}

/// Prints a failure.
pub(super) fn complain(error: &CliError) {
    // When standard error is closed there is nobody left to tell.
    let _ = writeln!(io::stderr(), "strandline: {}", error.message());
}

/// Prints a remark that is not part of the result.
pub(super) fn remark(text: &str) {
    let _ = writeln!(io::stderr(), "{text}");
}

/// Whether a person watches standard error.
pub(super) fn is_watched() -> bool {
    io::stderr().is_terminal()
}

/// Writes a result to standard output in one go.
pub(super) fn print(text: &str) -> Result<(), CliError> {
    let mut output = io::stdout().lock();
    output.write_all(text.as_bytes())?;
    output.flush()?;
    Ok(())
}

/// Writes a document as JSON to standard output.
pub(super) fn print_json(document: &impl serde::Serialize) -> Result<(), CliError> {
    let text = serde_json::to_string_pretty(document)
        .map_err(|error| CliError::failed(format!("the result cannot be written: {error}")))?;
    print(&(text + "\n"))
}
