//! Pieces: a head with parts. The head says what is built from the values of
//! the parts and what it adds to size, slots and flags.

use crate::template::{
    Bound, Comparison, Formula, Function, Signal, Threshold, UntilNotNegatable, Window,
};

/// What a piece stands for.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Value {
    Formula(Formula),
    Signal(Signal),
    Bound(Bound),
}

/// The position of a piece in the arena.
pub(super) type PieceId = usize;

/// What is built, from how many parts.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Head {
    /// One of several pieces: a rule in a kind of place.
    Choice(Vec<PieceId>),
    /// A value of its own.
    Leaf(Value),
    Compare(Comparison, Threshold),
    Flag,
    Not,
    And,
    Or,
    Throughout,
    Sometime,
    Until,
    Derived(Function),
}

/// A head with its parts.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Piece {
    pub(super) head: Head,
    pub(super) parts: Vec<PieceId>,
}

impl Piece {
    /// What the head adds to the size of its parts.
    pub(super) fn size(&self) -> u32 {
        match &self.head {
            Head::And | Head::Or => self.parts.len() as u32 - 1,
            Head::Throughout | Head::Sometime | Head::Until | Head::Derived(_) => 1,
            Head::Leaf(Value::Signal(signal)) => signal.size(),
            _ => 0,
        }
    }

    /// Slots of the head.
    pub(super) fn slots(&self) -> u32 {
        match &self.head {
            Head::Compare(_, Threshold::Slot) | Head::Leaf(Value::Bound(Bound::Slot)) => 1,
            _ => 0,
        }
    }

    /// Flag atoms of the head.
    pub(super) fn flags(&self) -> u32 {
        u32::from(self.head == Head::Flag)
    }

    /// Builds the value from the values of the parts; `None` where the parts
    /// make nothing (an empty window, the negation of an `until`).
    pub(super) fn build(&self, parts: &[&Value]) -> Option<Value> {
        let formula = match &self.head {
            Head::Choice(_) => return None,
            Head::Leaf(value) => return Some(value.clone()),
            Head::Derived(function) => return derived(*function, parts),
            Head::Compare(comparison, threshold) => {
                Formula::compare(parts[0].signal()?, *comparison, threshold.clone())
            }
            Head::Flag => Formula::flag(parts[0].signal()?, false),
            Head::Not => negated(parts[0].formula()?).ok()?,
            Head::And => Formula::and(formulas(parts)?),
            Head::Or => Formula::or(formulas(parts)?),
            Head::Throughout => Formula::throughout(window(parts)?, parts[2].formula()?),
            Head::Sometime => Formula::sometime(window(parts)?, parts[2].formula()?),
            Head::Until => Formula::until(
                window(&parts[1..3])?,
                parts[0].formula()?,
                parts[3].formula()?,
            ),
        };
        Some(Value::Formula(formula))
    }
}

impl Value {
    fn formula(&self) -> Option<Formula> {
        match self {
            Value::Formula(formula) => Some(formula.clone()),
            _ => None,
        }
    }

    fn signal(&self) -> Option<Signal> {
        match self {
            Value::Signal(signal) => Some(signal.clone()),
            _ => None,
        }
    }

    fn bound(&self) -> Option<Bound> {
        match self {
            Value::Bound(bound) => Some(*bound),
            _ => None,
        }
    }
}

fn negated(formula: Formula) -> Result<Formula, UntilNotNegatable> {
    formula.negated()
}

fn formulas(parts: &[&Value]) -> Option<Vec<Formula>> {
    parts.iter().map(|part| part.formula()).collect()
}

fn window(parts: &[&Value]) -> Option<Window> {
    Window::new(parts[0].bound()?, parts[1].bound()?).ok()
}

fn derived(function: Function, parts: &[&Value]) -> Option<Value> {
    let count = function.shape().arguments.len();
    let arguments = parts[..count]
        .iter()
        .map(|part| part.signal())
        .collect::<Option<_>>()?;
    let duration = match parts.get(count) {
        None => None,
        Some(part) => match part.bound()? {
            Bound::After(duration) => Some(duration),
            _ => return None,
        },
    };
    Some(Value::Signal(Signal::derived(
        function, arguments, duration,
    )))
}
