//! The language of the e-graph.

use egg::{Analysis, DidMerge, EGraph, Id, Language};

use super::flags::Flags;
use crate::template::{Atom, Threshold, Window};

/// A window as a payload of a node.
pub type WindowKey = Window;

/// A node of the e-graph.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Symbol {
    /// An atom.
    Atom(Atom),
    /// All operands, sorted.
    And(Vec<Id>),
    /// At least one operand, sorted.
    Or(Vec<Id>),
    /// At every instant.
    Throughout(WindowKey, [Id; 1]),
    /// At some instant.
    Sometime(WindowKey, [Id; 1]),
    /// Left until right.
    Until(WindowKey, [Id; 2]),
}

impl Language for Symbol {
    type Discriminant = (std::mem::Discriminant<Symbol>, Option<WindowKey>);

    fn discriminant(&self) -> Self::Discriminant {
        let window = match self {
            Symbol::Throughout(window, _) | Symbol::Sometime(window, _) => Some(*window),
            Symbol::Until(window, _) => Some(*window),
            _ => None,
        };
        (std::mem::discriminant(self), window)
    }

    fn matches(&self, other: &Self) -> bool {
        match (self, other) {
            (Symbol::Atom(a), Symbol::Atom(b)) => a == b,
            (Symbol::And(a), Symbol::And(b)) | (Symbol::Or(a), Symbol::Or(b)) => a.len() == b.len(),
            _ => self.discriminant() == other.discriminant(),
        }
    }

    fn children(&self) -> &[Id] {
        match self {
            Symbol::Atom(_) => &[],
            Symbol::And(ids) | Symbol::Or(ids) => ids,
            Symbol::Throughout(_, ids) | Symbol::Sometime(_, ids) => ids,
            Symbol::Until(_, ids) => ids,
        }
    }

    fn children_mut(&mut self) -> &mut [Id] {
        match self {
            Symbol::Atom(_) => &mut [],
            Symbol::And(ids) | Symbol::Or(ids) => ids,
            Symbol::Throughout(_, ids) | Symbol::Sometime(_, ids) => ids,
            Symbol::Until(_, ids) => ids,
        }
    }

    /// After children were renamed, operands are sorted again, so that
    /// congruence sees through their order. Equal operands stay: twice the
    /// same family need not be that family.
    fn update_children<F: FnMut(Id) -> Id>(&mut self, rename: F) {
        self.children_mut().iter_mut().for_each({
            let mut rename = rename;
            move |id| *id = rename(*id)
        });
        if let Symbol::And(ids) | Symbol::Or(ids) = self {
            ids.sort_unstable();
        }
    }
}

/// Computes class data.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Facts;

impl Analysis<Symbol> for Facts {
    type Data = Flags;

    fn make(egraph: &mut EGraph<Symbol, Self>, node: &Symbol, _: Id) -> Flags {
        let data = |id: &Id| egraph[*id].data;
        match node {
            Symbol::Atom(atom) => Flags::atom(matches!(
                atom,
                Atom::Compare {
                    threshold: Threshold::Slot,
                    ..
                }
            )),
            Symbol::And(ids) => Flags::connective(&ids.iter().map(data).collect::<Vec<_>>(), false),
            Symbol::Or(ids) => Flags::connective(&ids.iter().map(data).collect::<Vec<_>>(), true),
            Symbol::Throughout(window, [id]) => Flags::window(*window, data(id), false),
            Symbol::Sometime(window, [id]) => Flags::window(*window, data(id), true),
            Symbol::Until(window, [left, right]) => Flags::until(*window, data(left), data(right)),
        }
    }

    fn merge(&mut self, a: &mut Flags, b: Flags) -> DidMerge {
        let joined = a.or(b);
        let changed = DidMerge(joined != *a, joined != b);
        *a = joined;
        changed
    }
}
