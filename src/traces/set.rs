//! The trace set: names, labels, grid and samples.

use std::sync::{Arc, OnceLock};

use crate::support::{SignalId, TraceId};
use crate::template::{Duration, Signal, TimeUnit};

/// The uniform time grid that all traces share.
#[derive(Debug, Clone, PartialEq)]
pub struct Grid {
    /// The distance of two samples, in `unit`.
    pub step: f64,
    /// The unit of the data's own time: what a bare duration means.
    /// [`TimeUnit::Step`] where the data has no time.
    pub unit: TimeUnit,
}

impl Grid {
    /// A grid of plain samples, for data without time.
    pub fn samples() -> Self {
        Grid {
            step: 1.0,
            unit: TimeUnit::Step,
        }
    }

    /// How many steps a duration is, not rounded; `None` when a duration in
    /// seconds meets data whose time has no unit.
    pub fn steps(&self, duration: Duration) -> Option<f64> {
        let value = duration.value.value();
        match duration.unit {
            TimeUnit::Step => Some(value),
            TimeUnit::Data => Some(value / self.step),
            unit => Some(value * unit.seconds()? / (self.step * self.unit.seconds()?)),
        }
    }

    /// The duration of so many steps, written in the data's own unit.
    pub fn duration(&self, steps: f64) -> f64 {
        steps * self.step
    }
}

/// A signal's samples on all traces.
#[derive(Debug, Clone)]
pub struct Channel {
    /// What it is: a recorded name or a derivation.
    pub signal: Signal,
    /// Its unit, where one is known.
    pub unit: Option<Arc<str>>,
    /// All samples, trace after trace. NaN where not known; flags 0 and 1.
    pub samples: Vec<f64>,
}

/// The label of each trace, as an index into the sorted list of names.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Labels {
    /// The different labels, sorted.
    pub names: Vec<String>,
    /// For each trace the position of its label in `names`.
    pub of_trace: Vec<usize>,
}

impl Labels {
    /// Labels from the name of each trace's label.
    pub fn from_names(of_trace: Vec<String>) -> Self {
        let mut names = of_trace.clone();
        names.sort();
        names.dedup();
        let of_trace = of_trace
            .iter()
            .map(|label| names.partition_point(|name| name < label))
            .collect();
        Labels { names, of_trace }
    }
}

/// Traces on one grid.
#[derive(Debug, Clone)]
pub struct TraceSet {
    names: Vec<String>,
    /// Where each trace's samples start, and at the end their number.
    starts: Vec<usize>,
    labels: Option<Labels>,
    grid: Grid,
    channels: Vec<Channel>,
    /// For each signal its known samples in ascending order, once asked for.
    sorted: Vec<OnceLock<Vec<f64>>>,
    /// For each signal its different values in ascending order, likewise.
    distinct: Vec<OnceLock<Vec<f64>>>,
    /// For each signal the rank of each sample among its different values.
    ranks: Vec<OnceLock<RankTable>>,
}

/// Ranks of samples among the different values of their signal, from 0; the
/// largest number of the code stands where a sample is not known. 16-bit codes
/// where there are at most [`MOST_NARROW`] different values.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ranks<'a> {
    /// 16-bit codes.
    Narrow(&'a [u16]),
    /// 32-bit codes.
    Wide(&'a [u32]),
}

/// Different values up to which 16-bit codes are used: two are taken, for the
/// demand that no value meets, and for counting from 1.
pub const MOST_NARROW: usize = u16::MAX as usize - 1;

/// The ranks of all samples of one signal.
#[derive(Debug, Clone)]
enum RankTable {
    Narrow(Vec<u16>),
    Wide(Vec<u32>),
}

/// One trace's samples, by signal.
#[derive(Debug, Clone, Copy)]
pub struct Record<'a> {
    set: &'a TraceSet,
    trace: TraceId,
}

impl<'a> Record<'a> {
    /// The number of samples.
    pub fn length(&self) -> usize {
        self.set.length(self.trace)
    }

    /// The samples of a signal.
    pub fn samples(&self, signal: SignalId) -> &'a [f64] {
        self.set.samples(signal, self.trace)
    }

    /// The ranks of a signal's samples, as in [`TraceSet::ranks`].
    pub fn ranks(&self, signal: SignalId) -> Ranks<'a> {
        self.set.ranks(signal, self.trace)
    }
}

impl TraceSet {
    /// A set of traces from its parts. `lengths[i]` is the number of samples
    /// of trace i; every channel has their sum.
    ///
    /// # Panics
    /// When the parts do not fit one another.
    pub fn new(
        names: Vec<String>,
        lengths: &[usize],
        labels: Option<Labels>,
        grid: Grid,
        channels: Vec<Channel>,
    ) -> Self {
        assert_eq!(names.len(), lengths.len());
        let mut starts = vec![0];
        for length in lengths {
            starts.push(starts[starts.len() - 1] + length);
        }
        let total = starts[starts.len() - 1];
        assert!(
            channels
                .iter()
                .all(|channel| channel.samples.len() == total)
        );
        if let Some(labels) = &labels {
            assert_eq!(labels.of_trace.len(), names.len());
        }
        TraceSet {
            names,
            starts,
            labels,
            grid,
            sorted: vec![OnceLock::new(); channels.len()],
            distinct: vec![OnceLock::new(); channels.len()],
            ranks: vec![OnceLock::new(); channels.len()],
            channels,
        }
    }

    /// The number of traces.
    pub fn count(&self) -> usize {
        self.names.len()
    }

