//! The meaning of a specification, straight from its definition.
//!
//! This is the judge of everything else, so it is written to be read beside
//! the definition and is as slow as it looks:
//!
//! * at an instant beyond the record every formula is satisfied in the weak
//!   reading and violated in the strong one, and so is an atom at a sample that
//!   is not known;
//! * at an instant of the record an atom compares the sample, Boolean
//!   operators are as usual, and the windows of temporal operators are walked
//!   instant by instant (`end` means: to the end of the record and beyond it);
//! * the reading of every node was fixed when the formula was resolved.

use super::resolved::{Limit, Reading, Resolved, Shape, Span, Step};
use crate::support::SignalId;
use crate::traces::Record;

/// Whether a record satisfies a specification: its verdict at the first
/// sample.
///
/// # Panics
/// When the formula has a slot.
pub fn satisfied(formula: &Resolved, record: Record<'_>) -> bool {
    holds(formula, record, 0)
}

/// The verdict at an instant.
fn holds(formula: &Resolved, record: Record<'_>, at: usize) -> bool {
    let beyond = formula.reading == Reading::Weak;
    if at >= record.length() {
        return beyond;
    }
    match &formula.shape {
        Shape::Compare {
            signal,
            comparison,
            limit,
        } => {
            let Limit::Number(limit) = limit else {
                panic!("a specification has no slots")
            };
            known(record, *signal, at).map_or(beyond, |sample| comparison.holds(sample, *limit))
        }
        Shape::Flag { signal, negated } => {
            known(record, *signal, at).map_or(beyond, |sample| (sample > 0.5) != *negated)
        }
        Shape::And(operands) => operands.iter().all(|f| holds(f, record, at)),
        Shape::Or(operands) => operands.iter().any(|f| holds(f, record, at)),
        Shape::Throughout(span, f) => window(span, at, record).all(|t| holds(f, record, t)),
        Shape::Sometime(span, f) => window(span, at, record).any(|t| holds(f, record, t)),
        Shape::Until(span, left, right) => window(span, at, record)
            .any(|t| holds(right, record, t) && (at..t).all(|before| holds(left, record, before))),
    }
}

fn known(record: Record<'_>, signal: SignalId, at: usize) -> Option<f64> {
    Some(record.samples(signal)[at]).filter(|sample| !sample.is_nan())
}

/// The instants of a window. All instants beyond the record are alike, so of a
/// window that reaches beyond it one such instant is enough.
fn window(span: &Span, at: usize, record: Record<'_>) -> std::ops::RangeInclusive<usize> {
    let steps = |step: Step| match step {
        Step::At(steps) => steps as usize,
        Step::End => usize::MAX,
        Step::Slot(_) => panic!("a specification has no slots"),
    };
    let beyond = record.length();
    let lower = at.saturating_add(steps(span.lower));
    let upper = at.saturating_add(steps(span.upper));
    lower.min(beyond)..=upper.min(beyond)
}
