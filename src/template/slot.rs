//! Slots: the free parameters of a template, and values for them.

use super::duration::Duration;
use super::signal::Signal;
use crate::support::Finite;

/// What a larger slot value does to the verdict.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Direction {
    /// A trace that satisfies the template keeps satisfying it.
    LargerIsEasier,
    /// A trace that violates the template keeps violating it.
    LargerIsHarder,
}

impl Direction {
    /// The other direction, which is what negation gives.
    pub fn reversed(self) -> Self {
        match self {
            Direction::LargerIsEasier => Direction::LargerIsHarder,
            Direction::LargerIsHarder => Direction::LargerIsEasier,
        }
    }
}

/// What a slot stands for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum SlotKind {
    /// A threshold of this numeric signal.
    Threshold(Signal),
    /// A duration.
    Time,
}

/// A slot of a template, as its constructors found it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Slot {
    /// Threshold or time.
    pub kind: SlotKind,
    /// What a larger value does to the verdict.
    pub direction: Direction,
}

/// A value for a slot.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SlotValue {
    /// For a threshold slot.
    Threshold(Finite),
    /// For a time slot.
    Time(Duration),
}
