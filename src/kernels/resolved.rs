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
    pub shape: Shape,
}

/// What a resolved formula says.
#[derive(Debug, Clone, PartialEq)]
pub enum Shape {
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
    And(Vec<Resolved>),
    /// At least one of them.
    Or(Vec<Resolved>),
    /// At every instant of the window.
    Throughout(Span, Box<Resolved>),
    /// At some instant of the window.
    Sometime(Span, Box<Resolved>),
    /// The second at some instant of the window, the first until then.
    Until(Span, Box<Resolved>, Box<Resolved>),
}
