//! Exact heights in one pass.
//!
//! With one slot free, a formula holds at an instant exactly when the slot's
//! value is at least a certain **demand** there, counted in the direction in
//! which the formula gets easier. Demands are whole numbers: 0 where every
//! value will do, [`NEVER`] where none does, between them ranks of the signal's
//! values (for a threshold) or steps (for a time). Conjunction is the larger
//! demand, disjunction the smaller; `throughout` is a sliding maximum,
//! `sometime` a sliding minimum. Nothing is searched for, so heights are exact.

use std::rc::Rc;

use super::plan::Plan;
use super::resolved::{Limit, Reading, Shape, Span, Step};
use super::runs;
use super::window::{fold_at, sliding_max, sliding_min};
use crate::support::{SignalId, SlotId};
use crate::template::{Comparison, Direction};
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

/// Computes demands on one record. Sub-formulas are evaluated once for each
/// combination of the axes that they read, however many grid points there are.
#[derive(Debug)]
pub struct Evaluation<'a> {
    plan: &'a Plan,
    record: Record<'a>,
    /// The different values of the signal that the height limits, ascending.
    values: &'a [f64],
    fills: Vec<Fill>,
    /// The position on each axis.
    position: Vec<usize>,
    known: Vec<Vec<Option<Rc<Vec<u32>>>>>,
}

impl<'a> Evaluation<'a> {
    /// An evaluation of a plan on a record.
    pub fn new(plan: &'a Plan, record: Record<'a>, values: &'a [f64]) -> Self {
        Evaluation {
            plan,
            record,
            values,
            fills: plan.fills(),
            position: vec![0; plan.axes.len()],
            known: plan
                .nodes
                .iter()
                .map(|node| vec![None; plan.combinations(node)])
                .collect(),
        }
    }

    /// The demand at the first sample for every grid point, the last axis
    /// fastest.
    pub fn demands_of_grid(&mut self) -> Vec<u32> {
        let cells: usize = self.plan.axes.iter().map(|axis| axis.fills.len()).product();
        (0..cells)
            .map(|cell| {
                self.go_to(cell);
                self.at_start(self.plan.root)
            })
            .collect()
    }

    fn go_to(&mut self, cell: usize) {
        let mut rest = cell;
        for (at, axis) in self.plan.axes.iter().enumerate().rev() {
            self.position[at] = rest % axis.fills.len();
            rest /= axis.fills.len();
            self.fills[axis.slot.index()] = axis.fills[self.position[at]];
        }
    }

    /// The demand at the first sample: outermost operators are asked for
    /// nothing else.
    fn at_start(&mut self, node: usize) -> u32 {
        let plan = self.plan;
        match &plan.nodes[node].op {
            Shape::And(parts) => parts
                .iter()
                .map(|part| self.at_start(*part))
                .max()
                .unwrap_or(0),
            Shape::Or(parts) => parts
                .iter()
                .map(|part| self.at_start(*part))
                .min()
                .unwrap_or(NEVER),
            Shape::Throughout(span, operand) if self.free(span).is_none() => {
                let demands = self.demands(*operand);
                fold_at(
                    &demands,
                    0,
                    self.window(span),
                    self.beyond(*operand),
                    u32::max,
                )
            }
            Shape::Sometime(span, operand) if self.free(span).is_none() => {
                let demands = self.demands(*operand);
                fold_at(
                    &demands,
                    0,
                    self.window(span),
                    self.beyond(*operand),
                    u32::min,
                )
            }
            _ => self.demands(node)[0],
        }
    }

    /// The demand at every instant.
    fn demands(&mut self, node: usize) -> Rc<Vec<u32>> {
        let key = self.plan.key(node, &self.position);
        if let Some(known) = &self.known[node][key] {
            return Rc::clone(known);
        }
        let demands = Rc::new(self.compute(node));
        self.known[node][key] = Some(Rc::clone(&demands));
        demands
    }

