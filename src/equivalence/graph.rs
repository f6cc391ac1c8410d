//! The store of classes: an e-graph, and above it a plain table of normal
//! forms that takes over when memory grows short.
//!
//! In the e-graph a candidate stands beside its normal form, so that what is
//! learnt later of one is known of the other. The plain table keeps normal
//! forms alone, at a third of the memory; its nodes may have classes of the
//! e-graph as operands, never the other way round.

use std::collections::HashMap;
use std::hash::BuildHasherDefault;

use egg::{EGraph, Id, Language};
use rustc_hash::FxHasher;
use smallvec::SmallVec;

use super::flags::Flags;
use super::language::{Data, Dictionary, Facts, Known, Symbol};
use crate::template::{Formula, Node, Window};

/// A hash table without random seed: nothing here comes from strangers.
pub(super) type Table<K, V> = HashMap<K, V, BuildHasherDefault<FxHasher>>;

/// Bytes that a node of the e-graph takes, with its class, as measured by
/// `benchmarks/equivalence.rs` (upper end).
const BYTES_IN_GRAPH: usize = 330;

/// Bytes that a node of the plain table takes.
const BYTES_IN_TABLE: usize = 130;

/// Classes of templates.
#[derive(Debug)]
pub(super) struct Graph {
    egraph: EGraph<Symbol, Facts>,
    plain: Option<Plain>,
}

/// Normal forms without an e-graph.
#[derive(Debug, Default)]
struct Plain {
    /// The id of its first node.
    base: usize,
    nodes: Vec<(Symbol, Data)>,
    numbers: Table<Symbol, u32>,
}

impl Graph {
    pub(super) fn new(known: Known) -> Graph {
        Graph {
            egraph: EGraph::new(Facts {
                dictionary: Dictionary::new(known),
            }),
            plain: None,
        }
    }

    pub(super) fn dictionary(&self) -> &Dictionary {
        &self.egraph.analysis.dictionary
    }

    pub(super) fn dictionary_mut(&mut self) -> &mut Dictionary {
        &mut self.egraph.analysis.dictionary
    }

    /// From now on only normal forms are kept, in a plain table.
    pub(super) fn freeze(&mut self) {
        self.egraph.rebuild();
        self.plain.get_or_insert_with(|| Plain {
            base: self.egraph.nodes().len(),
            ..Plain::default()
        });
    }

    pub(super) fn is_frozen(&self) -> bool {
        self.plain.is_some()
    }

    /// The class that stands for an id.
    pub(super) fn find(&self, id: Id) -> Id {
        match &self.plain {
            Some(plain) if usize::from(id) >= plain.base => id,
            _ => self.egraph.find(id),
        }
    }

    pub(super) fn data(&self, id: Id) -> Data {
        match &self.plain {
            Some(plain) if usize::from(id) >= plain.base => {
                plain.nodes[usize::from(id) - plain.base].1
            }
            _ => self.egraph[self.egraph.find(id)].data,
        }
    }

    pub(super) fn flags(&self, id: Id) -> Flags {
        self.data(id).flags
    }

    pub(super) fn window(&self, number: u16) -> Window {
        self.dictionary().windows[number as usize]
    }

    /// The node that stands for a class, its normal form where there is one.
    pub(super) fn symbol(&self, id: Id) -> Symbol {
        let mut symbol = match &self.plain {
            Some(plain) if usize::from(id) >= plain.base => {
                plain.nodes[usize::from(id) - plain.base].0.clone()
            }
            _ => {
                let node = self.egraph[self.egraph.find(id)].data.node;
                self.egraph.id_to_node(node).clone()
            }
        };
        symbol.update_children(|child| self.find(child));
        symbol
    }

    /// The class of a node, if it was met before.
    pub(super) fn lookup(&self, symbol: &Symbol) -> Option<Id> {
        if let Some(plain) = &self.plain {
            if let Some(number) = plain.numbers.get(symbol) {
                return Some(Id::from(plain.base + *number as usize));
            }
            let above = |id: &Id| usize::from(*id) >= plain.base;
            if symbol.children().iter().any(above) {
                return None;
            }
        }
        self.egraph.lookup(symbol.clone())
    }

