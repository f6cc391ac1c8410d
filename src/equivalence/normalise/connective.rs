//! Rules with `and` or `or` at the top. Each is written once; with `or` set the
//! dual holds (and/or, throughout/sometime, weak/strong swapped).

use egg::Id;

use super::{Normaliser, at_most, has_slot, is_open, operands, starts_now, windowed};
use crate::equivalence::flags::Flags;
use crate::equivalence::language::{Ids, Symbol};
use crate::template::Bound;

/// What becomes of two operands.
enum Pair {
    /// The second goes.
    DropSecond(&'static str),
    /// One takes the place of both.
    Merge(&'static str, Id),
    /// The second becomes another.
    Change(&'static str, Id),
    /// The two settle the whole.
    Settle(&'static str, bool),
}

impl Normaliser {
    pub(super) fn connective(&mut self, ids: &Ids, or: bool) -> Option<(&'static str, Id)> {
        if let Some(flat) = self.flattened(ids, or) {
            return Some(match flat {
                Ok(flat) => ("order", self.joined(flat, or)),
                Err(value) => ("constants", self.constant(value)),
            });
        }
        for first in 0..ids.len() {
            for second in 0..ids.len() {
                if first == second {
                    continue;
                }
                let (a, b) = (ids[first], ids[second]);
                let Some(pair) = self.pair(a, b, or, first < second) else {
                    continue;
                };
                let without = |at: &[usize]| -> Ids {
                    let kept = (0..ids.len()).filter(|place| !at.contains(place));
                    kept.map(|place| ids[place]).collect()
                };
                let (rule, rest, with) = match pair {
                    Pair::Settle(rule, value) => return Some((rule, self.constant(value))),
                    Pair::DropSecond(rule) => (rule, without(&[second]), None),
                    Pair::Merge(rule, id) => (rule, without(&[first, second]), Some(id)),
                    Pair::Change(rule, id) => (rule, without(&[second]), Some(id)),
                };
                let all = rest.into_iter().chain(with).collect();
                return Some((rule, self.joined(all, or)));
            }
        }
        None
    }

    /// The operands without nested ones of the same kind and without constants,
    /// if that changes anything; `Err` when a constant settles all.
    fn flattened(&mut self, ids: &Ids, or: bool) -> Option<Result<Ids, bool>> {
        let mut flat = Ids::new();
        let mut changed = false;
        for id in ids {
            match self.graph.symbol(*id) {
                Symbol::Constant(value) if value == or => return Some(Err(or)),
                Symbol::Constant(_) => changed = true,
                symbol => match operands(&symbol, or) {
                    Some(parts) => {
                        flat.extend(parts.iter().copied());
                        changed = true;
                    }
                    None => flat.push(*id),
                },
            }
        }
        changed.then_some(Ok(flat))
    }

    /// Two operands of `and` (with `or`, of `or`). `ordered` says that the other
    /// order is tried as well, later.
    fn pair(&mut self, a: Id, b: Id, or: bool, ordered: bool) -> Option<Pair> {
        let closed = if or { Flags::JOIN } else { Flags::MEET };
        if a == b {
            return self.has(a, closed).then_some(Pair::DropSecond("repeat"));
        }
        let absorbs = if or {
            self.implies(b, a)
        } else {
            self.implies(a, b)
        };
        if absorbs {
            return Some(Pair::DropSecond("absorb"));
        }
        if ordered && self.opposed(a, b, or) {
            return Some(Pair::Settle("opposed", or));
        }
        self.beside(a, b, or)
            .or_else(|| self.spread(a, b, or, ordered))
            .or_else(|| self.until_beside(a, b, or))
    }

    /// An operand beside one of the other connective.
    fn beside(&mut self, a: Id, b: Id, or: bool) -> Option<Pair> {
        let symbol = self.graph.symbol(b);
        let parts = operands(&symbol, !or)?.clone();
        // e or (not e and f) = e or f
        let kept: Ids = parts
            .iter()
            .copied()
            .filter(|part| !self.opposed(a, *part, or))
            .collect();
        if kept.len() < parts.len() {
            let changed = self.joined(kept, !or);
            return Some(Pair::Change("opposed-part", changed));
        }
        if or {
            return None;
        }
        // f and (g or d) = d or (f and g), where d says more than f.
        let (under, rest): (Ids, Ids) = parts
            .iter()
            .copied()
            .partition(|part| self.implies(*part, a) || (*part == a && self.has(a, Flags::CHAIN)));
        if under.is_empty() || rest.is_empty() {
            return None;
        }
        let rest = self.joined(rest, true);
        let inner = self.joined(Ids::from_slice(&[a, rest]), false);
        let all = under.into_iter().chain([inner]).collect();
        Some(Pair::Merge("modular", self.joined(all, true)))
    }

    /// Two operands with windows.
    fn spread(&mut self, a: Id, b: Id, or: bool, ordered: bool) -> Option<Pair> {
        if !ordered {
            return None;
        }
        let (sa, sb) = (self.graph.symbol(a), self.graph.symbol(b));
        if let (Some((v, f)), Some((w, g))) = (windowed(&sa, or), windowed(&sb, or)) {
            let (one, other) = (self.graph.window(v), self.graph.window(w));
            if v == w && !has_slot(one) {
                let both = self.joined(Ids::from_slice(&[f, g]), or);
                return Some(Pair::Merge("spread", self.over(v, both, or)));
            }
            // Windows that touch, over one and the same member.
            let touches = f == g
                && self.has(f, Flags::SINGLETON)
                && !has_slot(one)
                && !has_slot(other)
                && !is_open(one)
                && !is_open(other);
            if touches {
                let (first, then) = if at_most(one.lower(), other.lower()) {
                    (one, other)
                } else {
                    (other, one)
                };
                if at_most(first.lower(), then.lower())
                    && at_most(then.lower(), first.upper())
                    && at_most(first.upper(), then.upper())
                {
                    let window = self.window_of(first.lower(), then.upper())?;
                    return Some(Pair::Merge("touching", self.over(window, f, or)));
                }
            }
        }
        let (Symbol::Until(v, [f, g]), Symbol::Until(w, [k, h])) = (&sa, &sb) else {
            return None;
        };
        let window = self.graph.window(*v);
        if v != w || has_slot(window) {
            return None;
        }
        if or && f == k && self.has(*f, Flags::SINGLETON) {
            let either = self.joined(Ids::from_slice(&[*g, *h]), true);
            let merged = self.make(Symbol::Until(*v, [*f, either]));
            return Some(Pair::Merge("until-spread", merged));
        }
        if !or && g == h && self.has(*g, Flags::SINGLETON) && window.lower() != Bound::Slot {
            let both = self.joined(Ids::from_slice(&[*f, *k]), false);
            let merged = self.make(Symbol::Until(*v, [both, *g]));
            return Some(Pair::Merge("until-spread", merged));
        }
        None
    }

    /// An operand beside `until`.
    fn until_beside(&mut self, a: Id, b: Id, or: bool) -> Option<Pair> {
        let Symbol::Until(number, [f, g]) = self.graph.symbol(b) else {
            return None;
        };
        let window = self.graph.window(number);
        if !starts_now(window) {
            return None;
        }
        let same = !is_open(window) || self.either(a, f, Flags::SAME) && self.has(g, Flags::SAME);
        if or {
            // h or (f until g) = h or g, where f says more than h.
            let reads = self.either(a, f, Flags::ROOT_WEAK) && self.has(g, Flags::ROOT_STRONG);
            return (reads && same && self.implies(f, a))
                .then_some(Pair::Change("until-beside", g));
        }
        // not f and (f until g) = not f and g
        let reads = self.has(g, Flags::ROOT_STRONG) && self.has(f, Flags::ROOT_WEAK);
        (reads && same && self.opposed(a, f, false)).then_some(Pair::Change("until-beside", g))
    }
}
