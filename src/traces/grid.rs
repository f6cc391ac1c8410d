//! Putting raw traces on one uniform grid.
//!
//! The step is the median distance of neighbouring samples over all traces.
//! A trace whose distances are all within 1 % of the step is taken as it is.
//! Any other is read at whole steps from its first sample: channels by
//! straight lines between known samples, flags held. A distance of more than
//! one and a half steps is a gap; it is mended in the same way when it leaves
//! out at most so many samples, and refused otherwise.

use super::error::{Place, TraceError};
use super::finding::Finding;
use super::layout::{RawSet, RawTrace};
use super::set::Grid;
use crate::template::{Kind, TimeUnit};

/// The grid that fits the traces.
pub(super) fn grid(set: &RawSet) -> Grid {
    if set.unit == TimeUnit::Step {
        return Grid::samples();
    }
    let mut distances: Vec<f64> = set
        .traces
        .iter()
        .flat_map(|trace| trace.times.windows(2).map(|pair| pair[1] - pair[0]))
        .collect();
    if distances.is_empty() {
        return Grid::samples();
    }
    let middle = distances.len() / 2;
    let median = *distances.select_nth_unstable_by(middle, f64::total_cmp).1;
    // The noise of binary fractions (0.1 + 0.2) and of stamps with few digits
    // goes away in the mean of the distances near the median.
    let near = distances
        .iter()
        .filter(|d| (**d - median).abs() <= 0.01 * median);
    let (count, sum) = near.fold((0.0, 0.0), |(count, sum), d| (count + 1.0, sum + d));
    let step: f64 = format!("{:.8e}", sum / count).parse().unwrap_or(median);
    Grid {
        step,
        unit: set.unit,
    }
}

/// What mending did.
#[derive(Debug, Default)]
pub(super) struct Mended {
    /// Traces put on the grid.
    pub(super) resampled: usize,
    /// Gaps mended.
    pub(super) gaps: usize,
    /// The longest of them, in steps.
    pub(super) longest: u64,
    /// For each channel, cells filled in and samples left unknown.
    pub(super) cells: Vec<(usize, usize)>,
}

impl Mended {
    /// The findings that tell it.
    pub(super) fn findings(&self, grid: &Grid, names: &[String]) -> Vec<Finding> {
        let mut findings = Vec::new();
        if self.resampled > 0 {
            findings.push(Finding::Resampled {
                traces: self.resampled,
                step: grid.step,
                unit: grid.unit.name().to_owned(),
            });
        }
        if self.gaps > 0 {
            findings.push(Finding::GapsMended {
                gaps: self.gaps,
                longest: self.longest,
            });
        }
        for ((cells, samples), channel) in self.cells.iter().zip(names) {
            if *cells > 0 {
                findings.push(Finding::CellsMended {
                    channel: channel.clone(),
                    cells: *cells,
                });
            }
            if *samples > 0 {
                findings.push(Finding::Unknown {
                    channel: channel.clone(),
                    samples: *samples,
                });
            }
        }
        findings
    }
}

/// The samples of a trace at the instants of the grid, by channel; NaN where
/// not known.
pub(super) fn resample(
    trace: &RawTrace,
    set: &RawSet,
    kinds: &[Kind],
    grid: &Grid,
    max_gap: u32,
    mended: &mut Mended,
) -> Result<Vec<Vec<f64>>, TraceError> {
    let positions = positions(trace, set, grid, max_gap, mended)?;
    let last = positions
        .last()
        .map_or(0, |last| (last + 1e-6).floor() as usize);
    let even = positions.len() == last + 1
        && positions
            .iter()
            .enumerate()
            .all(|(at, position)| (position - at as f64).abs() < 1e-9);
    let mut channels = Vec::with_capacity(trace.samples.len());
    for (number, samples) in trace.samples.iter().enumerate() {
        let known: Vec<(f64, f64, u64)> = positions
            .iter()
            .zip(samples)
            .zip(&trace.lines)
            .filter_map(|((position, sample), line)| {
                sample.map(|sample| (*position, sample, *line))
            })
            .collect();
        check_cells(trace, set, number, &known, max_gap)?;
        let values = if even {
            let known = samples.iter().map(|sample| sample.unwrap_or(f64::NAN));
            fill(known.collect(), kinds[number])
        } else {
            (0..=last)
                .map(|at| read_at(&known, at as f64, kinds[number]))
                .collect()
        };
        let empty = samples.iter().filter(|sample| sample.is_none()).count();
        let unknown = values.iter().filter(|value| value.is_nan()).count();
        mended.cells[number].0 += empty.saturating_sub(unknown);
        mended.cells[number].1 += unknown;
        channels.push(values);
    }
    mended.resampled += usize::from(!even);
    Ok(channels)
}

