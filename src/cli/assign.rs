//! `strandline assign`: which group is each new trace in, or none.

use std::fs;
use std::path::PathBuf;

use clap::Args;
use serde::Serialize;

use super::arguments::TracesFrom;
use super::error::CliError;
use super::terminal;
use crate::embedding::{resolve, verdicts};
use crate::handover::{Handover, HandoverError, assign};
use crate::search::Units;
use crate::template::{Kind, Words, parse_signal};
use crate::traces::TraceSet;

/// Which group is each new trace in, or none.
#[derive(Debug, Args)]
#[command(before_help = "Example:\n  strandline assign demo-data/lift-landings --by lifts.json")]
pub(super) struct Arguments {
    #[command(flatten)]
    traces: TracesFrom,
    /// A hand-over file
    #[arg(long, value_name = "FILE")]
    by: PathBuf,
    /// Print JSON
    #[arg(long)]
    json: bool,
}

/// Where one trace belongs.
#[derive(Debug, Serialize)]
struct Row<'a> {
    trace: &'a str,
    group: Option<&'a str>,
    votes: usize,
}

impl From<HandoverError> for CliError {
    fn from(error: HandoverError) -> Self {
        CliError::input(error.to_string())
    }
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let text = fs::read_to_string(&arguments.by)
        .map_err(|error| CliError::input(format!("{}: {error}", arguments.by.display())))?;
    let handover = Handover::read(&text)
        .map_err(|error| CliError::input(format!("{}: {error}", arguments.by.display())))?;
    let mut traces = arguments.traces.load()?.traces;
    check_fit(&handover, &mut traces)?;
    let found = assign(
        &handover,
        traces.count(),
        |formula| -> Result<_, CliError> {
            resolve(formula, &mut traces).map_err(|error| CliError::input(error.to_string()))?;
            verdicts(formula, &traces).map_err(|error| CliError::input(error.to_string()))
        },
    )?;
    let rows: Vec<Row<'_>> = found
        .iter()
        .zip(traces.names())
        .map(|(assignment, trace)| Row {
            trace,
            group: assignment
                .group
                .map(|group| handover.groups[group].as_str()),
            votes: assignment.votes,
        })
        .collect();
    if arguments.json {
        terminal::print_json(&rows)?;
    } else {
        terminal::print(&csv_text(&rows)?)?;
    }
    accuracy(&handover, &rows, &traces);
    Ok(0)
}

fn csv_text(rows: &[Row<'_>]) -> Result<String, CliError> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    let failed = |error: &dyn std::fmt::Display| CliError::failed(error.to_string());
    for row in rows {
        writer.serialize(row).map_err(|error| failed(&error))?;
    }
    let bytes = writer.into_inner().map_err(|error| failed(&error))?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}

/// Says when traces differ from those that the rules were found on: refuses
/// missing channels and other units, remarks on another sampling.
fn check_fit(handover: &Handover, traces: &mut TraceSet) -> Result<(), CliError> {
    for facts in &handover.signals {
        let kind = if facts.kind == "flag" {
            Kind::Flag
        } else {
            Kind::Numeric
        };
        let signal = parse_signal(&facts.text, kind)
            .map_err(|error| CliError::input(error.draw(&facts.text, "signal")))?;
        traces
            .derive(&signal)
            .map_err(|error| CliError::input(error.to_string()))?;
        let unit = Units(traces).unit(&signal);
        if let (Some(here), Some(there)) = (&unit, &facts.unit)
            && here != there
        {
            return Err(CliError::input(format!(
                "`{}` is in {here} here, and the rules were found in {there}; convert it first",
                facts.text
            )));
        }
    }
    let grid = traces.grid();
    let same_step = (grid.step - handover.grid.step).abs() <= 0.01 * handover.grid.step;
    if grid.unit.name() != handover.grid.unit || !same_step {
        terminal::remark(&format!(
            "strandline: these traces have a step of {} {}, the rules were found at {} {}: moving \
             windows and edges may read differently",
            grid.step,
            grid.unit.name(),
            handover.grid.step,
            handover.grid.unit
        ));
    }
    Ok(())
}

/// Where the new traces have labels, says how many agree.
fn accuracy(handover: &Handover, rows: &[Row<'_>], traces: &TraceSet) {
    let Some(labels) = traces.labels() else {
        return;
    };
    if !labels
        .names
        .iter()
        .any(|label| handover.groups.contains(label))
    {
        return;
    }
    let right = rows
        .iter()
        .zip(&labels.of_trace)
        .filter(|(row, label)| row.group == Some(labels.names[**label].as_str()))
        .count();
    let none = rows.iter().filter(|row| row.group.is_none()).count();
    terminal::remark(&format!(
        "strandline: {right} of {} traces are in the group of their label ({:.1} %), {none} in none",
        rows.len(),
        100.0 * right as f64 / rows.len() as f64
    ));
}
