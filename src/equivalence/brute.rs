//! The judge of rules: families worked out value by value on short traces.
//!
//! A member of a family (the template with all slots filled) says three things
//! at each instant of a trace: its weak verdict, its strong one, and its verdict
//! when it stands outermost on the record that starts there. A family is the
//! set of what its members say on a sample of traces. All traces have eight
//! samples, so a verdict on a trace is one byte, bit t being the instant t; a
//! window is a shift that brings in the value beyond the record (true in the
//! weak reading, false in the strong one). Outermost, bit t is the verdict on
//! the record that starts at t, so records of one to eight samples are covered.
//!
//! A pass is evidence, a difference is proof. The evaluator is written from the
//! definition and shares nothing with the kernels; a test compares the two.

use std::collections::{BTreeSet, HashSet};

use crate::support::Stream;
use crate::template::{
    Atom, Bound, Duration, Formula, Kind, Node, Signal, Threshold, TimeUnit, Window,
};

/// Samples of a trace.
pub const LENGTH: usize = 8;

/// Values that channels take: 0, 1, 2, 3.
const VALUES: usize = 4;

/// Thresholds that slots take.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Thresholds {
    /// The values of the data only.
    InRange,
    /// One value below and one above the data too.
    Beyond,
}

/// A signal of the traces.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// The signal.
    pub signal: Signal,
    /// For each trace its samples (flags 0 and 1); `None` where not known.
    pub samples: Vec<[Option<f64>; LENGTH]>,
}

impl Column {
    /// The values that a threshold of this signal takes.
    pub fn thresholds(&self, which: Thresholds) -> Vec<f64> {
        let mut values: Vec<f64> = self.samples.iter().flatten().flatten().copied().collect();
        values.sort_unstable_by(f64::total_cmp);
        values.dedup();
        if let (Thresholds::Beyond, Some(first), Some(last)) =
            (which, values.first().copied(), values.last().copied())
        {
            values.insert(0, first - 1.0);
            values.push(last + 1.0);
        }
        values
    }
}

/// Short traces.
#[derive(Debug, Clone, PartialEq)]
pub struct ShortTraces {
    /// The signals, each with its samples.
    pub columns: Vec<Column>,
    /// The length of a step in seconds, where durations are not in steps.
    pub step: Option<f64>,
    count: usize,
}

impl ShortTraces {
    /// Random traces: of each signal a mixture of independent, held and rarely
    /// changing samples. `has_gaps` says which signals have unknown samples.
    pub fn random(
        signals: &[Signal],
        has_gaps: impl Fn(&Signal) -> bool,
        count: usize,
        seed: u64,
    ) -> ShortTraces {
        let columns = signals.iter().enumerate().map(|(place, signal)| {
            let values = values_of(signal);
            let samples = (0..count).map(|number| {
                let purpose = (number * signals.len() + place) as u64;
                let mut stream = Stream::new(seed, "short traces", purpose);
                let hold = [1, 1, 2, 5][stream.below(4)];
                let unknown = if has_gaps(signal) {
                    [0, 20, 50][stream.below(3)]
                } else {
                    0
                };
                let mut last = stream.below(values);
                std::array::from_fn(|_| {
                    if stream.below(hold) == 0 {
                        last = stream.below(values);
                    }
                    (stream.below(100) >= unknown).then_some(last as f64)
                })
            });
            Column {
                signal: signal.clone(),
                samples: samples.collect(),
            }
        });
        ShortTraces::of(columns.collect(), None)
    }

    /// All traces over some signals whose samples change only at the last
    /// `steps` instants (before them they are held): all records of up to
    /// `steps` samples are among their ends.
    pub fn exhaustive(signals: &[Signal], steps: u32) -> ShortTraces {
        let each: Vec<usize> = signals.iter().map(|s| values_of(s).pow(steps)).collect();
        let count = each.iter().product();
        let mut stride = 1;
        let columns = signals.iter().zip(&each).map(|(signal, own)| {
            let values = values_of(signal);
            let samples = (0..count).map(|number| {
                let code = number / stride % own;
                std::array::from_fn(|at| {
                    let place = (at + steps as usize).saturating_sub(LENGTH);
                    Some((code / values.pow(place as u32) % values) as f64)
                })
            });
            let column = Column {
                signal: signal.clone(),
                samples: samples.collect(),
            };
            stride *= own;
            column
        });
        ShortTraces::of(columns.collect(), None)
    }

