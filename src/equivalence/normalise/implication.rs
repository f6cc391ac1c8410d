//! When every member of one family implies every member of another, in every
//! reading and outermost.
//!
//! Strong verdicts imply weak ones, for every formula. Where a rule passes
//! from one reading to another (`end` windows read `throughout` weak and
//! `sometime` strong, whatever the place), the facts of the classes must say
//! that the readings agree.

use egg::Id;

use super::{Normaliser, covers, covers_on_record, is_open, starts_now};
use crate::equivalence::flags::Flags;
use crate::equivalence::language::Symbol;
use crate::template::{Atom, Comparison, Threshold};

/// How deep the comparison goes.
const DEEPEST: u32 = 6;

impl Normaliser {
    /// Whether all members of one class imply all members of another.
    pub(super) fn implies(&self, i: Id, j: Id) -> bool {
        self.implies_to(i, j, DEEPEST)
    }

    fn implies_to(&self, i: Id, j: Id, deep: u32) -> bool {
        let (i, j) = (self.graph.find(i), self.graph.find(j));
        if i == j {
            return self.has(i, Flags::SINGLETON);
        }
        let (si, sj) = (self.graph.symbol(i), self.graph.symbol(j));
        if si == Symbol::Constant(false) || sj == Symbol::Constant(true) {
            return true;
        }
        if deep == 0 || self.graph.data(i).signals & self.graph.data(j).signals == 0 {
            return false;
        }
        let deep = deep - 1;
        match (&si, &sj) {
            (Symbol::Or(parts), _) => parts.iter().all(|part| self.implies_to(*part, j, deep)),
            (_, Symbol::And(parts)) => parts.iter().all(|part| self.implies_to(i, *part, deep)),
            _ => {
                matches!(&si, Symbol::And(parts)
                    if parts.iter().any(|part| self.implies_to(*part, j, deep)))
                    || matches!(&sj, Symbol::Or(parts)
                        if parts.iter().any(|part| self.implies_to(i, *part, deep)))
                    || self.heads(&si, &sj, deep)
                    || self.down_from(i, &si, j, deep)
                    || self.up_to(i, j, &sj, deep)
            }
        }
    }

    /// Whether the weak verdict of one class implies the strong verdict of
    /// another, for all members, on the record.
    pub(super) fn implies_across(&self, i: Id, j: Id) -> bool {
        if self.either(i, j, Flags::SAME) && self.implies(i, j) {
            return true;
        }
        let now = |number: u16| starts_now(self.graph.window(number));
        if let Symbol::Throughout(number, [f]) = self.graph.symbol(i)
            && now(number)
            && self.implies_across(f, j)
        {
            return true;
        }
        match self.graph.symbol(j) {
            Symbol::Sometime(number, [g]) => now(number) && self.implies_across(i, g),
            _ => false,
        }
    }

    /// Whether the strong verdict of one class implies that of another.
    pub(super) fn implies_strongly(&self, i: Id, j: Id) -> bool {
        if self.implies(i, j) {
            return true;
        }
        let window = |number: u16| self.graph.window(number);
        match (self.graph.symbol(i), self.graph.symbol(j)) {
            (Symbol::Sometime(v, [f]), Symbol::Sometime(w, [g])) => {
                is_open(window(w))
                    && covers_on_record(window(w), window(v))
                    && self.implies_strongly(f, g)
            }
            _ => false,
        }
    }

    /// Two nodes of one kind.
    fn heads(&self, si: &Symbol, sj: &Symbol, deep: u32) -> bool {
        let window = |number: &u16| self.graph.window(*number);
        match (si, sj) {
            (Symbol::Atom(a), Symbol::Atom(b)) => self.level_implies(*a, *b),
            (Symbol::Throughout(v, [f]), Symbol::Throughout(w, [g])) => {
                covers(window(v), window(w)) && self.implies_to(*f, *g, deep)
            }
            (Symbol::Sometime(v, [f]), Symbol::Sometime(w, [g])) => {
                covers(window(w), window(v)) && self.implies_to(*f, *g, deep)
            }
            (Symbol::Until(v, [l, r]), Symbol::Until(w, [k, s])) => {
                covers(window(w), window(v))
                    && self.implies_to(*l, *k, deep)
                    && self.implies_to(*r, *s, deep)
            }
            (Symbol::Until(v, [_, r]), Symbol::Sometime(w, [g])) => {
                covers(window(w), window(v)) && self.implies_to(*r, *g, deep)
            }
            (Symbol::Last(weak, [f]), Symbol::Last(other, [g])) => {
                (!weak || *other || self.either(*f, *g, Flags::SAME))
                    && self.implies_to(*f, *g, deep)
            }
            _ => false,
        }
    }

