//! `strandline equal`: whether two templates are the same.

use std::path::PathBuf;

use clap::Args;
use serde::Serialize;

use super::arguments::ReadOptions;
use super::error::CliError;
use super::measure::read_template;
use super::terminal;
use crate::comparison::{Answer, OnData, compare, on_data};
use crate::report;

/// Whether two templates say the same, whatever the data.
#[derive(Debug, Args)]
#[command(
    before_help = "Example:\n  strandline equal 'throughout [0, end] (throughout [0, ?] (speed <= ?))' \
    'throughout [0, end] (speed <= ?)'",
    after_help = "Both are judged outermost, with their slots free: the same when each can say, by \
    the choice of its slots, whatever the other can say. Recorded channels are taken to be known \
    at every sample. The exit code is 0 whatever the answer."
)]
pub(super) struct Arguments {
    /// A template, or a formula without slots
    #[arg(value_name = "TEXT")]
    first: String,
    /// Another one
    #[arg(value_name = "TEXT")]
    second: String,
    /// Also compare them on these traces: a CSV file, or a folder of them
    #[arg(long, value_name = "TRACES")]
    on: Option<PathBuf>,
    #[command(flatten)]
    how: ReadOptions,
    /// Print JSON
    #[arg(long)]
    json: bool,
}

/// What is printed as JSON.
#[derive(Serialize)]
struct Printed {
    #[serde(flatten)]
    answer: Answer,
    #[serde(skip_serializing_if = "Option::is_none")]
    on: Option<OnData>,
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let first = read_template(&arguments.first)?;
    let second = read_template(&arguments.second)?;
    let on = match &arguments.on {
        None => None,
        Some(path) => {
            let mut traces = arguments.how.load(path)?.traces;
            Some(on_data(&first, &second, &mut traces).map_err(CliError::input)?)
        }
    };
    let answer = compare(&first, &second);
    if arguments.json {
        terminal::print_json(&Printed { answer, on })?;
    } else {
        let width = terminal::width();
        terminal::print(&report::comparison(&answer, on.as_ref(), width))?;
    }
    Ok(0)
}
