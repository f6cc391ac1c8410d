//! Negations of classes: for contradictions, and because a template and its
//! negation count once.

use egg::{Id, Language};

use super::Normaliser;
use crate::equivalence::language::{Ids, Symbol};

impl Normaliser {
    /// The class of the negation. `None` where there is none in the language
    /// (`until`), or where it would need an atom with a slot that was never met,
    /// so that no formula met can be it.
    pub(in crate::equivalence) fn negation(&mut self, id: Id) -> Option<Id> {
        let id = self.graph.find(id);
        if let Some(known) = self.negations.get(&id) {
            return known.map(|known| self.graph.find(known));
        }
        let symbol = self.graph.symbol(id);
        let parts: Option<Ids> = match &symbol {
            Symbol::Until(..) => None,
            _ => symbol
                .children()
                .iter()
                .map(|part| self.negation(*part))
                .collect(),
        };
        let negation = parts.and_then(|parts| self.negated(&symbol, &parts));
        self.negations.insert(id, negation);
        if let Some(negation) = negation {
            self.negations.insert(negation, Some(id));
        }
        negation
    }

    fn negated(&mut self, symbol: &Symbol, parts: &Ids) -> Option<Id> {
        Some(match symbol {
            Symbol::Constant(value) => self.constant(!value),
            Symbol::Atom(number) => {
                let dictionary = self.graph.dictionary_mut();
                let entry = &dictionary.atoms[*number as usize];
                let (has_slot, negated) = (entry.has_slot(), entry.atom.negated());
                let number = if has_slot {
                    dictionary.known_atom(&negated)?
                } else {
                    dictionary.atom(&negated)
                };
                self.make(Symbol::Atom(number))
            }
            Symbol::And(_) => self.joined(parts.clone(), true),
            Symbol::Or(_) => self.joined(parts.clone(), false),
            Symbol::Throughout(window, _) => self.over(*window, parts[0], true),
            Symbol::Sometime(window, _) => self.over(*window, parts[0], false),
            Symbol::Until(..) => return None,
            Symbol::Last(weak, _) => self.last_of(!weak, parts[0]),
        })
    }

    /// Forgets negations that were not there: an atom has come that may make
    /// one.
    pub(in crate::equivalence) fn forget_missing_negations(&mut self) {
        self.negations.retain(|_, negation| negation.is_some());
    }

    /// Whether, at every instant of the record, one class is weakly true or the
    /// other strongly true.
    pub(super) fn completes(&mut self, weak: Id, strong: Id) -> bool {
        if self.graph.data(weak).signals & self.graph.data(strong).signals == 0 {
            return false;
        }
        if let Some(negation) = self.negation(strong)
            && self.implies(negation, weak)
        {
            return true;
        }
        self.negation(weak)
            .is_some_and(|negation| self.implies(negation, strong))
    }

    /// Whether two classes are never both true at an instant of the record (or,
    /// with `or`, never both false).
    pub(super) fn opposed(&mut self, a: Id, b: Id, or: bool) -> bool {
        let signals = self.graph.data(a).signals & self.graph.data(b).signals;
        if signals == 0 {
            return false;
        }
        for (a, b) in [(a, b), (b, a)] {
            if let Some(not_b) = self.negation(b)
                && (if or {
                    self.implies(not_b, a) && self.implies_across(not_b, a)
                } else {
                    self.implies(a, not_b) && self.implies_across(a, not_b)
                })
            {
                return true;
            }
        }
        false
    }
}
