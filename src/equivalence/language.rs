//! The language of the e-graph: nodes with their operands as classes, atoms
//! and windows by number, and what is computed for each class.

use std::collections::{BTreeSet, HashMap};
use std::sync::Arc;

use egg::{Analysis, DidMerge, EGraph, Id, Language};
use smallvec::SmallVec;

use super::flags::Flags;
use crate::template::{Atom, Signal, Threshold, Window};

/// Operands of a connective, sorted. Equal operands stay: twice the same
/// family need not be that family.
pub(super) type Ids = SmallVec<[Id; 4]>;

/// A node of the e-graph.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub(super) enum Symbol {
    /// True (or false) at every instant of the record; beyond it satisfied
    /// weakly and violated strongly, as every formula.
    Constant(bool),
    /// An atom, by number.
    Atom(u32),
    /// All operands.
    And(Ids),
    /// At least one operand.
    Or(Ids),
    /// At every instant of a window.
    Throughout(u16, [Id; 1]),
    /// At some instant of a window.
    Sometime(u16, [Id; 1]),
    /// Left until right, in a window.
    Until(u16, [Id; 2]),
    /// At the last instant of the record, read weak (`true`) or strong. Not a
    /// word of the language: `sometime [0, end] throughout [0, end] f` reads f
    /// at the last instant weak, the other way round it reads f strong.
    Last(bool, [Id; 1]),
}

impl Language for Symbol {
    type Discriminant = (std::mem::Discriminant<Symbol>, u32);

    fn discriminant(&self) -> Self::Discriminant {
        let payload = match self {
            Symbol::Constant(value) | Symbol::Last(value, _) => u32::from(*value),
            Symbol::Atom(number) => *number,
            Symbol::And(ids) | Symbol::Or(ids) => ids.len() as u32,
            Symbol::Throughout(window, _) | Symbol::Sometime(window, _) => u32::from(*window),
            Symbol::Until(window, _) => u32::from(*window),
        };
        (std::mem::discriminant(self), payload)
    }

    fn matches(&self, other: &Self) -> bool {
        self.discriminant() == other.discriminant()
    }

    fn children(&self) -> &[Id] {
        match self {
            Symbol::Constant(_) | Symbol::Atom(_) => &[],
            Symbol::And(ids) | Symbol::Or(ids) => ids,
            Symbol::Throughout(_, ids) | Symbol::Sometime(_, ids) | Symbol::Last(_, ids) => ids,
            Symbol::Until(_, ids) => ids,
        }
    }

    fn children_mut(&mut self) -> &mut [Id] {
        match self {
            Symbol::Constant(_) | Symbol::Atom(_) => &mut [],
            Symbol::And(ids) | Symbol::Or(ids) => ids,
            Symbol::Throughout(_, ids) | Symbol::Sometime(_, ids) | Symbol::Last(_, ids) => ids,
            Symbol::Until(_, ids) => ids,
        }
    }

    /// After operands were renamed they are sorted again, so that congruence
    /// sees through their order.
    fn update_children<F: FnMut(Id) -> Id>(&mut self, mut rename: F) {
        for id in self.children_mut() {
            *id = rename(*id);
        }
        if let Symbol::And(ids) | Symbol::Or(ids) = self {
            ids.sort_unstable();
        }
    }
}

/// Which signals are known at every sample. An equality may hold only where
/// they are, so this is said once, for all templates that are compared.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Known {
    /// Recorded channels and flags with unknown samples.
    pub with_gaps: BTreeSet<Arc<str>>,
}

impl Known {
    /// Whether every sample of a signal is known.
    pub fn everywhere(&self, signal: &Signal) -> bool {
        match signal {
            Signal::Recorded { name, .. } => !self.with_gaps.contains(name),
            Signal::Derived(derivation) => {
                derivation.function.shape().total
                    && derivation
                        .arguments
                        .iter()
                        .all(|part| self.everywhere(part))
            }
        }
    }
}

/// What is known of an atom.
#[derive(Debug, Clone)]
pub(super) struct AtomEntry {
    pub(super) atom: Atom,
    flags: Flags,
    /// A bit of the signal it reads.
    signals: u32,
    size: u16,
}

impl AtomEntry {
    pub(super) fn has_slot(&self) -> bool {
        !self.flags.has(Flags::SINGLETON)
    }
}

/// The atoms and windows met, by number.
#[derive(Debug, Clone, Default)]
pub(super) struct Dictionary {
    known: Known,
    pub(super) atoms: Vec<AtomEntry>,
    atom_numbers: HashMap<Atom, u32>,
    signals: Vec<Signal>,
    pub(super) windows: Vec<Window>,
    window_numbers: HashMap<Window, u16>,
}

impl Dictionary {
    pub(super) fn new(known: Known) -> Dictionary {
        Dictionary {
            known,
            ..Dictionary::default()
        }
    }

