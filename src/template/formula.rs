//! The analysed form of a template: negation normal form, with every fact
//! about a node computed once by the constructor that makes it.
//!
//! A [`Formula`] can be built only through its constructors, so an ill-formed
//! one (a slot as lower bound of a bounded window, an `and` of one operand)
//! cannot exist. Slots are anonymous: each `?` occurs once, and the slots of a
//! template are numbered in the order of its text. A formula without slots is
//! a **specification**.

use std::hash::{Hash, Hasher};
use std::sync::Arc;

use super::atom::{Atom, Comparison, Threshold};
use super::function::Kind;
use super::signal::Signal;
use super::slot::{Direction, Slot, SlotKind, SlotValue};
use super::window::{Bound, Window};
use crate::support::SlotId;

/// The shapes a formula can have.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Node {
    /// An atom.
    Atom(Atom),
    /// All operands (two or more, none of them an `and`).
    And(Vec<Formula>),
    /// At least one operand (two or more, none of them an `or`).
    Or(Vec<Formula>),
    /// At every instant of the window.
    Throughout(Window, Formula),
    /// At some instant of the window.
    Sometime(Window, Formula),
    /// The right side at some instant of the window, the left side at every
    /// instant from now until just before it.
    Until(Window, Formula, Formula),
}

/// A template, or without slots a specification. Cheap to clone; equality,
/// order and hash are those of the tree.
#[derive(Debug, Clone)]
pub struct Formula(Arc<Inner>);

#[derive(Debug)]
struct Inner {
    node: Node,
    facts: Facts,
}

/// What the constructors compute about a formula.
#[derive(Debug, Clone, PartialEq, Eq)]
struct Facts {
    size: u32,
    slots: Vec<Slot>,
    has_until: bool,
    has_end: bool,
    depth: u32,
}

/// `until` has no negation with each slot once.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("`until` cannot be negated: its negation would need a slot twice")]
pub struct UntilNotNegatable;

impl Formula {
    /// A formula that is one atom.
    ///
    /// # Panics
    /// When a comparison is given a flag, or a flag atom a numeric signal.
    pub fn atom(atom: Atom) -> Self {
        let facts = match &atom {
            Atom::Flag { signal, .. } => {
                assert_eq!(signal.kind(), Kind::Flag, "{signal} is no flag");
                Facts::leaf(signal.size(), Vec::new())
            }
            Atom::Compare {
                signal,
                comparison,
                threshold,
            } => {
                assert_eq!(signal.kind(), Kind::Numeric, "{signal} is no channel");
                let slots = match threshold {
                    Threshold::Number(..) => Vec::new(),
                    Threshold::Slot => vec![Slot {
                        kind: SlotKind::Threshold(signal.clone()),
                        direction: comparison.direction(),
                    }],
                };
                Facts::leaf(signal.size(), slots)
            }
        };
        Formula::build(Node::Atom(atom), facts)
    }

    /// `signal comparison threshold`.
    pub fn compare(signal: Signal, comparison: Comparison, threshold: Threshold) -> Self {
        Formula::atom(Atom::Compare {
            signal,
            comparison,
            threshold,
        })
    }

    /// A flag or its negation.
    pub fn flag(signal: Signal, negated: bool) -> Self {
        Formula::atom(Atom::Flag { signal, negated })
    }

    /// All of the operands. Nested `and`s are flattened; one operand is
    /// returned as it is.
    ///
    /// # Panics
    /// When there is no operand.
    pub fn and(operands: Vec<Formula>) -> Self {
        Formula::connective(
            operands,
            |node| match node {
                Node::And(inner) => Some(inner),
                _ => None,
            },
            Node::And,
        )
    }

    /// At least one of the operands. Nested `or`s are flattened; one operand
    /// is returned as it is.
    ///
    /// # Panics
    /// When there is no operand.
    pub fn or(operands: Vec<Formula>) -> Self {
        Formula::connective(
            operands,
            |node| match node {
                Node::Or(inner) => Some(inner),
                _ => None,
            },
            Node::Or,
        )
    }