    /// Traces of given samples.
    ///
    /// # Panics
    /// When the columns have different numbers of traces.
    pub fn of(columns: Vec<Column>, step: Option<f64>) -> ShortTraces {
        let count = columns.first().map_or(0, |column| column.samples.len());
        assert!(columns.iter().all(|column| column.samples.len() == count));
        ShortTraces {
            columns,
            step,
            count,
        }
    }

    /// Number of traces.
    pub fn len(&self) -> usize {
        self.count
    }

    /// Whether there is no trace.
    pub fn is_empty(&self) -> bool {
        self.count == 0
    }

    /// The different members of a formula, or `None` when there are more than
    /// `most` of them, or of those of a part.
    pub fn members(
        &self,
        formula: &Formula,
        thresholds: Thresholds,
        most: usize,
    ) -> Option<Vec<Verdicts>> {
        let members = match formula.node() {
            Node::Atom(atom) => self.atom(atom, thresholds),
            Node::And(parts) => self.connective(parts, thresholds, most, |a, b| a & b)?,
            Node::Or(parts) => self.connective(parts, thresholds, most, |a, b| a | b)?,
            Node::Throughout(window, part) => {
                let parts = self.members(part, thresholds, most)?;
                self.each_window(*window)
                    .flat_map(|window| parts.iter().map(move |part| throughout(window, part)))
                    .collect()
            }
            Node::Sometime(window, part) => {
                let parts = self.members(part, thresholds, most)?;
                self.each_window(*window)
                    .flat_map(|window| parts.iter().map(move |part| sometime(window, part)))
                    .collect()
            }
            Node::Until(window, left, right) => {
                let lefts = self.members(left, thresholds, most)?;
                let rights = self.members(right, thresholds, most)?;
                let windows = self.each_window(*window).count();
                if lefts.len() * rights.len() * windows > 8 * most {
                    return None;
                }
                let mut members = Vec::new();
                for window in self.each_window(*window) {
                    for left in &lefts {
                        members.extend(rights.iter().map(|right| until(window, left, right)));
                    }
                }
                members
            }
        };
        let members = distinct(members);
        (members.len() <= most).then_some(members)
    }

    /// The family: what its members say, in all three places.
    pub fn family(
        &self,
        formula: &Formula,
        thresholds: Thresholds,
        most: usize,
    ) -> Option<BTreeSet<u128>> {
        let members = self.members(formula, thresholds, most)?;
        Some(members.iter().map(Verdicts::digest).collect())
    }

    /// What its members say when they stand outermost.
    pub fn root_family(
        &self,
        formula: &Formula,
        thresholds: Thresholds,
        most: usize,
    ) -> Option<BTreeSet<u128>> {
        let members = self.members(formula, thresholds, most)?;
        Some(members.iter().map(|member| digest(&member.root)).collect())
    }

