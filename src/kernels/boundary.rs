//! Exact heights in one pass.
//!
//! With one slot free, a formula holds at an instant exactly when the slot's
//! value is at least a certain **demand** there, counted in the direction in
//! which the formula gets easier. Demands are whole numbers: 0 where every
//! value will do, [`NEVER`] where none does, between them ranks of the signal's
//! values (for a threshold) or steps (for a time). Conjunction is the larger
//! demand, disjunction the smaller; `throughout` is a sliding maximum,
//! `sometime` a sliding minimum. Nothing is searched for, so heights are exact.

use super::resolved::{Limit, Reading, Resolved, Shape, Span, Step};
use super::window::{sliding_max, sliding_min};
use crate::support::{SignalId, SlotId};
use crate::traces::Record;

/// The demand that no value meets.
pub const NEVER: u32 = u32::MAX;

/// What a slot stands for while a boundary is computed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Fill {
    /// This slot is solved.
    Height,
    /// A threshold.
    Threshold(f64),
    /// A time in steps.
    Steps(u32),
}

/// Ranks of a signal's values over all traces: what makes demands of
/// thresholds whole numbers.
#[derive(Debug, Clone, PartialEq)]
pub struct Ranks {
    /// The different values, ascending.
    pub values: Vec<f64>,
}

impl Ranks {
    /// The rank of a sample, which must be one of the values.
    fn rank(&self, sample: f64) -> u32 {
        self.values.partition_point(|value| *value < sample) as u32
    }
}

/// Everything a boundary needs beside the formula.
#[derive(Debug, Clone, Copy)]
pub struct Problem<'a> {
    /// The record.
    pub record: Record<'a>,
    /// What each slot stands for.
    pub fills: &'a [Fill],
    /// For a threshold height: the ranks of its signal.
    pub ranks: &'a Ranks,
}

/// The demand at the first sample.
pub fn demand(formula: &Resolved, problem: Problem<'_>) -> u32 {
    problem.demands(formula)[0]
}

