//! `strandline measure`: the boundary of a template on each trace, as CSV.

use clap::Args;

use super::arguments::TracesFrom;
use super::error::CliError;
use super::terminal;
use crate::embedding::{self, MeasureOptions};
use crate::support::SlotId;
use crate::template::{Formula, parse};

/// The boundary of a template on each trace, as CSV.
#[derive(Debug, Args)]
#[command(
    before_help = "Example:\n  strandline measure demo-data/lift-landings \
    --template 'throughout [?, end] (abs(position_error) <= ?)'"
)]
pub(super) struct Arguments {
    #[command(flatten)]
    traces: TracesFrom,
    /// The template
    #[arg(long, value_name = "TEXT")]
    template: String,
    /// The slot that is solved, such as ?2; the first threshold when not given
    #[arg(long, value_name = "SLOT")]
    height: Option<String>,
    /// Points of the grid of every other slot
    #[arg(long, value_name = "N", default_value_t = 16)]
    points: usize,
    /// Print JSON
    #[arg(long)]
    json: bool,
}

/// Reads a template from the command line, with its mistakes drawn.
pub(super) fn read_template(text: &str) -> Result<Formula, CliError> {
    parse(text).map_err(|error| CliError::input(format!("\n{}", error.draw(text, "template"))))
}

/// The slot of a text such as `?2`.
fn read_slot(text: &str, template: &Formula) -> Result<SlotId, CliError> {
    let count = template.slots().len();
    text.trim_start_matches('?')
        .parse::<usize>()
        .ok()
        .filter(|number| (1..=count).contains(number))
        .map(|number| SlotId::at(number - 1))
        .ok_or_else(|| {
            CliError::input(format!(
                "--height {text}: the slots of `{template}` are ?1 to ?{count}"
            ))
        })
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let template = read_template(&arguments.template)?;
    let height = match &arguments.height {
        Some(text) => Some(read_slot(text, &template)?),
        None => None,
    };
    let mut traces = arguments.traces.load()?.traces;
    let options = MeasureOptions {
        height,
        points: arguments.points,
    };
    let table = embedding::measure(&template, &mut traces, &options)
        .map_err(|error| CliError::input(error.to_string()))?;
    if arguments.json {
        terminal::print_json(&table)?;
        return Ok(0);
    }
    let mut writer = csv::Writer::from_writer(Vec::new());
    let header: Vec<&str> = std::iter::once("trace")
        .chain(table.columns.iter().map(String::as_str))
        .collect();
    let rows = table.rows.iter().map(|row| {
        let cells = row.heights.iter().map(String::as_str);
        std::iter::once(row.trace.as_str())
            .chain(cells)
            .collect::<Vec<&str>>()
    });
    for record in std::iter::once(header).chain(rows) {
        writer
            .write_record(record)
            .map_err(|error| CliError::failed(format!("the table cannot be written: {error}")))?;
    }
    let bytes = writer
        .into_inner()
        .map_err(|error| CliError::failed(error.to_string()))?;
    terminal::print(&String::from_utf8_lossy(&bytes))?;
    Ok(0)
}
