//! Reading traces from files: the door through which all data comes.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use super::error::TraceError;
use super::finding::Finding;
use super::grid::{self, Mended};
use super::layout::{self, Layout, RawSet};
use super::set::{Channel, Grid, Labels, TraceSet};
use super::table::{self, Table};
use crate::support::digest_bytes;
use crate::template::{Kind, Signal};

/// Longest gap that is mended when nothing else is said, in steps.
const MAX_GAP: u32 = 5;

/// What to read and how.
#[derive(Debug, Clone, Default)]
pub struct LoadOptions {
    /// The layout; told from the files when not given.
    pub layout: Option<Layout>,
    /// A file with labels; takes the place of labels in the data.
    pub labels: Option<PathBuf>,
    /// Channels and flags to keep; all when not given.
    pub channels: Option<Vec<String>>,
    /// Longest gap that is mended, in steps; 5 when not given.
    pub max_gap: Option<u32>,
}

/// Traces that were read.
#[derive(Debug, Clone)]
pub struct Loaded {
    /// The traces on their grid.
    pub traces: TraceSet,
    /// What was noticed and mended.
    pub findings: Vec<Finding>,
    /// SHA-256 over the bytes of all files read.
    pub digest: String,
    /// The layout they were in.
    pub layout: Layout,
}

/// Reads traces.
///
/// # Errors
/// With file, line and column where something cannot be read as it stands.
pub fn load(path: &Path, options: &LoadOptions) -> Result<Loaded, TraceError> {
    let mut bytes = Vec::new();
    let (mut raw, labels_table) = layout::read(path, options.layout, &mut bytes)?;
    let labels_table = match &options.labels {
        Some(path) => Some(table::read(path, &mut bytes)?),
        None => labels_table,
    };
    if let Some(names) = &options.channels {
        keep(&mut raw, names)?;
    }
    let (grid, channels, lengths, mut findings) =
        on_grid(&raw, options.max_gap.unwrap_or(MAX_GAP))?;
    check_enough(&raw, &lengths)?;
    let labels = match &labels_table {
        Some(table) => labels_from(table, &raw)?,
        None => labels_in(&raw)?,
    };
    let channels = without_constants(channels, &mut findings)?;
    let names = raw.traces.iter().map(|trace| trace.name.clone()).collect();
    let (shortest, longest) = extremes(&lengths);
    if shortest < longest {
        findings.push(Finding::UnequalLengths { shortest, longest });
    }
    let traces = TraceSet::new(names, &lengths, labels, grid, channels);
    check_different(&traces)?;
    Ok(Loaded {
        traces,
        findings,
        digest: digest_bytes(&bytes),
        layout: raw.layout,
    })
}

/// Checks that labels can be searched by.
///
/// # Errors
/// When there is one label only.
pub fn check_labels(labels: &Labels) -> Result<(), TraceError> {
    match labels.names.as_slice() {
        [only] => Err(TraceError::OneLabel(only.clone())),
        _ => Ok(()),
    }
}

/// Keeps the channels asked for.
fn keep(raw: &mut RawSet, names: &[String]) -> Result<(), TraceError> {
    let known: Vec<String> = raw
        .columns
        .iter()
        .map(|column| column.name.clone())
        .collect();
    for name in names {
        if !known.contains(name) {
            return Err(TraceError::UnknownChannel {
                name: name.clone(),
                known: known.join(", "),
            });
        }
    }
    let kept: Vec<bool> = known.iter().map(|name| names.contains(name)).collect();
    retain(&mut raw.columns, &kept);
    for trace in &mut raw.traces {
        retain(&mut trace.samples, &kept);
    }
    Ok(())
}

fn retain<T>(items: &mut Vec<T>, kept: &[bool]) {
    let mut flags = kept.iter();
    items.retain(|_| flags.next().copied().unwrap_or(false));
}

/// What putting the traces on a grid gives: grid, channels, lengths, findings.
type OnGrid = (Grid, Vec<Channel>, Vec<usize>, Vec<Finding>);

fn on_grid(raw: &RawSet, max_gap: u32) -> Result<OnGrid, TraceError> {
    let grid = grid::grid(raw);
    let kinds: Vec<Kind> = (0..raw.columns.len())
        .map(|number| kind(raw, number))
        .collect();
    let mut mended = Mended {
        cells: vec![(0, 0); kinds.len()],
        ..Mended::default()
    };
    let mut samples: Vec<Vec<f64>> = vec![Vec::new(); kinds.len()];
    let mut lengths = Vec::new();
    for trace in &raw.traces {
        let channels = grid::resample(trace, raw, &kinds, &grid, max_gap, &mut mended)?;
        lengths.push(channels.first().map_or(0, Vec::len));
        for (all, of_trace) in samples.iter_mut().zip(channels) {
            all.extend(of_trace);
        }
    }
    let names: Vec<String> = raw
        .columns
        .iter()
        .map(|column| column.name.clone())
        .collect();
    let findings = mended.findings(&grid, &names);
    let channels = raw
        .columns
        .iter()
        .zip(kinds)
        .zip(samples)
        .map(|((column, kind), samples)| Channel {
            signal: Signal::Recorded {
                name: column.name.as_str().into(),
                kind,
            },
            unit: column.unit.as_deref().map(Into::into),
            samples,
        })
        .collect();
    Ok((grid, channels, lengths, findings))
}