impl Problem<'_> {
    fn length(&self) -> usize {
        self.record.length()
    }

    fn fill(&self, slot: SlotId) -> Fill {
        self.fills[slot.index()]
    }

    /// The demand at every instant.
    fn demands(&self, formula: &Resolved) -> Vec<u32> {
        match &formula.shape {
            Shape::Compare { signal, .. } | Shape::Flag { signal, .. } => {
                self.atom(formula, *signal)
            }
            Shape::And(operands) => self.fold(operands, u32::max),
            Shape::Or(operands) => self.fold(operands, u32::min),
            Shape::Throughout(span, operand) => {
                let demands = self.demands(operand);
                match self.free(span) {
                    None => sliding_max(&demands, self.window(span), beyond(operand)),
                    Some(Free::Upper(lower)) => self.longest_run(&demands, lower, operand.reading),
                    Some(Free::Lower) => self.last_violation(&demands),
                }
            }
            Shape::Sometime(span, operand) => {
                let demands = self.demands(operand);
                match self.free(span) {
                    None => sliding_min(&demands, self.window(span), beyond(operand)),
                    Some(Free::Upper(lower)) => self.first_time(&demands, lower, operand.reading),
                    Some(Free::Lower) => self.last_time(&demands),
                }
            }
            Shape::Until(span, left, right) => {
                let (before, then) = (self.demands(left), self.demands(right));
                match self.free(span) {
                    None => self.until(&before, &then, span, [left.reading, right.reading]),
                    Some(Free::Upper(lower)) => {
                        self.first_answer(&before, &then, lower, right.reading)
                    }
                    Some(Free::Lower) => self.last_answer(&before, &then),
                }
            }
        }
    }

    fn fold(&self, operands: &[Resolved], join: impl Fn(u32, u32) -> u32) -> Vec<u32> {
        let mut all = operands.iter().map(|operand| self.demands(operand));
        let mut result = all.next().unwrap_or_default();
        for other in all {
            for (left, right) in result.iter_mut().zip(&other) {
                *left = join(*left, *right);
            }
        }
        result
    }

    fn atom(&self, formula: &Resolved, signal: SignalId) -> Vec<u32> {
        let unknown = beyond(formula);
        let samples = self.record.samples(signal);
        let judge = |sample: f64| match &formula.shape {
            Shape::Flag { negated, .. } => boolean((sample > 0.5) != *negated),
            Shape::Compare {
                comparison, limit, ..
            } => {
                let limit = match limit {
                    Limit::Number(limit) => *limit,
                    Limit::Slot(slot) => match self.fill(*slot) {
                        Fill::Threshold(limit) => limit,
                        _ => return self.threshold_demand(sample, *comparison),
                    },
                };
                boolean(comparison.holds(sample, limit))
            }
            _ => unknown,
        };
        let judge = |sample: &f64| {
            if sample.is_nan() {
                unknown
            } else {
                judge(*sample)
            }
        };
        samples.iter().map(judge).collect()
    }

    /// The demand of an atom whose threshold is the height. For a strict
    /// comparison the boundary is that of its negation: the value that just
    /// does not do.
    fn threshold_demand(&self, sample: f64, comparison: crate::template::Comparison) -> u32 {
        use crate::template::Direction;
        let rank = self.ranks.rank(sample);
        match comparison.direction() {
            Direction::LargerIsEasier => rank + 1,
            Direction::LargerIsHarder => self.ranks.values.len() as u32 - rank,
        }
    }

    /// Which bound of a window is the height, if any.
    fn free(&self, span: &Span) -> Option<Free> {
        if let Step::Slot(slot) = span.lower
            && self.fill(slot) == Fill::Height
        {
            return Some(Free::Lower);
        }
        match span.upper {
            Step::Slot(slot) if self.fill(slot) == Fill::Height => {
                Some(Free::Upper(self.steps(span.lower)))
            }
            _ => None,
        }
    }

    fn steps(&self, step: Step) -> usize {
        match step {
            Step::At(steps) => steps as usize,
            Step::End => usize::MAX,
            Step::Slot(slot) => match self.fill(slot) {
                Fill::Steps(steps) => steps as usize,
                other => panic!("a bound is filled with {other:?}"),
            },
        }
    }

    fn window(&self, span: &Span) -> (usize, usize) {
        (self.steps(span.lower), self.steps(span.upper))
    }

    /// `sometime [lower, ?]`: steps to the first instant that satisfies.
    fn first_time(&self, demands: &[u32], lower: usize, reading: Reading) -> Vec<u32> {
        let next = next_where(demands, |demand| demand == 0);
        self.each(|at| {
            let found = at_or_end(&next, at + lower);
            match (found < self.length(), reading) {
                (true, _) => steps_demand(found - at),
                (false, Reading::Weak) => steps_demand((at + lower).max(self.length()) - at),
                (false, Reading::Strong) => NEVER,
            }
        })
    }

    /// `throughout [?, end]`: steps to just after the last violation.
    fn last_violation(&self, demands: &[u32]) -> Vec<u32> {
        let last = demands.iter().rposition(|demand| *demand != 0);
        self.each(|at| steps_demand(last.map_or(0, |last| (last + 1).saturating_sub(at))))
    }

    /// `throughout [lower, ?]`: the longest time that it keeps holding, which
    /// is easier the shorter it is.
    fn longest_run(&self, demands: &[u32], lower: usize, reading: Reading) -> Vec<u32> {
        let next = next_where(demands, |demand| demand != 0);
        self.each(|at| {
            let violated = at_or_end(&next, at + lower);
            let violated = match (violated < self.length(), reading) {
                (true, _) => violated,
                (false, Reading::Weak) => return 0,
                (false, Reading::Strong) => self.length(),
            };
            if violated <= at + lower {
                NEVER
            } else {
                self.longest(violated - 1 - at)
            }
        })
    }

    /// `sometime [?, end]`: how late it still comes.
    fn last_time(&self, demands: &[u32]) -> Vec<u32> {
        let last = demands.iter().rposition(|demand| *demand == 0);
        self.each(|at| match last {
            Some(last) if last >= at => self.longest(last - at),
            _ => NEVER,
        })
    }

    /// `until [lower, ?]`: steps to the first instant of the right side that
    /// the left side reaches.
    fn first_answer(
        &self,
        before: &[u32],
        then: &[u32],
        lower: usize,
        reading: Reading,
    ) -> Vec<u32> {
        let broken = next_where(before, |demand| demand != 0);
        let next = next_where(then, |demand| demand == 0);
        self.each(|at| {
            let mut found = at_or_end(&next, at + lower);
            if found >= self.length() {
                if reading == Reading::Strong {
                    return NEVER;
                }
                found = (at + lower).max(self.length());
            }
            if at_or_end(&broken, at) < found.min(self.length()) {
                NEVER
            } else {
                steps_demand(found - at)
            }
        })
    }

    /// `until [?, end]`: the last instant of the right side that the left side
    /// reaches.
    fn last_answer(&self, before: &[u32], then: &[u32]) -> Vec<u32> {
        let broken = next_where(before, |demand| demand != 0);
        self.each(|at| {
            let reach = at_or_end(&broken, at).min(self.length() - 1);
            match then[at..=reach].iter().rposition(|demand| *demand == 0) {
                Some(steps) => self.longest(steps),
                None => NEVER,
            }
        })
    }

    fn until(&self, before: &[u32], then: &[u32], span: &Span, readings: [Reading; 2]) -> Vec<u32> {
        let (lower, upper) = self.window(span);
        let [left_beyond, right_beyond] = readings.map(of_reading);
        self.each(|at| {
            let end = self.length();
            let (first, last) = (at.saturating_add(lower), at.saturating_add(upper).min(end));
            let mut kept = 0;
            let mut best = NEVER;
            for t in at..=last {
                if t >= first {
                    let answer = if t < end { then[t] } else { right_beyond };
                    best = best.min(answer.max(kept));
                }
                kept = kept.max(if t < end { before[t] } else { left_beyond });
            }
            if first > end {
                best = right_beyond.max(kept);
            }
            best
        })
    }

    fn each(&self, demand: impl Fn(usize) -> u32) -> Vec<u32> {
        (0..self.length()).map(demand).collect()
    }

    /// The demand of "at most `steps`", counted from the hard end.
    fn longest(&self, steps: usize) -> u32 {
        (self.length() - steps.min(self.length() - 1)) as u32
    }
}

/// Which bound is the height; for the upper one, the lower bound.
enum Free {
    Lower,
    Upper(usize),
}

fn boolean(holds: bool) -> u32 {
    if holds { 0 } else { NEVER }
}

fn of_reading(reading: Reading) -> u32 {
    boolean(reading == Reading::Weak)
}

/// What a formula demands beyond the record.
fn beyond(formula: &Resolved) -> u32 {
    of_reading(formula.reading)
}

/// The demand of "at least so many steps": 0 is kept for "every value".
fn steps_demand(steps: usize) -> u32 {
    u32::try_from(steps).map_or(NEVER, |steps| steps.saturating_add(1))
}

/// For each instant the next one (itself included) whose demand passes; the
/// length where there is none.
fn next_where(demands: &[u32], pass: impl Fn(u32) -> bool) -> Vec<usize> {
    let mut next = vec![demands.len(); demands.len()];
    let mut found = demands.len();
    for at in (0..demands.len()).rev() {
        if pass(demands[at]) {
            found = at;
        }
        next[at] = found;
    }
    next
}

fn at_or_end(next: &[usize], at: usize) -> usize {
    next.get(at).copied().unwrap_or(next.len())
}
