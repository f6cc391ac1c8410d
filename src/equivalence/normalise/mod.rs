//! The normalising constructor: gives the class of a node whose operands are
//! classes, after applying the rules at its top.
//!
//! Every class is known by one node, its normal form, and the constructor
//! looks at operands through those nodes. A rule builds its result through the
//! constructor again. Rules make the formula smaller, or move it towards a
//! fixed shape: what stays at the last instant moves out of windows, `or`
//! stands above `and` where one of the two must (rule "modular"), chains of
//! windows are sorted. A cap on the depth stands guard all the same; beyond it
//! a node is taken as it is, which is correct and only perhaps not the
//! shortest.
//!
//! `connective`, `window`, `until` and `last` hold the rules by the node at the
//! top, `implication` when one family says more than another, `negation` what
//! contradicts it, `root` the equalities that hold for whole templates only.

mod connective;
mod implication;
mod last;
mod negation;
mod root;
mod until;
mod window;

use egg::{Id, Language};

use super::flags::Flags;
use super::graph::{Graph, Table};
use super::language::{Ids, Symbol};
use crate::template::{Bound, Formula, Window};

/// Nested constructor calls after which nodes are taken as they are.
const DEEPEST: u32 = 40;

/// One application of a rule: its name, and the classes before and after.
#[derive(Debug, Clone)]
pub(super) struct Step {
    pub(super) rule: &'static str,
    pub(super) from: Option<Formula>,
    pub(super) to: Option<Formula>,
}

/// Classes and their negations.
#[derive(Debug)]
pub(super) struct Normaliser {
    pub(super) graph: Graph,
    negations: Table<Id, Option<Id>>,
    depth: u32,
    /// The rules applied, when somebody asks for them.
    pub(super) steps: Option<Vec<Step>>,
}

impl Normaliser {
    pub(super) fn new(graph: Graph) -> Normaliser {
        Normaliser {
            graph,
            negations: Table::default(),
            depth: 0,
            steps: None,
        }
    }

    /// The class of a node.
    pub(super) fn make(&mut self, mut symbol: Symbol) -> Id {
        symbol.update_children(|id| self.graph.find(id));
        if let Some(known) = self.graph.lookup(&symbol) {
            return known;
        }
        if self.depth >= DEEPEST {
            return self.graph.add_normal(symbol);
        }
        self.depth += 1;
        let made = match &symbol {
            Symbol::Constant(_) | Symbol::Atom(_) => None,
            Symbol::And(ids) => self.connective(ids, false),
            Symbol::Or(ids) => self.connective(ids, true),
            Symbol::Throughout(window, [part]) => self.windowed(*window, *part, false),
            Symbol::Sometime(window, [part]) => self.windowed(*window, *part, true),
            Symbol::Until(window, [left, right]) => self.until(*window, *left, *right),
            Symbol::Last(weak, [part]) => self.last(*weak, *part),
        };
        self.depth -= 1;
        match made {
            Some((rule, id)) => {
                self.note(rule, &symbol, id);
                id
            }
            None => self.graph.add_normal(symbol),
        }
    }

    /// The class of a formula.
    pub(super) fn class(&mut self, formula: &Formula) -> Id {
        let operands: Vec<Id> = formula
            .operands()
            .iter()
            .map(|operand| self.class(operand))
            .collect();
        let symbol = self.graph.node(formula, &operands);
        self.make(symbol)
    }

    fn note(&mut self, rule: &'static str, from: &Symbol, to: Id) {
        if self.steps.is_none() {
            return;
        }
        let from = self.written(from);
        let to = self.graph.formula(to);
        if let Some(steps) = &mut self.steps {
            steps.push(Step { rule, from, to });
        }
    }

    /// A node as a formula.
    fn written(&self, symbol: &Symbol) -> Option<Formula> {
        let parts: Option<Vec<Formula>> = symbol
            .children()
            .iter()
            .map(|id| self.graph.formula(*id))
            .collect();
        let parts = parts?;
        Some(match symbol {
            Symbol::And(_) => Formula::and(parts),
            Symbol::Or(_) => Formula::or(parts),
            Symbol::Throughout(window, _) => {
                Formula::throughout(self.graph.window(*window), parts[0].clone())
            }
            Symbol::Sometime(window, _) => {
                Formula::sometime(self.graph.window(*window), parts[0].clone())
            }
            Symbol::Until(window, _) => Formula::until(
                self.graph.window(*window),
                parts[0].clone(),
                parts[1].clone(),
            ),
            _ => return None,
        })
    }