    fn atom(&self, atom: &Atom, thresholds: Thresholds) -> Vec<Verdicts> {
        let column = self
            .columns
            .iter()
            .find(|column| column.signal == *atom.signal())
            .unwrap_or_else(|| panic!("{} is no signal of these traces", atom.signal()));
        let member = |holds: &dyn Fn(f64) -> bool| {
            let mut verdicts = Verdicts::sized(self.count);
            for (trace, samples) in column.samples.iter().enumerate() {
                for (at, sample) in samples.iter().enumerate() {
                    let (weak, strong) = match sample {
                        Some(value) => (holds(*value), holds(*value)),
                        None => (true, false),
                    };
                    verdicts.weak[trace] |= u8::from(weak) << at;
                    verdicts.strong[trace] |= u8::from(strong) << at;
                }
            }
            verdicts.root.copy_from_slice(&verdicts.weak);
            verdicts
        };
        match atom {
            Atom::Flag { negated, .. } => vec![member(&|value| (value > 0.5) != *negated)],
            Atom::Compare {
                comparison,
                threshold: Threshold::Number(limit, _),
                ..
            } => vec![member(&|value| comparison.holds(value, limit.value()))],
            Atom::Compare { comparison, .. } => column
                .thresholds(thresholds)
                .into_iter()
                .map(|limit| member(&move |value| comparison.holds(value, limit)))
                .collect(),
        }
    }

    /// The bounds of a window, for all values of its slots.
    fn each_window(&self, window: Window) -> impl Iterator<Item = Steps> + use<> {
        let values = |bound: Bound, up: bool| match bound {
            Bound::End => vec![None],
            Bound::Slot => (0..=LENGTH).map(Some).collect(),
            Bound::After(duration) => vec![Some(self.steps(duration, up))],
        };
        let upper = values(window.upper(), false);
        values(window.lower(), true)
            .into_iter()
            .flat_map(move |low| upper.clone().into_iter().map(move |high| (low, high)))
            .map(|(low, high)| (low.unwrap_or(0), high))
    }

    /// Whole steps of a duration, rounded up or down, at most [`LENGTH`].
    fn steps(&self, duration: Duration, up: bool) -> usize {
        let value = duration.value.value();
        let steps = match (duration.unit.seconds(), self.step) {
            (Some(seconds), Some(step)) => value * seconds / step,
            _ => {
                assert!(duration.unit == TimeUnit::Step || duration.is_zero());
                value
            }
        };
        // A quotient that is whole but for rounding is that whole number.
        let near = steps.round();
        let whole = if (steps - near).abs() < 1e-9 * near.max(1.0) {
            near
        } else if up {
            steps.ceil()
        } else {
            steps.floor()
        };
        (whole as usize).min(LENGTH)
    }

    fn connective(
        &self,
        parts: &[Formula],
        thresholds: Thresholds,
        most: usize,
        joined: fn(u8, u8) -> u8,
    ) -> Option<Vec<Verdicts>> {
        let mut all: Option<Vec<Verdicts>> = None;
        for part in parts {
            let own = self.members(part, thresholds, most)?;
            all = Some(match all {
                None => own,
                Some(before) => {
                    if before.len() * own.len() > 8 * most {
                        return None;
                    }
                    let pairs = before
                        .iter()
                        .flat_map(|a| own.iter().map(move |b| a.joined(b, joined)));
                    distinct(pairs.collect())
                }
            });
        }
        all
    }
}

fn values_of(signal: &Signal) -> usize {
    match signal.kind() {
        Kind::Flag => 2,
        Kind::Numeric => VALUES,
    }
}

/// What one member says on all traces: a byte a trace, bit t for instant t.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub struct Verdicts {
    /// In the weak reading.
    pub weak: Vec<u8>,
    /// In the strong reading.
    pub strong: Vec<u8>,
    /// Outermost, on the record that starts at t.
    pub root: Vec<u8>,
}

impl Verdicts {
    fn sized(count: usize) -> Verdicts {
        Verdicts {
            weak: vec![0; count],
            strong: vec![0; count],
            root: vec![0; count],
        }
    }

    /// Both members by a connective.
    #[must_use]
    pub fn joined(&self, other: &Verdicts, joined: fn(u8, u8) -> u8) -> Verdicts {
        let both = |a: &[u8], b: &[u8]| a.iter().zip(b).map(|(a, b)| joined(*a, *b)).collect();
        Verdicts {
            weak: both(&self.weak, &other.weak),
            strong: both(&self.strong, &other.strong),
            root: both(&self.root, &other.root),
        }
    }

