//! Records that tell two templates apart.

use std::collections::{BTreeMap, HashSet};

use serde::Serialize;

use super::records::{recorded_samples, records, step_choices};
use crate::equivalence::brute::{LENGTH, ShortTraces, Thresholds, Verdicts};
use crate::support::Finite;
use crate::template::{Duration, Formula, Signal, SlotKind, SlotValue, TimeUnit};
use crate::traces::TraceSet;

/// Records tried at first, and when they show no difference.
const COUNTS: [usize; 3] = [16, 64, 160];

/// Members of a family that are worked out at most.
const MOST: usize = 6000;

/// A short record and what the template says on it.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Record {
    /// The samples of each recorded channel and flag.
    pub samples: BTreeMap<String, Vec<f64>>,
    /// Whether the template of the witness is satisfied.
    pub satisfied: bool,
}

/// What tells two templates apart: with these slot values one of them gives
/// these verdicts on these records, and the other gives them with no values.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Witness {
    /// The template that the slot values belong to: 1 or 2.
    pub template: usize,
    /// Its slots, filled.
    pub slots: BTreeMap<String, String>,
    /// The template with its slots filled.
    pub specification: String,
    /// Length of a step of the records, `1 step` where there is no time.
    pub step: String,
    /// The records.
    pub records: Vec<Record>,
}

/// Looks for a witness.
pub(super) fn search(a: &Formula, b: &Formula) -> Option<Witness> {
    for count in COUNTS {
        for (number, step) in step_choices([a, b]).into_iter().enumerate() {
            let seed = (count * 16 + number) as u64;
            let Some((short, traces)) = records([a, b], step, count, seed) else {
                continue;
            };
            let members = |formula| short.members(formula, Thresholds::Beyond, MOST);
            let (Some(first), Some(second)) = (members(a), members(b)) else {
                continue;
            };
            // A record that starts later has other derived signals, so only
            // whole records count where there are any.
            let derived = short.columns.iter().any(|c| is_derived(&c.signal));
            let starts = if derived { 1 } else { LENGTH };
            for (template, own, other, formula) in
                [(1, &first, &second, a), (2, &second, &first, b)]
            {
                if let Some(member) = missing(own, other, starts) {
                    let found = Found {
                        template,
                        slots: values(formula, member, &short, starts)?,
                        records: fewest(member, other, starts),
                        member,
                    };
                    return Some(witness(formula, &found, &short, &traces));
                }
            }
        }
    }
    None
}

/// What tells two templates apart, before it is put in words.
struct Found<'a> {
    template: usize,
    slots: Vec<SlotValue>,
    /// Trace and start of each record.
    records: Vec<(usize, usize)>,
    member: &'a Verdicts,
}

fn is_derived(signal: &Signal) -> bool {
    matches!(signal, Signal::Derived(_))
}

/// The verdicts on the records that start at one of the first instants.
fn verdicts(member: &Verdicts, starts: usize) -> Vec<u8> {
    let mask = 0xff_u8 >> (LENGTH - starts);
    member.root.iter().map(|bits| bits & mask).collect()
}

/// A member of one family whose outermost verdicts no member of another has.
fn missing<'a>(own: &'a [Verdicts], other: &[Verdicts], starts: usize) -> Option<&'a Verdicts> {
    let known: HashSet<Vec<u8>> = other.iter().map(|m| verdicts(m, starts)).collect();
    own.iter()
        .find(|member| !known.contains(&verdicts(member, starts)))
}

/// Slot values that make a member.
fn values(
    formula: &Formula,
    member: &Verdicts,
    short: &ShortTraces,
    starts: usize,
) -> Option<Vec<SlotValue>> {
    let ranges: Vec<Vec<SlotValue>> = formula
        .slots()
        .iter()
        .map(|slot| match &slot.kind {
            SlotKind::Threshold(signal) => {
                let column = short.columns.iter().find(|c| c.signal == *signal);
                let values = column.map(|c| c.thresholds(Thresholds::Beyond));
                let finite = values.unwrap_or_default().into_iter();
                finite
                    .filter_map(|value| Some(SlotValue::Threshold(Finite::new(value).ok()?)))
                    .collect()
            }
            SlotKind::Time => (0..=LENGTH).filter_map(|k| time(k, short.step)).collect(),
        })
        .collect();
    let count: usize = ranges.iter().map(Vec::len).product();
    (0..count).find_map(|number| {
        let mut rest = number;
        let chosen: Vec<SlotValue> = ranges
            .iter()
            .map(|range| {
                let value = range[rest % range.len()];
                rest /= range.len();
                value
            })
            .collect();
        let filled = formula.fill(&chosen.iter().copied().map(Some).collect::<Vec<_>>());
        let own = short.members(&filled, Thresholds::Beyond, 1)?;
        (verdicts(&own[0], starts) == verdicts(member, starts)).then_some(chosen)
    })
}

fn time(steps: usize, step: Option<f64>) -> Option<SlotValue> {
    if steps == 0 {
        return Some(SlotValue::Time(Duration::zero()));
    }
    let (value, unit) = match step {
        Some(step) => (steps as f64 * step, TimeUnit::Second),
        None => (steps as f64, TimeUnit::Step),
    };
    let value = Finite::new(value).ok()?;
    Some(SlotValue::Time(Duration { value, unit }))
}

/// Puts the witness in words.
fn witness(
    formula: &Formula,
    found: &Found<'_>,
    short: &ShortTraces,
    traces: &TraceSet,
) -> Witness {
    let slots = found.slots.iter().copied();
    let filled = formula.fill(&slots.map(Some).collect::<Vec<_>>());
    let text = |value: &SlotValue| match value {
        SlotValue::Threshold(value) => value.value().to_string(),
        SlotValue::Time(duration) => duration.to_string(),
    };
    let records = found.records.iter().map(|(trace, start)| Record {
        samples: recorded_samples(traces, *trace, *start)
            .into_iter()
            .collect(),
        satisfied: found.member.root[*trace] >> start & 1 == 1,
    });
    Witness {
        template: found.template,
        slots: found
            .slots
            .iter()
            .enumerate()
            .map(|(number, value)| (format!("?{}", number + 1), text(value)))
            .collect(),
        specification: filled.to_string(),
        step: short
            .step
            .map_or_else(|| "1 step".to_owned(), |step| format!("{step} s")),
        records: records.collect(),
    }
}

/// Records (trace and start) on which a member differs from every one of some
/// others: greedily those that tell most of the rest apart, shorter first.
fn fewest(member: &Verdicts, other: &[Verdicts], starts: usize) -> Vec<(usize, usize)> {
    let differs = |other: &Verdicts, (trace, start): (usize, usize)| {
        (member.root[trace] ^ other.root[trace]) >> start & 1 == 1
    };
    let places: Vec<(usize, usize)> = (0..starts)
        .rev()
        .flat_map(|start| (0..member.root.len()).map(move |trace| (trace, start)))
        .collect();
    let mut left: Vec<&Verdicts> = other.iter().collect();
    let mut chosen = Vec::new();
    while !left.is_empty() {
        let told = |place: &(usize, usize)| left.iter().filter(|m| differs(m, *place)).count();
        let mut best = (0, places[0]);
        for place in &places {
            let count = told(place);
            if count > best.0 {
                best = (count, *place);
            }
        }
        if best.0 == 0 {
            break;
        }
        left.retain(|member| !differs(member, best.1));
        chosen.push(best.1);
    }
    chosen
}
