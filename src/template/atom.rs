//! Atoms: a numeric signal against a threshold, or a flag.

use std::sync::Arc;

use super::signal::Signal;
use super::slot::{Direction, SlotValue};
use crate::support::Finite;

/// How an atom compares a numeric signal with its threshold.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Comparison {
    /// `<=`
    AtMost,
    /// `>=`
    AtLeast,
    /// `<`
    Below,
    /// `>`
    Above,
}

impl Comparison {
    /// The sign in text.
    pub fn sign(self) -> &'static str {
        match self {
            Comparison::AtMost => "<=",
            Comparison::AtLeast => ">=",
            Comparison::Below => "<",
            Comparison::Above => ">",
        }
    }

    /// The comparison that holds exactly when this one does not.
    pub fn negated(self) -> Self {
        match self {
            Comparison::AtMost => Comparison::Above,
            Comparison::AtLeast => Comparison::Below,
            Comparison::Below => Comparison::AtLeast,
            Comparison::Above => Comparison::AtMost,
        }
    }

    /// Whether a number stands in this relation to a threshold.
    pub fn holds(self, value: f64, threshold: f64) -> bool {
        match self {
            Comparison::AtMost => value <= threshold,
            Comparison::AtLeast => value >= threshold,
            Comparison::Below => value < threshold,
            Comparison::Above => value > threshold,
        }
    }

    /// What a larger threshold does.
    pub fn direction(self) -> Direction {
        match self {
            Comparison::AtMost | Comparison::Below => Direction::LargerIsEasier,
            Comparison::AtLeast | Comparison::Above => Direction::LargerIsHarder,
        }
    }
}

/// The right side of a comparison.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Threshold {
    /// A number, in the channel's unit or carrying that unit.
    Number(Finite, Option<Arc<str>>),
    /// A slot.
    Slot,
}

/// The smallest formulas.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Atom {
    /// A numeric signal against a threshold.
    Compare {
        /// The numeric signal.
        signal: Signal,
        /// The relation.
        comparison: Comparison,
        /// The number or slot.
        threshold: Threshold,
    },
    /// A flag, or its negation.
    Flag {
        /// The flag.
        signal: Signal,
        /// Whether the atom is `not` the flag.
        negated: bool,
    },
}

impl Atom {
    /// The signal the atom reads.
    pub fn signal(&self) -> &Signal {
        match self {
            Atom::Compare { signal, .. } | Atom::Flag { signal, .. } => signal,
        }
    }

    /// The atom that holds exactly when this one does not.
    pub fn negated(&self) -> Atom {
        let mut negation = self.clone();
        match &mut negation {
            Atom::Compare { comparison, .. } => *comparison = comparison.negated(),
            Atom::Flag { negated, .. } => *negated = !*negated,
        }
        negation
    }

    pub(super) fn filled(&self, values: &mut std::slice::Iter<'_, Option<SlotValue>>) -> Atom {
        let mut atom = self.clone();
        if let Atom::Compare { threshold, .. } = &mut atom
            && *threshold == Threshold::Slot
        {
            match values.next() {
                Some(Some(SlotValue::Threshold(value))) => {
                    *threshold = Threshold::Number(*value, None);
                }
                Some(None) => {}
                other => panic!("a threshold slot is given {other:?}"),
            }
        }
        atom
    }
}