    fn connective(
        operands: Vec<Formula>,
        inner: impl Fn(&Node) -> Option<&Vec<Formula>>,
        make: impl Fn(Vec<Formula>) -> Node,
    ) -> Self {
        let mut flat: Vec<Formula> = Vec::with_capacity(operands.len());
        for operand in operands {
            match inner(operand.node()) {
                Some(parts) => flat.extend(parts.iter().cloned()),
                None => flat.push(operand),
            }
        }
        assert!(!flat.is_empty(), "a connective needs an operand");
        if flat.len() == 1 {
            return flat.swap_remove(0);
        }
        let size = u32::try_from(flat.len() - 1).unwrap_or(u32::MAX);
        let facts = Facts::above(size, 0, Vec::new(), false, &flat.iter().collect::<Vec<_>>());
        Formula::build(make(flat), facts)
    }

    /// The operand at every instant of the window.
    pub fn throughout(window: Window, operand: Formula) -> Self {
        let slots = window_slots(window, Direction::LargerIsHarder);
        let facts = Facts::above(1, 1, slots, window.upper() == Bound::End, &[&operand]);
        Formula::build(Node::Throughout(window, operand), facts)
    }

    /// The operand at some instant of the window.
    pub fn sometime(window: Window, operand: Formula) -> Self {
        let slots = window_slots(window, Direction::LargerIsEasier);
        let facts = Facts::above(1, 1, slots, window.upper() == Bound::End, &[&operand]);
        Formula::build(Node::Sometime(window, operand), facts)
    }

    /// The right side at some instant of the window, the left side until then.
    pub fn until(window: Window, left: Formula, right: Formula) -> Self {
        let mut slots = left.slots().to_vec();
        slots.extend(window_slots(window, Direction::LargerIsEasier));
        slots.extend(right.slots().iter().cloned());
        let mut facts = Facts::above(
            1,
            1,
            Vec::new(),
            window.upper() == Bound::End,
            &[&left, &right],
        );
        // In text the window stands between the two sides, and slots are
        // numbered in the order of the text.
        facts.slots = slots;
        facts.has_until = true;
        Formula::build(Node::Until(window, left, right), facts)
    }

    fn build(node: Node, facts: Facts) -> Self {
        Formula(Arc::new(Inner { node, facts }))
    }

    /// The shape.
    pub fn node(&self) -> &Node {
        &self.0.node
    }

    /// The address of the tree: the same for clones of one formula as long as
    /// one of them lives, so a quick key for tables that keep the formula too.
    pub fn address(&self) -> usize {
        Arc::as_ptr(&self.0) as usize
    }

    /// Size: 1 for each channel, flag, function, connective and temporal
    /// operator; `not` on a flag is free.
    pub fn size(&self) -> u32 {
        self.0.facts.size
    }

    /// The slots, in the order of the text.
    pub fn slots(&self) -> &[Slot] {
        &self.0.facts.slots
    }

    /// Whether it has no slot.
    pub fn is_specification(&self) -> bool {
        self.slots().is_empty()
    }

    /// Whether an `until` stands anywhere in it.
    pub fn has_until(&self) -> bool {
        self.0.facts.has_until
    }

    /// Whether a window with `end` stands anywhere in it. Without one, the
    /// verdict needs a bounded stretch of the record, the horizon.
    pub fn has_end(&self) -> bool {
        self.0.facts.has_end
    }

    /// How many temporal operators stand above one another at most.
    pub fn temporal_depth(&self) -> u32 {
        self.0.facts.depth
    }

    /// The direct operands, from left to right.
    pub fn operands(&self) -> Vec<&Formula> {
        match self.node() {
            Node::Atom(_) => Vec::new(),
            Node::And(operands) | Node::Or(operands) => operands.iter().collect(),
            Node::Throughout(_, operand) | Node::Sometime(_, operand) => vec![operand],
            Node::Until(_, left, right) => vec![left, right],
        }
    }

    /// Calls `visit` with every atom, from left to right.
    pub fn for_each_atom<'a>(&'a self, visit: &mut impl FnMut(&'a Atom)) {
        match self.node() {
            Node::Atom(atom) => visit(atom),
            _ => {
                for operand in self.operands() {
                    operand.for_each_atom(visit);
                }
            }
        }
    }

    /// The signals it reads, each once, in the order of the text.
    pub fn signals(&self) -> Vec<Signal> {
        let mut found: Vec<Signal> = Vec::new();
        self.for_each_atom(&mut |atom| {
            let signal = atom.signal();
            if !found.contains(signal) {
                found.push(signal.clone());
            }
        });
        found
    }

    /// The names of the recorded channels and flags it reads, each once, in
    /// the order of the text.
    pub fn channels(&self) -> Vec<Arc<str>> {
        let mut found: Vec<Arc<str>> = Vec::new();
        self.for_each_atom(&mut |atom| {
            atom.signal().for_each_recorded(&mut |name, _| {
                if !found.contains(name) {
                    found.push(Arc::clone(name));
                }
            });
        });
        found
    }