/// The times of a trace in steps since its first sample, with gaps checked.
fn positions(
    trace: &RawTrace,
    set: &RawSet,
    grid: &Grid,
    max_gap: u32,
    mended: &mut Mended,
) -> Result<Vec<f64>, TraceError> {
    if trace.times.is_empty() {
        return Ok((0..trace.lines.len()).map(|at| at as f64).collect());
    }
    for (at, pair) in trace.times.windows(2).enumerate() {
        let missing = ((pair[1] - pair[0]) / grid.step).round() as u64;
        let missing = missing.saturating_sub(1);
        if missing > u64::from(max_gap) {
            return Err(TraceError::Gap {
                place: Box::new(Place {
                    path: trace.path.clone(),
                    line: trace.lines[at + 1],
                    column: set.time_header.clone(),
                }),
                trace: trace.name.clone(),
                steps: missing,
                allowed: max_gap,
            });
        }
        if missing > 0 {
            mended.gaps += 1;
            mended.longest = mended.longest.max(missing);
        }
    }
    let start = trace.times[0];
    let exact: Vec<f64> = trace
        .times
        .iter()
        .map(|time| (time - start) / grid.step)
        .collect();
    let is_even = exact
        .windows(2)
        .all(|pair| (pair[1] - pair[0] - 1.0).abs() <= 0.01);
    if is_even {
        return Ok((0..exact.len()).map(|at| at as f64).collect());
    }
    Ok(exact)
}

/// Refuses runs of empty cells that are too long to mend.
fn check_cells(
    trace: &RawTrace,
    set: &RawSet,
    number: usize,
    known: &[(f64, f64, u64)],
    max_gap: u32,
) -> Result<(), TraceError> {
    for pair in known.windows(2) {
        let steps = ((pair[1].0 - pair[0].0).round() as u64).saturating_sub(1);
        if steps > u64::from(max_gap) {
            return Err(TraceError::Gap {
                place: Box::new(Place {
                    path: trace.path.clone(),
                    line: pair[1].2,
                    column: set.columns[number].name.clone(),
                }),
                trace: trace.name.clone(),
                steps,
                allowed: max_gap,
            });
        }
    }
    Ok(())
}

/// Fills in unknown samples between known ones.
fn fill(mut values: Vec<f64>, kind: Kind) -> Vec<f64> {
    let mut before: Option<usize> = None;
    for at in 0..values.len() {
        if values[at].is_nan() {
            continue;
        }
        if let Some(start) = before {
            let (from, to) = (values[start], values[at]);
            for (step, value) in values[start + 1..at].iter_mut().enumerate() {
                let share = (step + 1) as f64 / (at - start) as f64;
                *value = between(from, to, share, kind);
            }
        }
        before = Some(at);
    }
    values
}

fn between(from: f64, to: f64, share: f64, kind: Kind) -> f64 {
    match kind {
        Kind::Numeric => from + share * (to - from),
        Kind::Flag => from,
    }
}

/// The value at a position from known samples around it.
fn read_at(known: &[(f64, f64, u64)], at: f64, kind: Kind) -> f64 {
    let after = known.partition_point(|(position, _, _)| *position < at - 1e-6);
    match (after.checked_sub(1).map(|i| known[i]), known.get(after)) {
        (_, Some((position, value, _))) if (position - at).abs() <= 1e-6 => *value,
        (Some((from, low, _)), Some((to, high, _))) => {
            between(low, *high, (at - from) / (to - from), kind)
        }
        _ => f64::NAN,
    }
}
