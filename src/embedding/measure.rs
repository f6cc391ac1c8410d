//! The boundary of a template on each trace, as a table for people and other
//! programs.

use serde::Serialize;

use super::embed::{EmbedError, axes, default_height, embed_with};
use super::resolve::resolve;
use super::table::Embedding;
use crate::support::SlotId;
use crate::template::{Formula, SlotKind};
use crate::traces::{Grid, TraceSet};

/// How to measure.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct MeasureOptions {
    /// The slot that is solved; the first threshold, else the first slot, when
    /// not given.
    pub height: Option<SlotId>,
    /// Points of the grid of every other slot.
    pub points: usize,
}

/// A table of heights.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct MeasureTable {
    /// The template.
    pub template: String,
    /// The slot that was solved, such as `?2`.
    pub height: String,
    /// One name a column: the axis values, or `height` where there is no axis.
    pub columns: Vec<String>,
    /// One row a trace.
    pub rows: Vec<MeasureRow>,
}

/// The heights of one trace.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct MeasureRow {
    /// The trace.
    pub trace: String,
    /// A number in the slot's unit, `never` or `always` for each column.
    pub heights: Vec<String>,
}

/// Measures a template on traces.
///
/// # Errors
/// When the template has no slot or does not fit the data.
pub fn measure(
    template: &Formula,
    traces: &mut TraceSet,
    options: &MeasureOptions,
) -> Result<MeasureTable, EmbedError> {
    resolve(template, traces)?;
    let height = options
        .height
        .or_else(|| default_height(template))
        .ok_or_else(|| EmbedError::NoSlot(template.clone()))?;
    let axes = axes(template, traces, height, options.points)?;
    let embedding = embed_with(template, traces, height, axes)?;
    let grid = traces.grid();
    let rows = traces
        .names()
        .iter()
        .enumerate()
        .map(|(trace, name)| MeasureRow {
            trace: name.clone(),
            heights: embedding
                .columns
                .iter()
                .map(|column| cell(&embedding, column[trace], grid))
                .collect(),
        })
        .collect();
    Ok(MeasureTable {
        template: template.to_string(),
        height: format!("?{}", height.index() + 1),
        columns: (0..embedding.columns.len())
            .map(|column| column_name(&embedding, column, grid))
            .collect(),
        rows,
    })
}

fn cell(embedding: &Embedding, height: f64, grid: &Grid) -> String {
    if height.is_infinite() {
        let never = height.total_cmp(&embedding.never()).is_eq();
        return if never { "never" } else { "always" }.to_owned();
    }
    match embedding.formula.slot(embedding.height).kind {
        SlotKind::Threshold(_) => height.to_string(),
        SlotKind::Time => short(grid.duration(height)),
    }
}

/// The axis values of a grid point, such as `2 s; 3.5`.
fn column_name(embedding: &Embedding, column: usize, grid: &Grid) -> String {
    if embedding.axes.is_empty() {
        return "height".to_owned();
    }
    let values: Vec<String> = embedding
        .axes
        .iter()
        .zip(embedding.position(column))
        .map(|(axis, at)| {
            let value = axis.points[at];
            match embedding.formula.slot(axis.slot).kind {
                SlotKind::Threshold(_) => value.to_string(),
                SlotKind::Time => format!("{} {}", short(grid.duration(value)), grid.unit.name()),
            }
        })
        .collect();
    values.join("; ")
}

/// A number without the noise of binary fractions.
fn short(value: f64) -> String {
    let rounded: f64 = format!("{value:.11e}").parse().unwrap_or(value);
    rounded.to_string()
}
