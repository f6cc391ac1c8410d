//! The judge of rules: families worked out value by value on short traces.
//!
//! A family is the set, over all values of its slots, of what its members say
//! on a sample of short traces: in the weak reading and in the strong one at
//! every instant, and outermost for every suffix. The evaluator is written
//! straight from the definition and shares nothing with the kernels.

use std::collections::BTreeSet;

use crate::support::Stream;
use crate::template::{Atom, Bound, Formula, Node, Signal, Threshold, TimeUnit, Window};

/// A short trace: samples of named signals, `None` where not known. Values of
/// channels are small whole numbers, flags 0 and 1.
#[derive(Debug, Clone, PartialEq)]
pub struct ShortTrace {
    /// The signals, in order of first use.
    pub signals: Vec<(Signal, Vec<Option<f64>>)>,
    /// Number of samples.
    pub length: usize,
}

/// Random short traces of some signals: a mixture of lengths and kinds, with a
/// few unknown samples.
pub fn short_traces(
    signals: &[Signal],
    count: usize,
    longest: usize,
    seed: u64,
) -> Vec<ShortTrace> {
    (0..count)
        .map(|number| {
            let mut stream = Stream::new(seed, "short traces", number as u64);
            let length = 1 + stream.below(longest);
            let hold = stream.below(3);
            let unknown = [0, 0, 15][stream.below(3)];
            let signals = signals
                .iter()
                .map(|signal| {
                    let values = if signal.kind() == crate::template::Kind::Flag {
                        2
                    } else {
                        4
                    };
                    let mut last = stream.below(values);
                    let samples = (0..length).map(|_| {
                        if stream.below(hold + 1) == 0 {
                            last = stream.below(values);
                        }
                        (stream.below(100) >= unknown).then_some(last as f64)
                    });
                    (signal.clone(), samples.collect())
                })
                .collect();
            ShortTrace { signals, length }
        })
        .collect()
}

/// The family of a formula on some traces; `None` when there are more than
/// `most` combinations of slot values. Thresholds take all values and one below
/// and above them, times all steps and one beyond.
pub fn family(formula: &Formula, traces: &[ShortTrace], most: usize) -> Option<BTreeSet<Vec<u8>>> {
    let longest = traces.iter().map(|trace| trace.length).max().unwrap_or(0);
    let ranges: Vec<Vec<f64>> = formula
        .slots()
        .iter()
        .map(|slot| match slot.kind {
            crate::template::SlotKind::Threshold(_) => vec![-1.0, 0.0, 1.0, 2.0, 3.0, 4.0],
            crate::template::SlotKind::Time => (0..=longest + 1).map(|t| t as f64).collect(),
        })
        .collect();
    let count: usize = ranges.iter().map(Vec::len).product();
    if count > most {
        return None;
    }
    let mut family = BTreeSet::new();
    for number in 0..count {
        let mut rest = number;
        let values: Vec<f64> = ranges
            .iter()
            .map(|range| {
                let value = range[rest % range.len()];
                rest /= range.len();
                value
            })
            .collect();
        family.insert(says(formula, &values, traces));
    }
    Some(family)
}

/// What one member says: for each trace and instant a byte with the weak, the
/// strong and the outermost verdict.
fn says(formula: &Formula, values: &[f64], traces: &[ShortTrace]) -> Vec<u8> {
    let mut all = Vec::new();
    for trace in traces {
        let judge = Judge { trace, values };
        for at in 0..trace.length {
            let verdict = |place| u8::from(judge.holds(formula, at, place, &mut 0));
            all.push(
                verdict(Place::Reading(true))
                    | verdict(Place::Reading(false)) << 1
                    | verdict(Place::Outermost) << 2,
            );
        }
    }
    all
}

/// Where a formula stands: outermost, or in the weak (`true`) or strong
/// reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Place {
    Outermost,
    Reading(bool),
}

struct Judge<'a> {
    trace: &'a ShortTrace,
    values: &'a [f64],
}

impl Judge<'_> {
    /// The verdict at an instant. `slot` counts the slots passed, in the order
    /// of the text.
    fn holds(&self, formula: &Formula, at: usize, place: Place, slot: &mut usize) -> bool {
        let first = *slot;
        *slot += formula.slots().len();
        let weak = place != Place::Reading(false);
        if at >= self.trace.length {
            return weak;
        }
        let mut next = first;
        match formula.node() {
            Node::Atom(atom) => self.atom(atom, at, weak, first),
            Node::And(parts) => {
                let verdicts: Vec<bool> = parts
                    .iter()
                    .map(|part| self.holds(part, at, place, &mut next))
                    .collect();
                verdicts.into_iter().all(|verdict| verdict)
            }
            Node::Or(parts) => {
                let verdicts: Vec<bool> = parts
                    .iter()
                    .map(|part| self.holds(part, at, place, &mut next))
                    .collect();
                verdicts.into_iter().any(|verdict| verdict)
            }
            Node::Throughout(window, part) => {
                let (low, high) = self.window(*window, &mut next);
                let below = below(place, *window, true);
                (at + low..=self.last(at, low, high))
                    .all(|t| self.holds(part, t, below, &mut next.clone()))
            }
            Node::Sometime(window, part) => {
                let (low, high) = self.window(*window, &mut next);
                let below = below(place, *window, false);
                (at + low..=self.last(at, low, high))
                    .any(|t| self.holds(part, t, below, &mut next.clone()))
            }
            Node::Until(window, left, right) => {
                let left_slot = next;
                next += left.slots().len();
                let (low, high) = self.window(*window, &mut next);
                let (before, then) = (below(place, *window, true), below(place, *window, false));
                (at + low..=self.last(at, low, high)).any(|t| {
                    self.holds(right, t, then, &mut next.clone())
                        && (at..t).all(|u| self.holds(left, u, before, &mut left_slot.clone()))
                })
            }
        }
    }

    fn atom(&self, atom: &Atom, at: usize, weak: bool, slot: usize) -> bool {
        let samples = self
            .trace
            .signals
            .iter()
            .find(|(signal, _)| signal == atom.signal());
        let Some(sample) = samples.and_then(|(_, samples)| samples[at]) else {
            return weak;
        };
        match atom {
            Atom::Flag { negated, .. } => (sample > 0.5) != *negated,
            Atom::Compare {
                comparison,
                threshold,
                ..
            } => {
                let limit = match threshold {
                    Threshold::Slot => self.values[slot],
                    Threshold::Number(value, _) => value.value(),
                };
                comparison.holds(sample, limit)
            }
        }
    }

    fn window(&self, window: Window, next: &mut usize) -> (usize, usize) {
        let mut steps = |bound: Bound| match bound {
            Bound::End => usize::MAX,
            Bound::Slot => {
                *next += 1;
                self.values[*next - 1] as usize
            }
            Bound::After(duration) => {
                assert!(duration.unit == TimeUnit::Step || duration.is_zero());
                duration.value.value() as usize
            }
        };
        (steps(window.lower()), steps(window.upper()))
    }

    /// All instants beyond the record are alike, so one of them is enough.
    fn last(&self, at: usize, low: usize, high: usize) -> usize {
        at.saturating_add(high).min(self.trace.length.max(at + low))
    }
}

fn below(place: Place, window: Window, weak: bool) -> Place {
    match place {
        Place::Reading(reading) if window.upper() != Bound::End => Place::Reading(reading),
        _ => Place::Reading(weak),
    }
}
