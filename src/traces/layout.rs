//! The three layouts of trace files, and telling them apart.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

use super::error::TraceError;
use super::header::{name_and_unit, time_unit};
use super::table::{self, Table};
use crate::template::TimeUnit;

/// How traces are laid out in files.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Layout {
    /// One table: `trace`, optional `label`, `time`, channels.
    Long,
    /// A folder: one CSV file a trace with `time` and channels.
    Files,
    /// One row a trace: `trace`, optional `label`, then samples of one channel.
    Rows,
}

/// A column that holds a channel or flag.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Column {
    /// The name without unit.
    pub(super) name: String,
    /// The unit.
    pub(super) unit: Option<String>,
}

/// A trace as read, before it is put on a grid.
#[derive(Debug, Clone)]
pub(super) struct RawTrace {
    /// Its name.
    pub(super) name: String,
    /// Its label.
    pub(super) label: Option<String>,
    /// The file.
    pub(super) path: PathBuf,
    /// The line of each sample.
    pub(super) lines: Vec<u64>,
    /// The time of each sample; empty where the data has no time.
    pub(super) times: Vec<f64>,
    /// The samples of each channel, `None` where a cell is empty.
    pub(super) samples: Vec<Vec<Option<f64>>>,
}

/// All that was read.
#[derive(Debug, Clone)]
pub(super) struct RawSet {
    /// The layout.
    pub(super) layout: Layout,
    /// The channels.
    pub(super) columns: Vec<Column>,
    /// The traces.
    pub(super) traces: Vec<RawTrace>,
    /// The unit of time; [`TimeUnit::Step`] where the data has no time.
    pub(super) unit: TimeUnit,
    /// The header of the time column.
    pub(super) time_header: String,
}

/// Reads a path in the layout given, or in the one that it looks like.
pub(super) fn read(
    path: &Path,
    layout: Option<Layout>,
    bytes: &mut Vec<u8>,
) -> Result<(RawSet, Option<Table>), TraceError> {
    if !path.is_dir() {
        let table = table::read(path, bytes)?;
        return Ok((read_table(&table, layout)?, None));
    }
    let (files, labels) = csv_files(path)?;
    let labels = labels.map(|path| table::read(&path, bytes)).transpose()?;
    if let [file] = files.as_slice() {
        let table = table::read(file, bytes)?;
        if table.column("trace").is_some() && layout != Some(Layout::Files) {
            return Ok((read_table(&table, layout)?, labels));
        }
    }
    Ok((read_files(&files, bytes)?, labels))
}

/// The CSV files of a folder by name, and its `labels.csv`.
fn csv_files(folder: &Path) -> Result<(Vec<PathBuf>, Option<PathBuf>), TraceError> {
    let unreadable = |error: std::io::Error| TraceError::Unreadable {
        path: folder.to_owned(),
        reason: error.to_string(),
    };
    let mut files = Vec::new();
    for entry in fs::read_dir(folder).map_err(unreadable)? {
        let path = entry.map_err(unreadable)?.path();
        let is_csv = path
            .extension()
            .is_some_and(|ending| ending.eq_ignore_ascii_case("csv"));
        if is_csv && path.is_file() {
            files.push(path);
        }
    }
    files.sort();
    let is_labels = |path: &PathBuf| path.file_name().is_some_and(|name| name == "labels.csv");
    let labels = files.iter().find(|path| is_labels(path)).cloned();
    files.retain(|path| !is_labels(path));
    if files.is_empty() {
        return Err(TraceError::EmptyFolder(folder.to_owned()));
    }
    Ok((files, labels))
}

fn read_table(table: &Table, layout: Option<Layout>) -> Result<RawSet, TraceError> {
    let has_time = table
        .header
        .iter()
        .any(|header| time_unit(header).is_some());
    match layout {
        Some(Layout::Rows) => read_rows(table),
        Some(Layout::Long | Layout::Files) => read_long(table),
        None if has_time => read_long(table),
        None => read_rows(table),
    }
}

/// The trace column of a table that holds several traces.
fn trace_column(table: &Table) -> Result<usize, TraceError> {
    table.column("trace").ok_or_else(|| {
        table.missing(
            "trace",
            "It names the trace that a row belongs to; for one file a trace, give their folder",
        )
    })
}

fn time_column(table: &Table) -> Result<(usize, TimeUnit), TraceError> {
    table
        .header
        .iter()
        .enumerate()
        .find_map(|(position, header)| Some((position, time_unit(header)?)))
        .ok_or_else(|| {
            table.missing(
                "time",
                "Name it time, with its unit when it is not seconds: time [ms]",
            )
        })
}

/// Channels of all columns but the given ones. Two columns that would have one
/// name without their units keep their whole headers.
fn channels(table: &Table, others: &[usize]) -> Result<(Vec<usize>, Vec<Column>), TraceError> {
    let positions: Vec<usize> = (0..table.header.len())
        .filter(|position| !others.contains(position))
        .collect();
    if positions.is_empty() {
        return Err(TraceError::NoChannel(table.path.clone()));
    }
    let split: Vec<(String, Option<String>)> = positions
        .iter()
        .map(|position| name_and_unit(&table.header[*position]))
        .collect();
    let columns = split
        .iter()
        .zip(&positions)
        .map(|((name, unit), position)| {
            let twice = split.iter().filter(|(other, _)| other == name).count() > 1;
            Column {
                name: if twice {
                    table.header[*position].clone()
                } else {
                    name.clone()
                },
                unit: unit.clone(),
            }
        })
        .collect();
    Ok((positions, columns))
}

