//! Equalities of whole templates: they hold where a formula stands outermost
//! and not inside another, so what they make the same is never united in the
//! e-graph.
//!
//! Outermost, only the record counts: a window is cut at the last instant, a
//! bounded window reads its operand by kind as one with `end` does, and the
//! verdicts of `and` and `or` are those of their operands. So the rules reach
//! through connectives at the top, and no further.

use egg::{Id, Language};

use super::{Normaliser, covers_on_record, is_open, operands, starts_now};
use crate::equivalence::flags::Flags;
use crate::equivalence::language::{Ids, Symbol};

type Applied = Option<(&'static str, Id)>;

/// Rounds of root rules on one template.
const MOST_ROUNDS: u32 = 8;

impl Normaliser {
    /// The class that stands for all templates which say the same as this one
    /// when they stand outermost, as far as the rules know.
    pub(in crate::equivalence) fn root(&mut self, id: Id) -> Id {
        self.root_in(self.graph.find(id), MOST_ROUNDS)
    }

    fn root_in(&mut self, id: Id, rounds: u32) -> Id {
        if rounds == 0 {
            return id;
        }
        let symbol = self.graph.symbol(id);
        let next = match &symbol {
            Symbol::And(parts) => self.root_parts(parts, false, rounds),
            Symbol::Or(parts) => self.root_parts(parts, true, rounds),
            Symbol::Throughout(number, [part]) => self.root_window(*number, *part, false),
            Symbol::Sometime(number, [part]) => self.root_window(*number, *part, true),
            Symbol::Until(number, [left, right]) => self.root_until(*number, *left, *right),
            _ => None,
        };
        match next {
            Some((rule, next)) if next != id => {
                self.note(rule, &symbol, next);
                self.root_in(next, rounds - 1)
            }
            _ => id,
        }
    }

    fn root_parts(&mut self, parts: &Ids, or: bool, rounds: u32) -> Applied {
        let own: Ids = parts
            .iter()
            .map(|part| self.root_in(*part, rounds - 1))
            .collect();
        let all = self.joined(own, or);
        let symbol = self.graph.symbol(all);
        let Some(parts) = operands(&symbol, or) else {
            return Some(("outermost-parts", all));
        };
        for first in 0..parts.len() {
            for second in 0..parts.len() {
                let (a, b) = (parts[first], parts[second]);
                let absorbs = first != second
                    && if or {
                        self.implies_at_root(b, a)
                    } else {
                        self.implies_at_root(a, b)
                    };
                if absorbs {
                    let kept = (0..parts.len()).filter(|place| *place != second);
                    let kept = kept.map(|place| parts[place]).collect();
                    return Some(("outermost-absorb", self.joined(kept, or)));
                }
            }
        }
        for first in 0..parts.len() {
            for second in first + 1..parts.len() {
                if self.opposed_at_root(parts[first], parts[second], or) {
                    return Some(("outermost-opposed", self.constant(or)));
                }
            }
        }
        Some(("outermost-parts", all))
    }

    /// A bounded window over something that stays, or that is fixed.
    fn root_window(&mut self, number: u16, part: Id, existential: bool) -> Applied {
        let window = self.graph.window(number);
        if is_open(window) || !starts_now(window) {
            return None;
        }
        let (own, root) = if existential {
            (Flags::DOWN, Flags::ROOT_STRONG)
        } else {
            (Flags::UP, Flags::ROOT_WEAK)
        };
        if self.has(part, Flags::FIXED) || self.has(part, own.or(root)) {
            return Some(("outermost-stays", part));
        }
        let symbol = self.graph.symbol(part);
        for or in [false, true] {
            let Some(parts) = operands(&symbol, or) else {
                continue;
            };
            let (fixed, rest): (Ids, Ids) = parts
                .iter()
                .copied()
                .partition(|part| self.has(*part, Flags::FIXED));
            if fixed.is_empty() || rest.is_empty() {
                continue;
            }
            let rest = self.joined(rest, or);
            let over = self.over(number, rest, existential);
            let all = fixed.into_iter().chain([over]).collect();
            return Some(("outermost-fixed", self.joined(all, or)));
        }
        None
    }

    fn root_until(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        if !starts_now(window) {
            return None;
        }
        let falls = self.has(right, Flags::DOWN.or(Flags::ROOT_STRONG));
        let said = self.has(right, Flags::ROOT_STRONG) && self.implies_across(left, right);
        if falls || said {
            return Some(("outermost-said", right));
        }
        // What can only become false holds before an instant at which it holds.
        if self.has(left, Flags::DOWN) && self.implies(right, left) {
            return Some(("outermost-free", self.over(number, right, true)));
        }
        None
    }

    /// Whether all members of one class imply all members of another, where
    /// both stand outermost.
    fn implies_at_root(&self, i: Id, j: Id) -> bool {
        if self.implies(i, j) {
            return true;
        }
        if self.graph.data(i).signals & self.graph.data(j).signals == 0 {
            return false;
        }
        let (si, sj) = (self.graph.symbol(i), self.graph.symbol(j));
        let window = |number: &u16| self.graph.window(*number);
        match (&si, &sj) {
            (Symbol::Or(parts), _) => {
                return parts.iter().all(|part| self.implies_at_root(*part, j));
            }
            (_, Symbol::And(parts)) => {
                return parts.iter().all(|part| self.implies_at_root(i, *part));
            }
            (Symbol::And(parts), _) if parts.iter().any(|p| self.implies_at_root(*p, j)) => {
                return true;
            }
            (_, Symbol::Or(parts)) if parts.iter().any(|p| self.implies_at_root(i, *p)) => {
                return true;
            }
            (Symbol::Throughout(v, [f]), Symbol::Throughout(w, [g]))
                if covers_on_record(window(v), window(w)) && self.implies(*f, *g) =>
            {
                return true;
            }
            (Symbol::Sometime(v, [f]), Symbol::Sometime(w, [g]))
                if covers_on_record(window(w), window(v)) && self.implies(*f, *g) =>
            {
                return true;
            }
            (Symbol::Throughout(v, [f]), Symbol::Sometime(w, [g]))
                if starts_now(window(v))
                    && starts_now(window(w))
                    && self.either(*f, *g, Flags::SAME)
                    && self.implies(*f, *g) =>
            {
                return true;
            }
            (Symbol::Until(v, [_, r]), Symbol::Sometime(w, [g]))
                if covers_on_record(window(w), window(v)) && self.implies(*r, *g) =>
            {
                return true;
            }
            (Symbol::Until(v, [l, r]), Symbol::Until(w, [k, s]))
                if covers_on_record(window(w), window(v))
                    && self.implies(*l, *k)
                    && self.implies(*r, *s) =>
            {
                return true;
            }
            _ => {}
        }
        self.now_at_root(&si, i, &sj, j)
    }

    /// From a window that starts now to now, and the other way round.
    fn now_at_root(&self, si: &Symbol, i: Id, sj: &Symbol, j: Id) -> bool {
        let window = |number: &u16| self.graph.window(*number);
        if let Symbol::Throughout(v, [f]) = si
            && starts_now(window(v))
            && (self.has(*f, Flags::ROOT_WEAK) && self.implies_at_root(*f, j)
                || self.has(j, Flags::ROOT_WEAK) && self.implies(*f, j))
        {
            return true;
        }
        match sj {
            Symbol::Sometime(w, [g]) | Symbol::Until(w, [_, g]) => {
                starts_now(window(w))
                    && (self.has(*g, Flags::ROOT_STRONG) && self.implies_at_root(i, *g)
                        || self.has(i, Flags::ROOT_STRONG) && self.implies(i, *g))
            }
            _ => false,
        }
    }

    /// Whether two classes are never both true (or, with `or`, never both
    /// false), outermost.
    fn opposed_at_root(&mut self, a: Id, b: Id, or: bool) -> bool {
        if self.graph.data(a).signals & self.graph.data(b).signals == 0 {
            return false;
        }
        // An atom with unknown samples is read weak, and so is its negation.
        let known = |this: &Self, id: Id| {
            let symbol = this.graph.symbol(id);
            !symbol.is_leaf() || this.has(id, Flags::STATE)
        };
        for (a, b) in [(a, b), (b, a)] {
            if !known(self, a) || !known(self, b) {
                continue;
            }
            if let Some(not_b) = self.negation(b)
                && (if or {
                    self.implies_at_root(not_b, a)
                } else {
                    self.implies_at_root(a, not_b)
                })
            {
                return true;
            }
        }
        false
    }
}