/// A column of zeros and ones is a flag.
fn kind(raw: &RawSet, number: usize) -> Kind {
    let is_bit =
        |value: f64| value.to_bits() == 0.0_f64.to_bits() || value.to_bits() == 1.0_f64.to_bits();
    let mut samples = raw
        .traces
        .iter()
        .flat_map(|trace| trace.samples[number].iter().flatten());
    if samples.all(|sample| is_bit(*sample)) {
        Kind::Flag
    } else {
        Kind::Numeric
    }
}

fn check_enough(raw: &RawSet, lengths: &[usize]) -> Result<(), TraceError> {
    if let Some(short) = lengths.iter().position(|length| *length < 2) {
        return Err(TraceError::OneSample(raw.traces[short].name.clone()));
    }
    match raw.traces.as_slice() {
        [only] => Err(TraceError::OneTrace(only.name.clone())),
        _ => Ok(()),
    }
}

/// Labels from a table with the columns `trace` and `label`.
fn labels_from(table: &Table, raw: &RawSet) -> Result<Option<Labels>, TraceError> {
    let remedy = "A file of labels has the columns trace,label";
    let trace = table
        .column("trace")
        .ok_or_else(|| table.missing("trace", remedy))?;
    let label = table
        .column("label")
        .ok_or_else(|| table.missing("label", remedy))?;
    let mut by_name: BTreeMap<&str, &str> = BTreeMap::new();
    for (row, record) in table.rows.iter().enumerate() {
        let (name, label_text) = (&record[trace], &record[label]);
        if !raw.traces.iter().any(|trace| trace.name == *name) {
            return Err(TraceError::LabelWithoutTrace {
                path: table.path.clone(),
                line: table.lines[row],
                name: name.to_owned(),
            });
        }
        if label_text.is_empty() {
            return Err(TraceError::EmptyCell {
                place: table.place(row, label),
            });
        }
        if let Some(first) = by_name.insert(name, label_text)
            && first != label_text
        {
            return Err(TraceError::TwoLabels {
                place: table.place(row, label),
                trace: name.to_owned(),
                first: first.to_owned(),
                second: label_text.to_owned(),
            });
        }
    }
    let labels = raw
        .traces
        .iter()
        .map(|trace| by_name.get(trace.name.as_str()).map(|l| (*l).to_owned()));
    all_or_none(labels.collect(), raw)
}

/// Labels from the `label` column of the data.
fn labels_in(raw: &RawSet) -> Result<Option<Labels>, TraceError> {
    all_or_none(
        raw.traces.iter().map(|trace| trace.label.clone()).collect(),
        raw,
    )
}

fn all_or_none(labels: Vec<Option<String>>, raw: &RawSet) -> Result<Option<Labels>, TraceError> {
    if labels.iter().all(Option::is_none) {
        return Ok(None);
    }
    let mut names = Vec::with_capacity(labels.len());
    for (label, trace) in labels.into_iter().zip(&raw.traces) {
        names.push(label.ok_or_else(|| TraceError::TraceWithoutLabel(trace.name.clone()))?);
    }
    Ok(Some(Labels::from_names(names)))
}

fn without_constants(
    channels: Vec<Channel>,
    findings: &mut Vec<Finding>,
) -> Result<Vec<Channel>, TraceError> {
    let is_constant = |channel: &Channel| {
        let mut known = channel.samples.iter().filter(|sample| !sample.is_nan());
        let first = known.next().copied().unwrap_or(f64::NAN);
        known.all(|sample| sample.total_cmp(&first).is_eq())
    };
    let (constant, varying): (Vec<Channel>, Vec<Channel>) =
        channels.into_iter().partition(is_constant);
    if varying.is_empty() {
        return Err(TraceError::AllConstant);
    }
    if !constant.is_empty() {
        let names = constant
            .iter()
            .map(|channel| channel.signal.to_string())
            .collect();
        findings.push(Finding::ConstantChannels(names));
    }
    Ok(varying)
}

fn extremes(lengths: &[usize]) -> (usize, usize) {
    let shortest = lengths.iter().copied().min().unwrap_or(0);
    (shortest, lengths.iter().copied().max().unwrap_or(0))
}

fn check_different(traces: &TraceSet) -> Result<(), TraceError> {
    let first = traces.record(crate::support::TraceId(0));
    let ids: Vec<_> = (0..traces.channels().len())
        .map(crate::support::SignalId::at)
        .collect();
    let same = |a: &[f64], b: &[f64]| {
        a.len() == b.len() && a.iter().zip(b).all(|(a, b)| a.total_cmp(b).is_eq())
    };
    let all_alike = traces.traces().all(|trace| {
        let record = traces.record(trace);
        ids.iter()
            .all(|id| same(record.samples(*id), first.samples(*id)))
    });
    if all_alike {
        return Err(TraceError::AllAlike);
    }
    Ok(())
}