    fn compute(&mut self, node: usize) -> Vec<u32> {
        let plan = self.plan;
        match &plan.nodes[node].op {
            Shape::Compare {
                signal,
                comparison,
                limit,
            } => self.compare(node, *signal, *comparison, *limit),
            Shape::Flag { signal, negated } => {
                self.atom(node, *signal, |sample| boolean((sample > 0.5) != *negated))
            }
            Shape::And(parts) => self.fold(parts, u32::max),
            Shape::Or(parts) => self.fold(parts, u32::min),
            Shape::Throughout(span, operand) => {
                let demands = self.demands(*operand);
                match self.free(span) {
                    None => sliding_max(&demands, self.window(span), self.beyond(*operand)),
                    Some(Free::Upper(lower)) => {
                        runs::longest_run(&demands, lower, self.reading(*operand))
                    }
                    Some(Free::Lower) => runs::last_violation(&demands),
                }
            }
            Shape::Sometime(span, operand) => {
                let demands = self.demands(*operand);
                match self.free(span) {
                    None => sliding_min(&demands, self.window(span), self.beyond(*operand)),
                    Some(Free::Upper(lower)) => {
                        runs::first_time(&demands, lower, self.reading(*operand))
                    }
                    Some(Free::Lower) => runs::last_time(&demands),
                }
            }
            Shape::Until(span, left, right) => {
                let (before, then) = (self.demands(*left), self.demands(*right));
                match self.free(span) {
                    None => super::until::until(
                        &before,
                        &then,
                        self.window(span),
                        [self.beyond(*left), self.beyond(*right)],
                    ),
                    Some(Free::Upper(lower)) => {
                        runs::first_answer(&before, &then, lower, self.reading(*right))
                    }
                    Some(Free::Lower) => runs::last_answer(&before, &then),
                }
            }
        }
    }

    fn fold(&mut self, parts: &[usize], join: impl Fn(u32, u32) -> u32) -> Vec<u32> {
        let mut result = self.demands(parts[0]).to_vec();
        for part in &parts[1..] {
            for (left, right) in result.iter_mut().zip(self.demands(*part).iter()) {
                *left = join(*left, *right);
            }
        }
        result
    }

    fn atom(&self, node: usize, signal: SignalId, judge: impl Fn(f64) -> u32) -> Vec<u32> {
        let unknown = self.beyond(node);
        let judge = |sample: &f64| {
            if sample.is_nan() {
                unknown
            } else {
                judge(*sample)
            }
        };
        self.record.samples(signal).iter().map(judge).collect()
    }

    fn compare(
        &self,
        node: usize,
        signal: SignalId,
        comparison: Comparison,
        limit: Limit,
    ) -> Vec<u32> {
        let limit = match limit {
            Limit::Number(limit) => limit,
            Limit::Slot(slot) => match self.fills[slot.index()] {
                Fill::Threshold(limit) => limit,
                _ => return self.threshold_demands(node, signal, comparison),
            },
        };
        self.atom(node, signal, |sample| {
            boolean(comparison.holds(sample, limit))
        })
    }

    /// The demands of an atom whose threshold is the height. For a strict
    /// comparison the boundary is that of its negation: the value that just
    /// does not do.
    fn threshold_demands(&self, node: usize, signal: SignalId, comparison: Comparison) -> Vec<u32> {
        let unknown = self.beyond(node);
        let count = self.values.len() as u32;
        let easier = comparison.direction() == Direction::LargerIsEasier;
        let demand = |(sample, rank): (&f64, &u32)| match (sample.is_nan(), easier) {
            (true, _) => unknown,
            (false, true) => rank + 1,
            (false, false) => count - rank,
        };
        let ranks = self.record.ranks(signal);
        self.record
            .samples(signal)
            .iter()
            .zip(ranks)
            .map(demand)
            .collect()
    }

    fn reading(&self, node: usize) -> Reading {
        self.plan.nodes[node].reading
    }

    /// What a formula demands beyond the record.
    fn beyond(&self, node: usize) -> u32 {
        boolean(self.reading(node) == Reading::Weak)
    }

    /// Which bound of a window is the height, if any.
    fn free(&self, span: &Span) -> Option<Free> {
        let is_height = |slot: SlotId| self.fills[slot.index()] == Fill::Height;
        if let Step::Slot(slot) = span.lower
            && is_height(slot)
        {
            return Some(Free::Lower);
        }
        match span.upper {
            Step::Slot(slot) if is_height(slot) => Some(Free::Upper(self.steps(span.lower))),
            _ => None,
        }
    }

    fn steps(&self, step: Step) -> usize {
        match step {
            Step::At(steps) => steps as usize,
            Step::End => usize::MAX,
            Step::Slot(slot) => match self.fills[slot.index()] {
                Fill::Steps(steps) => steps as usize,
                other => panic!("a bound is filled with {other:?}"),
            },
        }
    }

    fn window(&self, span: &Span) -> (usize, usize) {
        (self.steps(span.lower), self.steps(span.upper))
    }
}

/// Which bound is the height; for the upper one, the lower bound.
enum Free {
    Lower,
    Upper(usize),
}

/// The demand of something that holds or does not.
pub(super) fn boolean(holds: bool) -> u32 {
    if holds { 0 } else { NEVER }
}