    /// From what a window says to what holds now, or at the last instant.
    fn down_from(&self, i: Id, si: &Symbol, j: Id, deep: u32) -> bool {
        match si {
            Symbol::Throughout(number, [f]) => {
                let window = self.graph.window(*number);
                let reads = !is_open(window) || self.either(*f, j, Flags::SAME);
                if !starts_now(window) {
                    return false;
                }
                if let Symbol::Last(weak, [g]) = self.graph.symbol(j)
                    && is_open(window)
                    && (weak || self.either(*f, g, Flags::SAME))
                    && self.implies_to(*f, g, deep)
                {
                    return true;
                }
                reads && self.either(*f, j, Flags::ROOT_WEAK) && self.implies_to(*f, j, deep)
            }
            Symbol::Sometime(number, [f]) => {
                // What was once true and can only have been true before.
                is_open(self.graph.window(*number))
                    && self.has(j, Flags::DOWN.or(Flags::ROOT_STRONG))
                    && self.implies_to(*f, j, deep)
            }
            Symbol::Until(number, [l, r]) => {
                let window = self.graph.window(*number);
                let lefts = || {
                    self.either(*l, j, Flags::ROOT_WEAK)
                        && (!is_open(window) || self.either(*l, j, Flags::SAME))
                        && self.implies_to(*l, j, deep)
                };
                starts_now(window)
                    && self.either(*r, j, Flags::ROOT_STRONG)
                    && self.implies_to(*r, j, deep)
                    && lefts()
            }
            Symbol::Last(weak, [f]) => {
                let _ = i;
                self.has(j, Flags::DOWN.or(Flags::STATE))
                    && (!weak || self.either(*f, j, Flags::SAME))
                    && self.implies_to(*f, j, deep)
            }
            _ => false,
        }
    }

    /// From what holds now, or at the last instant, to what a window says.
    fn up_to(&self, i: Id, j: Id, sj: &Symbol, deep: u32) -> bool {
        match sj {
            Symbol::Sometime(number, [g]) => {
                let window = self.graph.window(*number);
                if !starts_now(window) {
                    return false;
                }
                if let Symbol::Last(weak, [f]) = self.graph.symbol(i)
                    && is_open(window)
                    && (!weak || self.either(f, *g, Flags::SAME))
                    && self.implies_to(f, *g, deep)
                {
                    return true;
                }
                (!is_open(window) || self.either(i, *g, Flags::SAME))
                    && self.either(i, *g, Flags::ROOT_STRONG)
                    && self.implies_to(i, *g, deep)
            }
            Symbol::Until(number, [_, r]) => {
                let window = self.graph.window(*number);
                starts_now(window)
                    && (!is_open(window) || self.either(i, *r, Flags::SAME))
                    && self.either(i, *r, Flags::ROOT_STRONG)
                    && self.implies_to(i, *r, deep)
            }
            Symbol::Throughout(number, [g]) => {
                // What is true now and stays so.
                is_open(self.graph.window(*number))
                    && self.has(i, Flags::UP.or(Flags::ROOT_WEAK))
                    && self.implies_to(i, *g, deep)
            }
            Symbol::Last(weak, [g]) => {
                let _ = j;
                self.has(i, Flags::UP.or(Flags::STATE))
                    && (*weak || self.either(i, *g, Flags::SAME))
                    && self.implies_to(i, *g, deep)
            }
            _ => false,
        }
    }

    /// x <= 1 implies x <= 2.
    fn level_implies(&self, a: u32, b: u32) -> bool {
        let atoms = &self.graph.dictionary().atoms;
        let (
            Atom::Compare {
                signal: x,
                comparison: one,
                threshold: Threshold::Number(first, unit),
            },
            Atom::Compare {
                signal: y,
                comparison: other,
                threshold: Threshold::Number(second, other_unit),
            },
        ) = (&atoms[a as usize].atom, &atoms[b as usize].atom)
        else {
            return false;
        };
        let upper = |c: &Comparison| matches!(c, Comparison::AtMost | Comparison::Below);
        if x != y || unit != other_unit || upper(one) != upper(other) {
            return false;
        }
        let is_strict = |c: &Comparison| matches!(c, Comparison::Above | Comparison::Below);
        if first == second {
            return is_strict(one) || !is_strict(other);
        }
        (first < second) == upper(one)
    }
}
