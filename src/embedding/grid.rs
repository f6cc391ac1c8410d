//! Grids for axes.

use crate::support::SignalId;
use crate::traces::TraceSet;

/// A grid of times: whole numbers of steps from 1 to the longest record, each
/// at most twice the one before and otherwise geometric, about `points` of
/// them.
pub fn time_points(longest: usize, points: usize) -> Vec<f64> {
    let last = longest.max(2) as f64 - 1.0;
    let points = points.max(2);
    // The ratio must stay below 2, so a long record gets more points.
    let needed = last.log2().ceil() as usize + 2;
    let count = points.max(needed);
    let mut grid: Vec<f64> = (0..count)
        .map(|k| last.powf(k as f64 / (count - 1) as f64).round())
        .collect();
    grid.dedup();
    grid
}

/// A grid of thresholds for a signal: half of the points at quantiles of its
/// known samples, half evenly spaced over its range; ascending and distinct.
/// Quantiles follow the samples where they are; even spacing keeps levels where
/// a channel that is mostly idle rarely goes.
pub fn threshold_points(traces: &TraceSet, signal: SignalId, points: usize) -> Vec<f64> {
    let samples = traces.sorted_samples(signal);
    if samples.is_empty() {
        return Vec::new();
    }
    let (low, high) = (samples[0], samples[samples.len() - 1]);
    let half = points.max(2) / 2;
    let mut grid = Vec::with_capacity(2 * half);
    for k in 1..=half {
        let share = k as f64 / (half + 1) as f64;
        let position = (share * (samples.len() - 1) as f64).round() as usize;
        grid.push(samples[position]);
        grid.push(low + share * (high - low));
    }
    grid.sort_unstable_by(f64::total_cmp);
    grid.dedup();
    grid
}