    /// The number of an atom, a new one if need be.
    pub(super) fn atom(&mut self, atom: &Atom) -> u32 {
        if let Some(number) = self.atom_numbers.get(atom) {
            return *number;
        }
        let signal = atom.signal();
        let place = self.signals.iter().position(|known| known == signal);
        let place = place.unwrap_or_else(|| {
            self.signals.push(signal.clone());
            self.signals.len() - 1
        });
        let has_slot = matches!(
            atom,
            Atom::Compare {
                threshold: Threshold::Slot,
                ..
            }
        );
        let number = self.atoms.len() as u32;
        self.atoms.push(AtomEntry {
            atom: atom.clone(),
            flags: Flags::atom(has_slot, self.known.everywhere(signal)),
            signals: 1 << (place % 32),
            size: u16::try_from(signal.size()).unwrap_or(u16::MAX),
        });
        self.atom_numbers.insert(atom.clone(), number);
        number
    }

    /// The number of an atom that was met before.
    pub(super) fn known_atom(&self, atom: &Atom) -> Option<u32> {
        self.atom_numbers.get(atom).copied()
    }

    /// The number of a window, a new one if need be.
    ///
    /// # Panics
    /// When there are more than 65,535 different windows.
    pub(super) fn window(&mut self, window: Window) -> u16 {
        if let Some(number) = self.window_numbers.get(&window) {
            return *number;
        }
        let number = u16::try_from(self.windows.len()).expect("fewer than 65,536 windows");
        self.windows.push(window);
        self.window_numbers.insert(window, number);
        number
    }
}

/// What is known of a class.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Data {
    /// Facts about the family.
    pub(super) flags: Flags,
    /// The node that stands for the class, by its own id.
    pub(super) node: Id,
    /// Whether that node is a normal form.
    pub(super) is_normal: bool,
    /// Its slots.
    pub(super) slots: u8,
    /// Its size as a formula.
    pub(super) size: u16,
    /// Bits of the signals on which the class depends.
    pub(super) signals: u32,
}

impl Data {
    /// The data of a node, from those of its operands.
    pub(super) fn of(dictionary: &Dictionary, symbol: &Symbol, id: Id, parts: &[Data]) -> Data {
        let window = |number: &u16| dictionary.windows[*number as usize];
        let (flags, own_size) = match symbol {
            Symbol::Constant(_) => (Flags::ALL, 1),
            Symbol::Atom(number) => {
                let entry = &dictionary.atoms[*number as usize];
                (entry.flags, entry.size)
            }
            Symbol::And(_) | Symbol::Or(_) => {
                let all: SmallVec<[Flags; 4]> = parts.iter().map(|part| part.flags).collect();
                let disjunction = matches!(symbol, Symbol::Or(_));
                (Flags::connective(&all, disjunction), parts.len() as u16 - 1)
            }
            Symbol::Throughout(number, _) => {
                (Flags::window(window(number), parts[0].flags, false), 1)
            }
            Symbol::Sometime(number, _) => (Flags::window(window(number), parts[0].flags, true), 1),
            Symbol::Until(number, _) => {
                let flags = Flags::until(window(number), parts[0].flags, parts[1].flags);
                (flags, 1)
            }
            Symbol::Last(..) => (Flags::last(parts[0].flags), 2),
        };
        let sum = |first: u16, next: u16| first.saturating_add(next);
        Data {
            flags,
            node: id,
            is_normal: false,
            slots: parts
                .iter()
                .map(|part| part.slots)
                .fold(own_slots(dictionary, symbol), u8::saturating_add),
            size: parts.iter().map(|part| part.size).fold(own_size, sum),
            signals: match symbol {
                Symbol::Atom(number) => dictionary.atoms[*number as usize].signals,
                _ => parts.iter().fold(0, |all, part| all | part.signals),
            },
        }
    }

    /// Makes it the data of both classes; says whether the facts are more than
    /// they were here and there.
    fn join(&mut self, other: Data) -> DidMerge {
        let flags = self.flags.or(other.flags);
        let signals = self.signals & other.signals;
        let changed = DidMerge(
            (flags, signals) != (self.flags, self.signals),
            (flags, signals) != (other.flags, other.signals),
        );
        let rank = |data: &Data| (!data.is_normal, data.size, data.slots, data.node);
        if rank(&other) < rank(self) {
            *self = other;
        }
        self.flags = flags;
        self.signals = signals;
        changed
    }
}

fn own_slots(dictionary: &Dictionary, symbol: &Symbol) -> u8 {
    let in_window = |number: u16| {
        let window = dictionary.windows[number as usize];
        [window.lower(), window.upper()]
            .iter()
            .filter(|bound| **bound == crate::template::Bound::Slot)
            .count() as u8
    };
    match symbol {
        Symbol::Atom(number) => u8::from(dictionary.atoms[*number as usize].has_slot()),
        Symbol::Throughout(window, _) | Symbol::Sometime(window, _) => in_window(*window),
        Symbol::Until(window, _) => in_window(*window),
        _ => 0,
    }
}

/// Computes class data.
#[derive(Debug, Clone, Default)]
pub(super) struct Facts {
    pub(super) dictionary: Dictionary,
}

impl Analysis<Symbol> for Facts {
    type Data = Data;

    fn make(egraph: &mut EGraph<Symbol, Self>, node: &Symbol, id: Id) -> Data {
        let parts: SmallVec<[Data; 4]> =
            node.children().iter().map(|id| egraph[*id].data).collect();
        Data::of(&egraph.analysis.dictionary, node, id, &parts)
    }

    fn merge(&mut self, a: &mut Data, b: Data) -> DidMerge {
        a.join(b)
    }
}
