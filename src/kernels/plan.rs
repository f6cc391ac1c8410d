//! A resolved formula as a list of nodes, with the axes that each one reads.

use super::boundary::Fill;
use super::resolved::{Limit, Reading, Resolved, Shape, Span, Step};
use crate::support::{SignalId, SlotId};
use crate::template::Comparison;

/// An axis: a slot and what it stands for at each of its points.
#[derive(Debug, Clone, PartialEq)]
pub struct PlanAxis {
    /// The slot.
    pub slot: SlotId,
    /// Its points.
    pub fills: Vec<Fill>,
}

/// A formula ready to be evaluated on many records.
#[derive(Debug, Clone, PartialEq)]
pub struct Plan {
    pub(super) nodes: Vec<PlanNode>,
    pub(super) root: usize,
    pub(super) axes: Vec<PlanAxis>,
    slots: usize,
}

#[derive(Debug, Clone, PartialEq)]
pub(super) struct PlanNode {
    pub(super) reading: Reading,
    pub(super) op: Op,
    /// The positions of the axes that the node reads.
    axes: Vec<usize>,
}

/// As [`Shape`], with operands by position.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Op {
    Compare {
        signal: SignalId,
        comparison: Comparison,
        limit: Limit,
    },
    Flag {
        signal: SignalId,
        negated: bool,
    },
    And(Vec<usize>),
    Or(Vec<usize>),
    Throughout(Span, usize),
    Sometime(Span, usize),
    Until(Span, usize, usize),
}

impl Plan {
    /// The plan of a formula with so many slots. Every slot but the height has
    /// an axis.
    pub fn new(formula: &Resolved, slots: usize, axes: Vec<PlanAxis>) -> Self {
        let mut plan = Plan {
            nodes: Vec::new(),
            root: 0,
            axes,
            slots,
        };
        plan.root = plan.add(formula);
        plan
    }

    fn add(&mut self, formula: &Resolved) -> usize {
        let mut slots: Vec<SlotId> = Vec::new();
        let op = match &formula.shape {
            Shape::Compare {
                signal,
                comparison,
                limit,
            } => {
                if let Limit::Slot(slot) = limit {
                    slots.push(*slot);
                }
                Op::Compare {
                    signal: *signal,
                    comparison: *comparison,
                    limit: *limit,
                }
            }
            Shape::Flag { signal, negated } => Op::Flag {
                signal: *signal,
                negated: *negated,
            },
            Shape::And(parts) => Op::And(parts.iter().map(|part| self.add(part)).collect()),
            Shape::Or(parts) => Op::Or(parts.iter().map(|part| self.add(part)).collect()),
            Shape::Throughout(span, operand) => {
                slots.extend(window_slots(span));
                Op::Throughout(*span, self.add(operand))
            }
            Shape::Sometime(span, operand) => {
                slots.extend(window_slots(span));
                Op::Sometime(*span, self.add(operand))
            }
            Shape::Until(span, left, right) => {
                slots.extend(window_slots(span));
                Op::Until(*span, self.add(left), self.add(right))
            }
        };
        let mut axes: Vec<usize> = (0..self.axes.len())
            .filter(|at| slots.contains(&self.axes[*at].slot))
            .collect();
        for child in children(&op) {
            axes.extend(&self.nodes[child].axes);
        }
        axes.sort_unstable();
        axes.dedup();
        self.nodes.push(PlanNode {
            reading: formula.reading,
            op,
            axes,
        });
        self.nodes.len() - 1
    }

    /// Every slot as the height, to be overwritten by the axes.
    pub(super) fn fills(&self) -> Vec<Fill> {
        vec![Fill::Height; self.slots]
    }

    /// Number of combinations of the axes that a node reads.
    pub(super) fn combinations(&self, node: &PlanNode) -> usize {
        node.axes
            .iter()
            .map(|axis| self.axes[*axis].fills.len())
            .product()
    }

    /// The number of the combination at a position on all axes.
    pub(super) fn key(&self, node: usize, position: &[usize]) -> usize {
        let axes = &self.nodes[node].axes;
        axes.iter().fold(0, |key, axis| {
            key * self.axes[*axis].fills.len() + position[*axis]
        })
    }
}

fn window_slots(span: &Span) -> impl Iterator<Item = SlotId> {
    [span.lower, span.upper]
        .into_iter()
        .filter_map(|step| match step {
            Step::Slot(slot) => Some(slot),
            _ => None,
        })
}

fn children(op: &Op) -> Vec<usize> {
    match op {
        Op::Compare { .. } | Op::Flag { .. } => Vec::new(),
        Op::And(parts) | Op::Or(parts) => parts.clone(),
        Op::Throughout(_, operand) | Op::Sometime(_, operand) => vec![*operand],
        Op::Until(_, left, right) => vec![*left, *right],
    }
}