    /// Adds a node that is a normal form.
    pub(super) fn add_normal(&mut self, symbol: Symbol) -> Id {
        if let Some(found) = self.lookup(&symbol) {
            return found;
        }
        let Some(plain) = &mut self.plain else {
            let id = self.egraph.add(symbol);
            self.egraph[id].data.is_normal = true;
            return id;
        };
        let number = plain.nodes.len();
        let id = Id::from(plain.base + number);
        let parts: SmallVec<[Data; 4]> = symbol
            .children()
            .iter()
            .map(|child| match usize::from(*child).checked_sub(plain.base) {
                Some(above) => plain.nodes[above].1,
                None => self.egraph[self.egraph.find(*child)].data,
            })
            .collect();
        let mut data = Data::of(&self.egraph.analysis.dictionary, &symbol, id, &parts);
        data.is_normal = true;
        plain.nodes.push((symbol.clone(), data));
        plain.numbers.insert(symbol, number as u32);
        id
    }

    /// Says that a node as it was written is the same as a class.
    pub(super) fn unite(&mut self, raw: Symbol, class: Id) -> Id {
        if self.is_frozen() {
            return class;
        }
        // The older class stays the leader (a new node has no parents), so what
        // is remembered by class stays valid until the next rebuild.
        let raw = self.egraph.add(raw);
        self.egraph.union(class, raw);
        self.egraph.find(class)
    }

    /// Brings the e-graph up to date with what was united.
    pub(super) fn rebuild(&mut self) {
        if !self.is_frozen() {
            self.egraph.rebuild();
        }
    }

    /// Nodes and classes.
    pub(super) fn size(&self) -> (usize, usize) {
        let above = self.plain.as_ref().map_or(0, |plain| plain.nodes.len());
        (
            self.egraph.total_size() + above,
            self.egraph.number_of_classes() + above,
        )
    }

    /// Bytes taken, about.
    pub(super) fn bytes(&self) -> usize {
        let above = self.plain.as_ref().map_or(0, |plain| plain.nodes.len());
        self.egraph.nodes().len() * BYTES_IN_GRAPH + above * BYTES_IN_TABLE
    }

    /// The formula of a class, from the nodes that stand for it and its parts;
    /// `None` where a constant stands among them.
    pub(super) fn formula(&self, id: Id) -> Option<Formula> {
        let all = |ids: &[Id]| -> Option<Vec<Formula>> {
            ids.iter().map(|id| self.formula(*id)).collect()
        };
        Some(match self.symbol(id) {
            Symbol::Constant(_) => return None,
            Symbol::Atom(number) => {
                Formula::atom(self.dictionary().atoms[number as usize].atom.clone())
            }
            Symbol::And(ids) => Formula::and(all(&ids)?),
            Symbol::Or(ids) => Formula::or(all(&ids)?),
            Symbol::Throughout(window, [part]) => {
                Formula::throughout(self.window(window), self.formula(part)?)
            }
            Symbol::Sometime(window, [part]) => {
                Formula::sometime(self.window(window), self.formula(part)?)
            }
            Symbol::Until(window, [left, right]) => Formula::until(
                self.window(window),
                self.formula(left)?,
                self.formula(right)?,
            ),
            Symbol::Last(weak, [part]) => {
                let part = self.formula(part)?;
                let whole = Window::whole();
                if weak {
                    Formula::sometime(whole, Formula::throughout(whole, part))
                } else {
                    Formula::throughout(whole, Formula::sometime(whole, part))
                }
            }
        })
    }

    /// The node of a formula, given the classes of its operands in order.
    pub(super) fn node(&mut self, formula: &Formula, operands: &[Id]) -> Symbol {
        let dictionary = self.dictionary_mut();
        match formula.node() {
            Node::Atom(atom) => Symbol::Atom(dictionary.atom(atom)),
            Node::And(_) => Symbol::And(sorted(operands)),
            Node::Or(_) => Symbol::Or(sorted(operands)),
            Node::Throughout(window, _) => {
                Symbol::Throughout(dictionary.window(*window), [operands[0]])
            }
            Node::Sometime(window, _) => {
                Symbol::Sometime(dictionary.window(*window), [operands[0]])
            }
            Node::Until(window, ..) => {
                Symbol::Until(dictionary.window(*window), [operands[0], operands[1]])
            }
        }
    }
}

fn sorted(ids: &[Id]) -> super::language::Ids {
    let mut ids: super::language::Ids = ids.iter().copied().collect();
    ids.sort_unstable();
    ids
}
