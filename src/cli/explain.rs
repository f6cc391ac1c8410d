//! `strandline explain`: one template of a run.

use std::path::PathBuf;

use clap::Args;
use serde_json::Value;

use super::error::CliError;
use super::{ranking, terminal};
use crate::report;
use crate::search::Explanation;
use crate::store::{RunReader, StoreError};

/// One template: its groups, their descriptions, evidence, traces to look at.
#[derive(Debug, Args)]
#[command(before_help = "Example:\n  strandline explain lifts.run\n\
    explains the first template of the ranking; give an id for another one")]
pub(super) struct Arguments {
    /// The run file
    #[arg(value_name = "RUN")]
    run: PathBuf,
    /// The id of a ranked template, or its first characters; the first of the ranking when not given
    #[arg(value_name = "ID")]
    id: Option<String>,
    /// Print JSON
    #[arg(long)]
    json: bool,
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let reader = RunReader::open(&arguments.run)?;
    let explanations = read_all(&reader)?;
    let found = match &arguments.id {
        None => explanations
            .first()
            .ok_or_else(|| nothing_ranked(&reader))?,
        Some(id) => find(&reader, &explanations, id)?,
    };
    if arguments.json {
        terminal::print_json(found)?;
    } else {
        terminal::print(&report::explanation(found, terminal::width()))?;
    }
    Ok(0)
}

/// All explanations of a run, best first.
pub(super) fn read_all(reader: &RunReader) -> Result<Vec<Explanation>, CliError> {
    reader
        .ranking()?
        .into_iter()
        .map(|(_, explanation): (Value, Value)| {
            serde_json::from_value(explanation)
                .map_err(|error| ranking::damaged(reader, &error.to_string()))
        })
        .collect()
}

fn nothing_ranked(reader: &RunReader) -> CliError {
    CliError::input(format!(
        "{}: this run ranked no template; `strandline ranking` says why",
        reader.path().display()
    ))
}

/// The explanation of an id, or of its unambiguous start.
pub(super) fn find<'a>(
    reader: &RunReader,
    explanations: &'a [Explanation],
    id: &str,
) -> Result<&'a Explanation, CliError> {
    let mut fitting = explanations
        .iter()
        .filter(|explanation| !id.is_empty() && explanation.ranked.id.starts_with(id));
    match (fitting.next(), fitting.next()) {
        (Some(found), None) => Ok(found),
        (Some(first), Some(second)) => Err(CliError::input(format!(
            "{}: `{id}` fits several templates, {} and {} among them; give more of the id",
            reader.path().display(),
            first.ranked.id,
            second.ranked.id
        ))),
        (None, _) => Err(CliError::from(StoreError::UnknownId {
            path: reader.path().to_owned(),
            id: id.to_owned(),
        })),
    }
}