    /// A digest of all three verdicts.
    pub fn digest(&self) -> u128 {
        let parts = [&self.weak, &self.strong, &self.root];
        parts.iter().fold(1, |all, part| {
            (all ^ digest(part)).wrapping_mul(0x0000_0001_0000_0000_0000_0000_0000_013b)
        })
    }
}

impl Verdicts {
    /// A digest of the outermost verdicts.
    pub fn root_digest(&self) -> u128 {
        digest(&self.root)
    }
}

/// FNV-1a with 128 bits.
fn digest(bytes: &[u8]) -> u128 {
    let offset = 0x6c62_272e_07bb_0142_62b8_2175_6295_c58d;
    bytes.iter().fold(offset, |digest, byte| {
        (digest ^ u128::from(*byte)).wrapping_mul(0x0000_0000_0100_0000_0000_0000_0000_013b)
    })
}

fn distinct(members: Vec<Verdicts>) -> Vec<Verdicts> {
    let mut seen = HashSet::new();
    members
        .into_iter()
        .filter(|member| seen.insert(member.digest()))
        .collect()
}

/// Bounds of a window with all slots filled: whole steps, cut at the length of
/// the traces (all instants beyond are alike); no upper bound is `None`.
type Steps = (usize, Option<usize>);

/// The verdicts k instants later, where `beyond` holds after the record.
fn later(verdicts: &[u8], k: usize, beyond: bool) -> impl Iterator<Item = u8> {
    verdicts.iter().map(move |bits| {
        let kept = if k < LENGTH { 0xff >> k } else { 0_u8 };
        let moved = if k < LENGTH { bits >> k } else { 0 };
        if beyond { moved | !kept } else { moved }
    })
}

fn throughout(window: Steps, part: &Verdicts) -> Verdicts {
    let over = |verdicts: &[u8], beyond: bool| {
        let mut all = vec![0xff; verdicts.len()];
        for k in window.0..=window.1.unwrap_or(LENGTH) {
            for (bits, own) in all.iter_mut().zip(later(verdicts, k, beyond)) {
                *bits &= own;
            }
        }
        all
    };
    let weak = over(&part.weak, true);
    Verdicts {
        strong: match window.1 {
            None => weak.clone(),
            Some(_) => over(&part.strong, false),
        },
        root: weak.clone(),
        weak,
    }
}

fn sometime(window: Steps, part: &Verdicts) -> Verdicts {
    let over = |verdicts: &[u8], beyond: bool| {
        let mut any = vec![0; verdicts.len()];
        for k in window.0..=window.1.unwrap_or(LENGTH) {
            for (bits, own) in any.iter_mut().zip(later(verdicts, k, beyond)) {
                *bits |= own;
            }
        }
        any
    };
    let strong = over(&part.strong, false);
    Verdicts {
        weak: match window.1 {
            None => strong.clone(),
            Some(_) => over(&part.weak, true),
        },
        root: strong.clone(),
        strong,
    }
}

fn until(window: Steps, left: &Verdicts, right: &Verdicts) -> Verdicts {
    let over = |left: (&[u8], bool), right: (&[u8], bool)| {
        let mut so_far = vec![0xff; left.0.len()];
        let mut any = vec![0; left.0.len()];
        for k in 0..=window.1.unwrap_or(LENGTH) {
            if k >= window.0 {
                for ((bits, own), kept) in
                    any.iter_mut().zip(later(right.0, k, right.1)).zip(&so_far)
                {
                    *bits |= own & kept;
                }
            }
            for (bits, own) in so_far.iter_mut().zip(later(left.0, k, left.1)) {
                *bits &= own;
            }
        }
        any
    };
    let root = over((&left.weak, true), (&right.strong, false));
    match window.1 {
        None => Verdicts {
            weak: root.clone(),
            strong: root.clone(),
            root,
        },
        Some(_) => Verdicts {
            weak: over((&left.weak, true), (&right.weak, true)),
            strong: over((&left.strong, false), (&right.strong, false)),
            root,
        },
    }
}
