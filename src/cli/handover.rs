//! `strandline handover`: write the rules of chosen templates to a file.

use std::fs;
use std::path::PathBuf;

use clap::{Args, ValueEnum};

use super::error::CliError;
use super::{explain, ranking, terminal};
use crate::handover::Handover;
use crate::search::{Explanation, Mode, Units};
use crate::store::RunReader;
use crate::template::{TimeUnit, Words};
use crate::traces::{Grid, TraceSet};

/// Kinds of hand-over files.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum FileKind {
    /// What `strandline assign` reads
    Json,
}

/// Write the rules of one template, or of several that vote, to a file.
#[derive(Debug, Args)]
#[command(
    before_help = "Example:\n  strandline handover lifts.run --top 5 --as json -o lifts.json"
)]
pub(super) struct Arguments {
    /// The run file
    #[arg(value_name = "RUN")]
    run: PathBuf,
    /// The id of a ranked template, or its first characters
    #[arg(value_name = "ID", conflicts_with = "top")]
    id: Option<String>,
    /// A panel: the first N templates of the ranking, whose rules vote
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..))]
    top: Option<u16>,
    /// The kind of file
    #[arg(long = "as", value_name = "KIND", default_value = "json")]
    kind: FileKind,
    /// The file to write
    #[arg(short = 'o', long = "output", value_name = "FILE")]
    output: PathBuf,
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let FileKind::Json = arguments.kind;
    let reader = RunReader::open(&arguments.run)?;
    let found = ranking::read(&reader)?;
    let explanations = explain::read_all(&reader)?;
    let chosen: Vec<Explanation> = match (&arguments.id, arguments.top) {
        (Some(id), _) => vec![explain::find(&reader, &explanations, id)?.clone()],
        (None, Some(top)) => panel(&found.run.mode, &explanations, usize::from(top)),
        (None, None) => {
            return Err(CliError::input(
                "give the ID of a template, or --top N for a panel",
            ));
        }
    };
    if chosen.is_empty() {
        return Err(CliError::input(format!(
            "{}: this run ranked no template, so there is nothing to hand over",
            arguments.run.display()
        )));
    }
    let traces = read_traces(&reader, &chosen)?;
    let handover = Handover::new(&found, &chosen, |signal| Units(&traces).unit(signal))
        .map_err(|error| ranking::damaged(&reader, &error.to_string()))?;
    let text = serde_json::to_string_pretty(&handover)
        .map_err(|error| CliError::failed(error.to_string()))?;
    fs::write(&arguments.output, text + "\n")
        .map_err(|error| CliError::file(&arguments.output, "cannot be written", &error))?;
    terminal::remark(&format!(
        "strandline: {} template(s) written to {}",
        chosen.len(),
        arguments.output.display()
    ));
    Ok(0)
}

/// The first templates, which are of different families. Without labels the
/// groups of one template are not those of another, so only those that found
/// the same groups as the first can vote with it.
fn panel(mode: &Mode, explanations: &[Explanation], top: usize) -> Vec<Explanation> {
    let Some(first) = explanations.first() else {
        return Vec::new();
    };
    let members = |explanation: &Explanation| -> Vec<Vec<String>> {
        explanation
            .groups
            .iter()
            .map(|group| group.traces.clone())
            .collect()
    };
    let fits = |explanation: &&Explanation| {
        *mode == Mode::Labelled || members(explanation) == members(first)
    };
    let chosen: Vec<Explanation> = explanations
        .iter()
        .filter(fits)
        .take(top)
        .cloned()
        .collect();
    if chosen.len() < top {
        terminal::remark(&format!(
            "strandline: {} of {top} templates can vote: the others have other groups",
            chosen.len()
        ));
    }
    chosen
}

/// The run's traces with the signals that the templates read.
fn read_traces(reader: &RunReader, chosen: &[Explanation]) -> Result<TraceSet, CliError> {
    let (mut traces, _) = reader.traces(grid(reader)?)?;
    for explanation in chosen {
        let formula = crate::template::parse(&explanation.ranked.text)
            .map_err(|error| ranking::damaged(reader, &error.to_string()))?;
        for signal in formula.signals() {
            traces
                .derive(&signal)
                .map_err(|error| ranking::damaged(reader, &error.to_string()))?;
        }
    }
    Ok(traces)
}

/// The time grid of a run.
fn grid(reader: &RunReader) -> Result<Grid, CliError> {
    let fact = reader.fact("grid")?.unwrap_or_default();
    let unit = fact["unit"].as_str().and_then(TimeUnit::from_name);
    match (fact["step"].as_f64(), unit) {
        (Some(step), Some(unit)) => Ok(Grid { step, unit }),
        _ => Err(ranking::damaged(reader, "the time grid")),
    }
}
