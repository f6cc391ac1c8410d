//! `strandline ranking`: the ranked templates of a run.

use std::path::PathBuf;

use clap::Args;
use serde_json::{Value, json};

use super::error::CliError;
use super::terminal;
use crate::report;
use crate::search::{RANKING_SCHEMA, Ranking};
use crate::store::{RunReader, StoreError};

/// The ranked templates of a run.
#[derive(Debug, Args)]
#[command(before_help = "Example:\n  strandline ranking lifts.run --entries 5")]
pub(super) struct Arguments {
    /// The run file
    #[arg(value_name = "RUN")]
    run: PathBuf,
    /// How many templates to show
    #[arg(long, value_name = "N", default_value_t = 10)]
    entries: usize,
    /// Print JSON
    #[arg(long)]
    json: bool,
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let reader = RunReader::open(&arguments.run)?;
    let ranking = read(&reader)?;
    if arguments.json {
        terminal::print_json(&ranking)?;
    } else {
        terminal::print(&report::ranking(
            &ranking,
            terminal::width(),
            arguments.entries,
        ))?;
    }
    Ok(0)
}

/// The ranking of a run.
pub(super) fn read(reader: &RunReader) -> Result<Ranking, CliError> {
    let entries: Vec<Value> = reader
        .ranking()?
        .into_iter()
        .map(|(entry, _)| entry)
        .collect();
    let document = json!({
        "schema": RANKING_SCHEMA,
        "run": reader.fact("facts")?,
        "templates": entries,
    });
    serde_json::from_value(document).map_err(|error| damaged(reader, &error.to_string()))
}

/// The failure for a part of a run that cannot be understood.
pub(super) fn damaged(reader: &RunReader, what: &str) -> CliError {
    CliError::from(StoreError::Damaged {
        path: reader.path().to_owned(),
        what: what.to_owned(),
    })
}