    pub(super) fn constant(&mut self, value: bool) -> Id {
        self.graph.add_normal(Symbol::Constant(value))
    }

    fn has(&self, id: Id, flags: Flags) -> bool {
        self.graph.flags(id).has(flags)
    }

    /// Whether one of two classes has these facts.
    fn either(&self, a: Id, b: Id, flags: Flags) -> bool {
        self.has(a, flags) || self.has(b, flags)
    }

    /// `and` (or, with `or`, `or`) of classes.
    fn joined(&mut self, mut ids: Ids, or: bool) -> Id {
        if ids.len() == 1 {
            return self.graph.find(ids[0]);
        }
        if ids.is_empty() {
            return self.constant(!or);
        }
        ids.sort_unstable();
        self.make(if or {
            Symbol::Or(ids)
        } else {
            Symbol::And(ids)
        })
    }

    /// `throughout` (or, with `existential`, `sometime`) over a class.
    fn over(&mut self, window: u16, part: Id, existential: bool) -> Id {
        self.make(if existential {
            Symbol::Sometime(window, [part])
        } else {
            Symbol::Throughout(window, [part])
        })
    }

    fn last_of(&mut self, weak: bool, part: Id) -> Id {
        self.make(Symbol::Last(weak, [part]))
    }

    /// The number of `[lower, upper]`, when these bounds make a window.
    fn window_of(&mut self, lower: Bound, upper: Bound) -> Option<u16> {
        let window = Window::new(lower, upper).ok()?;
        Some(self.graph.dictionary_mut().window(window))
    }
}

/// The operands of `and` (or, with `or`, of `or`), if the node is one.
fn operands(symbol: &Symbol, or: bool) -> Option<&Ids> {
    match symbol {
        Symbol::And(ids) if !or => Some(ids),
        Symbol::Or(ids) if or => Some(ids),
        _ => None,
    }
}

/// The window and operand of `throughout` (or, with `existential`, of
/// `sometime`), if the node is one.
fn windowed(symbol: &Symbol, existential: bool) -> Option<(u16, Id)> {
    match symbol {
        Symbol::Throughout(window, [part]) if !existential => Some((*window, *part)),
        Symbol::Sometime(window, [part]) if existential => Some((*window, *part)),
        _ => None,
    }
}

/// Whether a window starts now.
fn starts_now(window: Window) -> bool {
    matches!(window.lower(), Bound::After(low) if low.is_zero())
}

/// Whether a window is this instant alone.
fn is_now(window: Window) -> bool {
    starts_now(window) && matches!(window.upper(), Bound::After(high) if high.is_zero())
}

/// Whether it has no upper bound.
fn is_open(window: Window) -> bool {
    window.upper() == Bound::End
}

/// Whether a bound is a slot.
fn has_slot(window: Window) -> bool {
    [window.lower(), window.upper()].contains(&Bound::Slot)
}

/// Whether one bound is at most another, whatever the slots are.
fn at_most(a: Bound, b: Bound) -> bool {
    match (a, b) {
        (_, Bound::End) => true,
        (Bound::After(a), Bound::After(b)) if !a.is_zero() => {
            a.unit == b.unit && a.value <= b.value
        }
        (Bound::After(a), _) => a.is_zero(),
        _ => false,
    }
}

/// Whether every instant of one window is one of another, whatever the slots
/// are, among windows with an upper bound or among those without.
fn covers(outer: Window, inner: Window) -> bool {
    let kinds = is_open(outer) == is_open(inner);
    kinds && covers_on_record(outer, inner)
}

/// As [`covers`], of instants of the record only: no upper bound is then as
/// good as any.
fn covers_on_record(outer: Window, inner: Window) -> bool {
    at_most(outer.lower(), inner.lower()) && at_most(inner.upper(), outer.upper())
}
