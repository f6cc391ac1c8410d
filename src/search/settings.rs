//! What a search is asked to do, and what the data offers to its grammars.

use serde::{Deserialize, Serialize};

use crate::equivalence::Known;
use crate::grammar::{Grammar, GrammarError, Palette, SHIPPED};
use crate::support::Finite;
use crate::template::{Duration, Kind};
use crate::traces::TraceSet;

/// What a search is asked to do. Two runs with the same settings and the same
/// data have the same result.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Settings {
    /// Names of shipped grammars, or files; the default run when empty.
    pub grammars: Vec<String>,
    /// Whether labels are used where there are any.
    pub use_labels: bool,
    /// The share of traces held out.
    pub hold_out: f64,
    /// The seed of everything random.
    pub seed: u64,
}

impl Settings {
    /// The grammars, in the order in which they are searched: purposeful ones
    /// first, `open-start` last.
    ///
    /// # Errors
    /// When a grammar is missing or has a mistake.
    pub fn open_grammars(&self) -> Result<Vec<Grammar>, GrammarError> {
        if self.grammars.is_empty() {
            return SHIPPED
                .iter()
                .map(|(name, text)| Grammar::read(name, text))
                .collect();
        }
        self.grammars
            .iter()
            .map(|name| Grammar::open(name))
            .collect()
    }
}

/// What a trace set offers: its recorded channels and flags, and durations
/// taken from the median length of its traces (1 %, at least 3 steps, and
/// 10 %).
pub fn palette(traces: &TraceSet) -> Palette {
    let mut lengths: Vec<usize> = traces.traces().map(|trace| traces.length(trace)).collect();
    lengths.sort_unstable();
    let median = lengths.get(lengths.len() / 2).copied().unwrap_or(0);
    let steps = |share: f64, least: f64| (median as f64 * share).round().max(least);
    let duration = |steps: f64| {
        let grid = traces.grid();
        let value = format!("{:.9e}", grid.duration(steps))
            .parse()
            .unwrap_or(steps);
        Duration {
            value: Finite::new(value).unwrap_or(Finite::from(1)),
            unit: grid.unit,
        }
    };
    let mut palette = Palette {
        channels: Vec::new(),
        flags: Vec::new(),
        short: duration(steps(0.01, 3.0)),
        long: duration(steps(0.10, 6.0)),
        hold: duration(steps(0.01, 3.0)),
    };
    for channel in traces.recorded() {
        match channel.signal.kind() {
            Kind::Numeric => palette
                .channels
                .push((channel.signal.clone(), channel.unit.clone())),
            Kind::Flag => palette.flags.push(channel.signal.clone()),
        }
    }
    palette
}

/// Which signals of a trace set are known at every sample.
pub(super) fn known(traces: &TraceSet) -> Known {
    let with_gaps = traces.recorded().iter().flat_map(|channel| {
        let mut names = Vec::new();
        if channel.samples.iter().any(|sample| sample.is_nan()) {
            channel
                .signal
                .for_each_recorded(&mut |name, _| names.push(name.clone()));
        }
        names
    });
    Known {
        with_gaps: with_gaps.collect(),
    }
}
