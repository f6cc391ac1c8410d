//! The resolved form of a formula: signals and slots by index, bounds in whole
//! steps, and for every node the reading in which it stands.

use crate::support::{SignalId, SlotId};
use crate::template::Comparison;

/// How an instant beyond the record, or a sample that is not known, is read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Reading {
    /// As satisfied.
    Weak,
    /// As violated.
    Strong,
}

/// A bound in whole steps.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Step {
    /// So many steps.
    At(u32),
    /// A slot.
    Slot(SlotId),
    /// No upper bound.
    End,
}

/// A window in whole steps.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Span {
    /// The lower bound.
    pub lower: Step,
    /// The upper bound.
    pub upper: Step,
}

/// A threshold.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Limit {
    /// A number.
    Number(f64),
    /// A slot.
    Slot(SlotId),
}

/// A resolved formula.
#[derive(Debug, Clone, PartialEq)]
pub struct Resolved {
    /// The reading in which it stands: what it counts as beyond the record.
    pub reading: Reading,
    /// What it says.
    pub shape: Shape<Box<Resolved>>,
}

/// What a node says about its operands: formulas in a tree, or positions in a
/// plan.
#[derive(Debug, Clone, PartialEq)]
pub enum Shape<Operand> {
    /// A numeric signal against a threshold.
    Compare {
        /// The signal.
        signal: SignalId,
        /// The relation.
        comparison: Comparison,
        /// The threshold.
        limit: Limit,
    },
    /// A flag or its negation.
    Flag {
        /// The flag.
        signal: SignalId,
        /// Whether it is negated.
        negated: bool,
    },
    /// All of them.
    And(Vec<Operand>),
    /// At least one of them.
    Or(Vec<Operand>),
    /// At every instant of the window.
    Throughout(Span, Operand),
    /// At some instant of the window.
    Sometime(Span, Operand),
    /// The second at some instant of the window, the first until then.
    Until(Span, Operand, Operand),
}

impl<Operand> Shape<Operand> {
    /// The operands, from left to right.
    pub fn operands(&self) -> Vec<&Operand> {
        match self {
            Shape::Compare { .. } | Shape::Flag { .. } => Vec::new(),
            Shape::And(operands) | Shape::Or(operands) => operands.iter().collect(),
            Shape::Throughout(_, operand) | Shape::Sometime(_, operand) => vec![operand],
            Shape::Until(_, left, right) => vec![left, right],
        }
    }

    /// The slots of the node itself.
    pub fn own_slots(&self) -> Vec<SlotId> {
        let slot = |step: &Step| match step {
            Step::Slot(slot) => Some(*slot),
            _ => None,
        };
        match self {
            Shape::Compare {
                limit: Limit::Slot(slot),
                ..
            } => vec![*slot],
            Shape::Throughout(span, _) | Shape::Sometime(span, _) | Shape::Until(span, _, _) => {
                [&span.lower, &span.upper]
                    .into_iter()
                    .filter_map(slot)
                    .collect()
            }
            _ => Vec::new(),
        }
    }

    /// The same with operands replaced, from left to right.
    pub fn map<Other>(&self, mut replace: impl FnMut(&Operand) -> Other) -> Shape<Other> {
        match self {
            Shape::Compare {
                signal,
                comparison,
                limit,
            } => Shape::Compare {
                signal: *signal,
                comparison: *comparison,
                limit: *limit,
            },
            Shape::Flag { signal, negated } => Shape::Flag {
                signal: *signal,
                negated: *negated,
            },
            Shape::And(operands) => Shape::And(operands.iter().map(replace).collect()),
            Shape::Or(operands) => Shape::Or(operands.iter().map(replace).collect()),
            Shape::Throughout(span, operand) => Shape::Throughout(*span, replace(operand)),
            Shape::Sometime(span, operand) => Shape::Sometime(*span, replace(operand)),
            Shape::Until(span, left, right) => {
                let left = replace(left);
                Shape::Until(*span, left, replace(right))
            }
        }
    }
}
