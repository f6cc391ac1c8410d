//! Rules with `until` at the top.

use egg::Id;

use super::{Normaliser, has_slot, is_now, is_open, starts_now};
use crate::equivalence::flags::Flags;
use crate::equivalence::language::{Ids, Symbol};
use crate::template::Bound;

type Applied = Option<(&'static str, Id)>;

impl Normaliser {
    pub(super) fn until(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        if is_now(window) && self.has(right, Flags::ROOT_STRONG) {
            return Some(("until-now", right));
        }
        self.until_constant(number, left, right)
            .or_else(|| self.until_said(number, left, right))
            .or_else(|| self.until_free(number, left, right))
            .or_else(|| self.until_left(number, left, right))
            .or_else(|| self.until_right(number, left, right))
    }

    /// A side that is constant.
    fn until_constant(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        match (self.graph.symbol(left), self.graph.symbol(right)) {
            (Symbol::Constant(true), _) => Some(("until-constant", self.over(number, right, true))),
            (_, Symbol::Constant(true)) if starts_now(window) => {
                Some(("until-constant", self.constant(true)))
            }
            (_, Symbol::Constant(false)) if is_open(window) => {
                Some(("until-constant", self.constant(false)))
            }
            (Symbol::Constant(false), _)
                if starts_now(window)
                    && self.has(right, Flags::ROOT_STRONG)
                    && (!is_open(window) || self.has(right, Flags::SAME)) =>
            {
                Some(("until-constant", right))
            }
            _ => None,
        }
    }

    /// One side says all.
    fn until_said(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        if !starts_now(window) {
            return None;
        }
        let open = is_open(window);
        // f until g = g, where f says more than g; also where g can only have
        // been true before.
        let reads = self.has(right, Flags::ROOT_STRONG)
            && (self.implies_across(left, right)
                || !open && self.either(left, right, Flags::SAME) && self.implies(left, right))
            && (!open || self.has(right, Flags::SAME));
        if reads && self.implies(left, right) {
            return Some(("until-said", right));
        }
        if open && self.has(right, Flags::DOWN.or(Flags::STATE)) {
            return Some(("until-said", right));
        }
        if open && self.until_open(left, right) {
            return Some(("until-said", right));
        }
        // Only whether g is strongly true now matters.
        if open
            && self.graph.symbol(left) != Symbol::Constant(false)
            && self.implies_across(left, right)
        {
            let never = self.constant(false);
            let made = self.make(Symbol::Until(number, [never, right]));
            return Some(("until-strong", made));
        }
        None
    }

    /// The left side cannot break off before the right one comes.
    fn until_free(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        if !starts_now(window) {
            return None;
        }
        let open = is_open(window);
        let complete = if open {
            self.completes(left, right)
        } else {
            self.opposed(left, right, true)
        };
        if complete {
            return Some(("until-free", self.over(number, right, true)));
        }
        if let Symbol::Sometime(inner, [below]) = self.graph.symbol(left)
            && starts_now(self.graph.window(inner))
        {
            let inner = self.graph.window(inner);
            let same = below == right
                && self.has(right, Flags::SINGLETON)
                && inner == window
                && !has_slot(window);
            if same || open && is_open(inner) && self.implies_strongly(right, left) {
                return Some(("until-free", self.over(number, right, true)));
            }
            // (g within b) until g = g within b, strongly
            if open && below == right && self.has(right, Flags::SINGLETON.or(Flags::SAME)) {
                let never = self.constant(false);
                let made = self.make(Symbol::Until(number, [never, left]));
                return Some(("until-strong", made));
            }
            // (sometime h) until g = g or (sometime h), where h says more than g.
            if open
                && is_open(inner)
                && self.has(right, Flags::ROOT_STRONG.or(Flags::SAME))
                && self.implies(below, right)
            {
                let either = self.joined(Ids::from_slice(&[left, right]), true);
                return Some(("until-free", either));
            }
        }
        // X until g = g or X, where X stays and says that g comes.
        if open
            && self.has(left, Flags::UP.or(Flags::STATE))
            && self.has(right, Flags::ROOT_STRONG.or(Flags::SAME))
        {
            let comes = self.over(number, right, true);
            if self.implies(left, comes) {
                let either = self.joined(Ids::from_slice(&[left, right]), true);
                return Some(("until-free", either));
            }
        }
        None
    }

    /// Whether `f until [0, end] g` is g, for what is special about g.
    fn until_open(&mut self, left: Id, right: Id) -> bool {
        // f until (g from now on) = g from now on, where f says more than g
        if let Symbol::Throughout(inner, [below]) = self.graph.symbol(right)
            && is_open(self.graph.window(inner))
            && starts_now(self.graph.window(inner))
            && self.implies(left, below)
        {
            return true;
        }
        // What stays and forbids g.
        self.has(left, Flags::UP.or(Flags::STATE))
            && self.has(right, Flags::ROOT_STRONG.or(Flags::SAME))
            && self.opposed(left, right, false)
    }

    /// Shapes of the left side.
    fn until_left(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        let symbol = self.graph.symbol(left);
        if starts_now(window)
            && self.has(right, Flags::SINGLETON)
            && let Some(kept) = self.without(left, &symbol, right)
        {
            return Some(("until-or", self.make(Symbol::Until(number, [kept, right]))));
        }
        if let Symbol::Until(inner, [below, same]) = symbol
            && same == right
            && inner == number
            && starts_now(window)
            && !has_slot(window)
            && self.has(right, Flags::SINGLETON)
        {
            let made = self.make(Symbol::Until(number, [below, right]));
            return Some(("until-nest", made));
        }
        // What stays true must be so now, if anything must.
        let is_later = matches!(window.lower(), Bound::After(low) if !low.is_zero());
        if is_later && self.has(left, Flags::UP.or(Flags::STATE)) {
            let comes = self.over(number, right, true);
            let both = self.joined(Ids::from_slice(&[left, comes]), false);
            return Some(("until-stays", both));
        }
        None
    }

    /// The left side as it need be where the right one does not hold, if that
    /// is simpler: (f or g) until g = f until g.
    fn without(&mut self, _: Id, symbol: &Symbol, right: Id) -> Option<Id> {
        match symbol {
            Symbol::Or(parts) => {
                let kept: Ids = parts
                    .iter()
                    .copied()
                    .filter(|part| {
                        !(self.implies(*part, right) && self.either(*part, right, Flags::SAME))
                    })
                    .collect();
                (kept.len() < parts.len()).then(|| self.joined(kept, true))
            }
            Symbol::And(parts) => {
                let mut kept = Ids::new();
                for part in parts {
                    if !self.opposed(*part, right, true) {
                        kept.push(*part);
                    }
                }
                (kept.len() < parts.len()).then(|| self.joined(kept, false))
            }
            Symbol::Until(inner, [left, then]) => {
                let window = self.graph.window(*inner);
                let gone = starts_now(window)
                    && self.implies(*left, right)
                    && self.has(right, Flags::SAME)
                    && self.has(*then, Flags::STATE)
                    && is_open(window);
                gone.then_some(*then)
            }
            _ => None,
        }
    }

    /// Shapes of the right side.
    fn until_right(&mut self, number: u16, left: Id, right: Id) -> Applied {
        let window = self.graph.window(number);
        let symbol = self.graph.symbol(right);
        if let Symbol::Until(inner, [same, last]) = symbol
            && same == left
            && is_open(window)
            && starts_now(window)
            && starts_now(self.graph.window(inner))
        {
            let open = is_open(self.graph.window(inner)) && self.has(left, Flags::CHAIN);
            let one = self.has(left, Flags::SINGLETON.or(Flags::SAME));
            if open || one {
                let made = self.make(Symbol::Until(number, [left, last]));
                return Some(("until-nest", made));
            }
        }
        if !is_open(window) {
            return None;
        }
        // Fixed parts of the right side need not wait.
        for or in [false, true] {
            if let Some(parts) = super::operands(&symbol, or) {
                if or && !starts_now(window) {
                    continue;
                }
                let (fixed, rest): (Ids, Ids) = parts
                    .iter()
                    .copied()
                    .partition(|part| self.has(*part, Flags::FIXED));
                if !fixed.is_empty() && !rest.is_empty() {
                    let rest = self.joined(rest, or);
                    let made = self.make(Symbol::Until(number, [left, rest]));
                    let all = fixed.into_iter().chain([made]).collect();
                    return Some(("fixed", self.joined(all, or)));
                }
            }
        }
        None
    }
}