fn read_long(table: &Table) -> Result<RawSet, TraceError> {
    let trace = trace_column(table)?;
    let label = table.column("label");
    let (time, unit) = time_column(table)?;
    let mut others = vec![trace, time];
    others.extend(label);
    let (positions, columns) = channels(table, &others)?;
    let mut traces: Vec<RawTrace> = Vec::new();
    let mut known: BTreeMap<String, usize> = BTreeMap::new();
    for (row, record) in table.rows.iter().enumerate() {
        let name = &record[trace];
        if name.is_empty() {
            return Err(TraceError::EmptyCell {
                place: table.place(row, trace),
            });
        }
        let number = *known.entry(name.to_owned()).or_insert_with(|| {
            traces.push(RawTrace::new(table, name, columns.len()));
            traces.len() - 1
        });
        let raw = &mut traces[number];
        if let Some(label) = label {
            raw.take_label(table, row, label)?;
        }
        raw.take_sample(table, row, Some(time), &positions)?;
    }
    Ok(RawSet {
        layout: Layout::Long,
        columns,
        traces,
        unit,
        time_header: table.header[time].clone(),
    })
}

fn read_files(files: &[PathBuf], bytes: &mut Vec<u8>) -> Result<RawSet, TraceError> {
    let mut set: Option<RawSet> = None;
    for path in files {
        if let Some(name) = path.file_name() {
            bytes.extend_from_slice(name.as_encoded_bytes());
        }
        let table = table::read(path, bytes)?;
        let (time, unit) = time_column(&table)?;
        let (positions, columns) = channels(&table, &[time])?;
        let set = set.get_or_insert_with(|| RawSet {
            layout: Layout::Files,
            columns: columns.clone(),
            traces: Vec::new(),
            unit,
            time_header: table.header[time].clone(),
        });
        if columns != set.columns || unit != set.unit {
            return Err(TraceError::OtherColumns {
                path: path.clone(),
                first: files[0].clone(),
                difference: difference(&columns, &set.columns),
            });
        }
        let name = path.file_stem().unwrap_or_default().to_string_lossy();
        let mut raw = RawTrace::new(&table, &name, columns.len());
        for row in 0..table.rows.len() {
            raw.take_sample(&table, row, Some(time), &positions)?;
        }
        set.traces.push(raw);
    }
    // A folder without files was refused before.
    set.ok_or_else(|| TraceError::EmptyFolder(PathBuf::new()))
}

/// What one file has and another has not.
fn difference(here: &[Column], there: &[Column]) -> String {
    let missing = there.iter().find(|column| !here.contains(column));
    let extra = here.iter().find(|column| !there.contains(column));
    match (missing, extra) {
        (Some(column), _) => format!("`{}` is missing or has another unit", column.name),
        (None, Some(column)) => format!("`{}` is not in the other", column.name),
        (None, None) => "their order, or the unit of time".to_owned(),
    }
}

fn read_rows(table: &Table) -> Result<RawSet, TraceError> {
    let trace = trace_column(table)?;
    let label = table.column("label");
    let mut others = vec![trace];
    others.extend(label);
    let (positions, _) = channels(table, &others)?;
    let mut traces: Vec<RawTrace> = Vec::new();
    for row in 0..table.rows.len() {
        let name = &table.rows[row][trace];
        if name.is_empty() {
            return Err(TraceError::EmptyCell {
                place: table.place(row, trace),
            });
        }
        let mut raw = RawTrace::new(table, name, 1);
        if let Some(label) = label {
            raw.take_label(table, row, label)?;
        }
        for position in &positions {
            raw.lines.push(table.lines[row]);
            raw.samples[0].push(table.sample(row, *position)?);
        }
        // Empty cells at the end: a shorter trace.
        let length = raw.samples[0]
            .iter()
            .rposition(Option::is_some)
            .map_or(0, |last| last + 1);
        raw.samples[0].truncate(length);
        raw.lines.truncate(length);
        if traces.iter().any(|other| other.name == raw.name) {
            return Err(TraceError::DuplicateTrace {
                path: table.path.clone(),
                line: table.lines[row],
                name: raw.name,
            });
        }
        traces.push(raw);
    }
    Ok(RawSet {
        layout: Layout::Rows,
        columns: vec![Column {
            name: "value".to_owned(),
            unit: None,
        }],
        traces,
        unit: TimeUnit::Step,
        time_header: String::new(),
    })
}

impl RawTrace {
    fn new(table: &Table, name: &str, channels: usize) -> Self {
        RawTrace {
            name: name.to_owned(),
            label: None,
            path: table.path.clone(),
            lines: Vec::new(),
            times: Vec::new(),
            samples: vec![Vec::new(); channels],
        }
    }

    fn take_label(&mut self, table: &Table, row: usize, column: usize) -> Result<(), TraceError> {
        let label = &table.rows[row][column];
        if label.is_empty() {
            return Ok(());
        }
        match &self.label {
            Some(first) if first != label => Err(TraceError::TwoLabels {
                place: table.place(row, column),
                trace: self.name.clone(),
                first: first.clone(),
                second: label.to_owned(),
            }),
            _ => {
                self.label = Some(label.to_owned());
                Ok(())
            }
        }
    }

    fn take_sample(
        &mut self,
        table: &Table,
        row: usize,
        time: Option<usize>,
        channels: &[usize],
    ) -> Result<(), TraceError> {
        if let Some(column) = time {
            let now = table.required(row, column)?;
            if let Some(before) = self.times.last()
                && now <= *before
            {
                return Err(TraceError::TimeNotForward {
                    place: table.place(row, column),
                    trace: self.name.clone(),
                    time: now,
                    before: *before,
                });
            }
            self.times.push(now);
        }
        self.lines.push(table.lines[row]);
        for (samples, column) in self.samples.iter_mut().zip(channels) {
            samples.push(table.sample(row, *column)?);
        }
        Ok(())
    }
}