    /// The negation, in negation normal form. The negation of a template has
    /// the same slots, each with the other direction, and the same boundary.
    ///
    /// # Errors
    /// When an `until` stands in it.
    pub fn negated(&self) -> Result<Formula, UntilNotNegatable> {
        Ok(match self.node() {
            Node::Atom(atom) => Formula::atom(atom.negated()),
            Node::And(operands) => Formula::or(negated_all(operands)?),
            Node::Or(operands) => Formula::and(negated_all(operands)?),
            Node::Throughout(window, operand) => Formula::sometime(*window, operand.negated()?),
            Node::Sometime(window, operand) => Formula::throughout(*window, operand.negated()?),
            Node::Until(..) => return Err(UntilNotNegatable),
        })
    }

    /// The template with some of its slots filled: `values[k]` is the value of
    /// slot k, `None` keeps the slot.
    ///
    /// # Panics
    /// When there are not as many values as slots, or a value is of the wrong
    /// kind.
    pub fn fill(&self, values: &[Option<SlotValue>]) -> Formula {
        assert_eq!(values.len(), self.slots().len(), "one value for each slot");
        let mut next = values.iter();
        let filled = self.fill_next(&mut next);
        debug_assert!(next.next().is_none());
        filled
    }

    fn fill_next(&self, values: &mut std::slice::Iter<'_, Option<SlotValue>>) -> Formula {
        match self.node() {
            Node::Atom(atom) => Formula::atom(atom.filled(values)),
            Node::And(operands) => {
                Formula::and(operands.iter().map(|f| f.fill_next(values)).collect())
            }
            Node::Or(operands) => {
                Formula::or(operands.iter().map(|f| f.fill_next(values)).collect())
            }
            Node::Throughout(window, operand) => {
                let window = window.filled(values);
                Formula::throughout(window, operand.fill_next(values))
            }
            Node::Sometime(window, operand) => {
                let window = window.filled(values);
                Formula::sometime(window, operand.fill_next(values))
            }
            Node::Until(window, left, right) => {
                let left = left.fill_next(values);
                let window = window.filled(values);
                Formula::until(window, left, right.fill_next(values))
            }
        }
    }

    /// The slot of an id.
    pub fn slot(&self, id: SlotId) -> &Slot {
        &self.slots()[id.index()]
    }
}

fn negated_all(operands: &[Formula]) -> Result<Vec<Formula>, UntilNotNegatable> {
    operands.iter().map(Formula::negated).collect()
}

/// The slots of a window. `upper` is the direction of its upper bound; a later
/// lower bound does the opposite.
fn window_slots(window: Window, upper: Direction) -> Vec<Slot> {
    let mut slots = Vec::new();
    for (bound, direction) in [(window.lower(), upper.reversed()), (window.upper(), upper)] {
        if bound == Bound::Slot {
            slots.push(Slot {
                kind: SlotKind::Time,
                direction,
            });
        }
    }
    slots
}

impl Facts {
    fn leaf(size: u32, slots: Vec<Slot>) -> Self {
        Facts {
            size,
            slots,
            has_until: false,
            has_end: false,
            depth: 0,
        }
    }

    /// The facts of a node above some operands: its own share of the size, one
    /// more temporal operator or none, its own slots first.
    fn above(size: u32, depth: u32, own: Vec<Slot>, end: bool, operands: &[&Formula]) -> Self {
        let mut facts = Facts {
            size,
            slots: own,
            has_until: false,
            has_end: end,
            depth: 0,
        };
        for operand in operands {
            let inner = &operand.0.facts;
            facts.size = facts.size.saturating_add(inner.size);
            facts.slots.extend(inner.slots.iter().cloned());
            facts.has_until |= inner.has_until;
            facts.has_end |= inner.has_end;
            facts.depth = facts.depth.max(inner.depth);
        }
        facts.depth += depth;
        facts
    }
}

impl PartialEq for Formula {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.0, &other.0) || self.0.node == other.0.node
    }
}

impl Eq for Formula {}

impl PartialOrd for Formula {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Formula {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        self.0.node.cmp(&other.0.node)
    }
}

impl Hash for Formula {
    fn hash<H: Hasher>(&self, state: &mut H) {
        self.0.node.hash(state);
    }
}