    /// All traces, in order.
    pub fn traces(&self) -> impl ExactSizeIterator<Item = TraceId> + use<> {
        (0..self.names.len()).map(TraceId::at)
    }

    /// The names of the traces.
    pub fn names(&self) -> &[String] {
        &self.names
    }

    /// The labels, where there are any.
    pub fn labels(&self) -> Option<&Labels> {
        self.labels.as_ref()
    }

    /// The time grid.
    pub fn grid(&self) -> &Grid {
        &self.grid
    }

    /// The number of samples of a trace.
    pub fn length(&self, trace: TraceId) -> usize {
        self.starts[trace.index() + 1] - self.starts[trace.index()]
    }

    /// The number of samples of the longest trace.
    pub fn longest(&self) -> usize {
        self.traces().map(|t| self.length(t)).max().unwrap_or(0)
    }

    /// All signals computed so far: recorded ones first, in the order of the
    /// data, then derived ones.
    pub fn channels(&self) -> &[Channel] {
        &self.channels
    }

    /// The recorded signals, in the order of the data.
    pub fn recorded(&self) -> &[Channel] {
        let count = self
            .channels
            .iter()
            .take_while(|channel| matches!(channel.signal, Signal::Recorded { .. }))
            .count();
        &self.channels[..count]
    }

    /// One signal.
    pub fn channel(&self, id: SignalId) -> &Channel {
        &self.channels[id.index()]
    }

    /// The id of a signal that is recorded or already derived.
    pub fn signal_id(&self, signal: &Signal) -> Option<SignalId> {
        self.channels
            .iter()
            .position(|channel| channel.signal == *signal)
            .map(SignalId::at)
    }

    /// Adds a derived signal, and gives its id.
    ///
    /// # Panics
    /// When the number of samples does not fit.
    pub fn add_channel(&mut self, channel: Channel) -> SignalId {
        assert_eq!(channel.samples.len(), self.starts[self.names.len()]);
        self.channels.push(channel);
        self.sorted.push(OnceLock::new());
        self.distinct.push(OnceLock::new());
        self.ranks.push(OnceLock::new());
        SignalId::at(self.channels.len() - 1)
    }

    /// The samples of a signal on one trace.
    pub fn samples(&self, signal: SignalId, trace: TraceId) -> &[f64] {
        let range = self.starts[trace.index()]..self.starts[trace.index() + 1];
        &self.channels[signal.index()].samples[range]
    }

    /// The known samples of a signal over all traces, in ascending order.
    pub fn sorted_samples(&self, signal: SignalId) -> &[f64] {
        self.sorted[signal.index()].get_or_init(|| {
            let mut samples = self.channels[signal.index()].samples.clone();
            samples.retain(|sample| !sample.is_nan());
            samples.sort_unstable_by(f64::total_cmp);
            samples
        })
    }

    /// The different known values of a signal over all traces, in ascending
    /// order.
    pub fn distinct_values(&self, signal: SignalId) -> &[f64] {
        self.distinct[signal.index()].get_or_init(|| {
            let mut values = self.sorted_samples(signal).to_vec();
            values.dedup();
            values
        })
    }

    /// The rank of every sample of a signal on one trace among the signal's
    /// different values.
    pub fn ranks(&self, signal: SignalId, trace: TraceId) -> Ranks<'_> {
        let range = self.starts[trace.index()]..self.starts[trace.index() + 1];
        match self.ranks[signal.index()].get_or_init(|| self.rank_table(signal)) {
            RankTable::Narrow(ranks) => Ranks::Narrow(&ranks[range]),
            RankTable::Wide(ranks) => Ranks::Wide(&ranks[range]),
        }
    }

    fn rank_table(&self, signal: SignalId) -> RankTable {
        let values = self.distinct_values(signal);
        let samples = &self.channels[signal.index()].samples;
        let rank = |sample: &f64| values.partition_point(|value| value < sample);
        if values.len() <= MOST_NARROW {
            let ranks = samples.iter().map(|sample| match sample.is_nan() {
                true => u16::MAX,
                false => rank(sample) as u16,
            });
            return RankTable::Narrow(ranks.collect());
        }
        let ranks = samples.iter().map(|sample| match sample.is_nan() {
            true => u32::MAX,
            false => rank(sample) as u32,
        });
        RankTable::Wide(ranks.collect())
    }

    /// One trace's samples by signal.
    pub fn record(&self, trace: TraceId) -> Record<'_> {
        Record { set: self, trace }
    }

    /// The set of some of the traces, in the order given, with all signals and
    /// labels. The list of label names stays whole.
    pub fn select(&self, traces: &[TraceId]) -> TraceSet {
        let lengths: Vec<usize> = traces.iter().map(|t| self.length(*t)).collect();
        let channels = (0..self.channels.len())
            .map(|position| {
                let mut samples = Vec::with_capacity(lengths.iter().sum());
                for trace in traces {
                    samples.extend_from_slice(self.samples(SignalId::at(position), *trace));
                }
                Channel {
                    samples,
                    signal: self.channels[position].signal.clone(),
                    unit: self.channels[position].unit.clone(),
                }
            })
            .collect();
        let labels = self.labels.as_ref().map(|labels| Labels {
            names: labels.names.clone(),
            of_trace: traces.iter().map(|t| labels.of_trace[t.index()]).collect(),
        });
        let names = traces
            .iter()
            .map(|t| self.names[t.index()].clone())
            .collect();
        TraceSet::new(names, &lengths, labels, self.grid.clone(), channels)
    }
}
