//! Rules with `throughout` at the top, and (with `existential`) their duals with
//! `sometime`.

use egg::Id;

use super::{Normaliser, is_now, is_open, operands, starts_now, windowed};
use crate::equivalence::flags::Flags;
use crate::equivalence::language::{Ids, Symbol};
use crate::support::Finite;
use crate::template::{Bound, Duration, TimeUnit, Window};

type Applied = Option<(&'static str, Id)>;

impl Normaliser {
    pub(super) fn windowed(&mut self, number: u16, part: Id, existential: bool) -> Applied {
        let window = self.graph.window(number);
        let symbol = self.graph.symbol(part);
        if let Symbol::Constant(value) = symbol {
            // What is always true is so throughout; what is never true is not
            // so even now.
            let neutral = value != existential;
            let settled = is_open(window) && neutral || starts_now(window) && !neutral;
            return settled.then(|| ("constants", self.constant(value)));
        }
        let reads = if existential {
            Flags::ROOT_STRONG
        } else {
            Flags::ROOT_WEAK
        };
        if is_now(window) && self.has(part, reads) {
            return Some(("now", part));
        }
        if let Some((inner, below)) = windowed(&symbol, existential) {
            let nested = self.nested(window, number, inner, below, existential);
            if nested.is_some() {
                return nested;
            }
        }
        if is_open(window) {
            let open = self.open(number, part, &symbol, existential);
            if open.is_some() {
                return open;
            }
        }
        if starts_now(window) {
            return self.move_out(number, part, &symbol, existential);
        }
        None
    }

    /// A window in a window of the same kind.
    fn nested(
        &mut self,
        outer: Window,
        outer_number: u16,
        inner_number: u16,
        below: Id,
        existential: bool,
    ) -> Applied {
        let inner = self.graph.window(inner_number);
        if let Some((rule, merged)) = merged(outer, inner) {
            let number = self.graph.dictionary_mut().window(merged);
            return Some((rule, self.over(number, below, existential)));
        }
        // Bounded windows of one kind commute.
        if !is_open(outer) && !is_open(inner) && inner < outer {
            let within = self.over(outer_number, below, existential);
            return Some(("nest-order", self.over(inner_number, within, existential)));
        }
        None
    }

    /// Windows with `end`: the operand is read at all instants from some on.
    fn open(&mut self, number: u16, part: Id, symbol: &Symbol, existential: bool) -> Applied {
        if existential
            && let Symbol::Until(inner, [_, right]) = symbol
            && starts_now(self.graph.window(*inner))
        {
            return Some(("until-comes", self.over(number, *right, true)));
        }
        if let Some(parts) = operands(symbol, existential)
            && let Some(stripped) = self.stripped(parts, existential)
        {
            return Some(("strip", self.over(number, stripped, existential)));
        }
        if let Some(parts) = operands(symbol, !existential) {
            // G(f or L) = (G f) or L, where L is fixed.
            let (fixed, rest): (Ids, Ids) = parts
                .iter()
                .copied()
                .partition(|part| self.has(*part, Flags::FIXED));
            if !fixed.is_empty() && !rest.is_empty() {
                let rest = self.joined(rest, !existential);
                let over = self.over(number, rest, existential);
                let all = fixed.into_iter().chain([over]).collect();
                return Some(("fixed", self.joined(all, !existential)));
            }
        }
        if starts_now(self.graph.window(number)) {
            return self.holding_from_now(number, part, symbol, existential);
        }
        self.holding_from_later(number, part, symbol, existential)
    }

    /// `[a, end]`: of what can only become false, only the last instant counts.
    fn holding_from_later(
        &mut self,
        number: u16,
        part: Id,
        symbol: &Symbol,
        existential: bool,
    ) -> Applied {
        let other = if existential { Flags::UP } else { Flags::DOWN };
        let falls = |this: &Self, id: Id| this.has(id, other) && !this.has(id, Flags::FIXED);
        if falls(self, part) {
            let last = self.last_of(!existential, part);
            return Some(("until-last", self.over(number, last, existential)));
        }
        let parts = operands(symbol, existential)?;
        if !parts.iter().any(|id| falls(self, *id)) {
            return None;
        }
        let mut all = Ids::new();
        for id in parts.clone() {
            all.push(if falls(self, id) {
                self.last_of(!existential, id)
            } else {
                id
            });
        }
        let part = self.joined(all, existential);
        Some(("until-last", self.over(number, part, existential)))
    }

    /// `[0, end]`.
    fn holding_from_now(
        &mut self,
        number: u16,
        part: Id,
        symbol: &Symbol,
        existential: bool,
    ) -> Applied {
        let (own, other) = if existential {
            (Flags::DOWN, Flags::UP)
        } else {
            (Flags::UP, Flags::DOWN)
        };
        if self.has(part, own.or(Flags::STATE)) {
            return Some(("stays", part));
        }
        if self.has(part, other) {
            return Some(("until-last", self.last_of(!existential, part)));
        }
        if !existential && let Symbol::Until(inner, [left, right]) = symbol {
            let window = self.graph.window(*inner);
            let (inner, left, right) = (*inner, *left, *right);
            if starts_now(window) && is_open(window) && self.has(right, Flags::SAME) {
                // G(D until g) = D until (G g), where D can only become false.
                if self.has(left, Flags::DOWN) {
                    let stays = self.over(number, right, false);
                    let made = self.make(Symbol::Until(inner, [left, stays]));
                    return Some(("until-always", made));
                }
            }
            let splits = starts_now(window)
                && self.has(right, Flags::SINGLETON)
                && (!is_open(window) || self.has(right, Flags::SAME));
            if splits {
                // G(f until g) = G(f or g) and G F g
                let either = self.joined(Ids::from_slice(&[left, right]), true);
                let comes = self.over(inner, right, true);
                let both = self.joined(Ids::from_slice(&[either, comes]), false);
                return Some(("until-always", self.over(number, both, false)));
            }
        }
        if let Some(parts) = operands(symbol, existential) {
            // What can only become false holds throughout when it does at last.
            let (falling, rest): (Ids, Ids) = parts
                .iter()
                .copied()
                .partition(|part| self.has(*part, other));
            if !falling.is_empty() {
                let mut all = Ids::new();
                for part in falling {
                    all.push(self.last_of(!existential, part));
                }
                let rest = self.joined(rest, existential);
                all.push(self.over(number, rest, existential));
                return Some(("until-last", self.joined(all, existential)));
            }
        }
        let parts = operands(symbol, !existential)?;
        self.inner(number, parts, existential)
            .or_else(|| self.fallen(number, parts, other, existential))
    }

    /// G(f or G[0,b] f) = G f, where the members of f are nested.
    fn inner(&mut self, number: u16, parts: &Ids, existential: bool) -> Applied {
        // Beside other operands the weaker of the two would still matter,
        // unless the family has one member.
        for at in 0..parts.len() {
            let symbol = self.graph.symbol(parts[at]);
            let Some((window, below)) = windowed(&symbol, existential) else {
                continue;
            };
            let beside = (0..parts.len()).any(|place| place != at && parts[place] == below);
            let needs = if parts.len() > 2 {
                Flags::SINGLETON
            } else {
                Flags::CHAIN
            };
            if beside && starts_now(self.graph.window(window)) && self.has(below, needs) {
                let rest = without(parts, at);
                let rest = self.joined(rest, !existential);
                return Some(("inner", self.over(number, rest, existential)));
            }
        }
        None
    }

    /// G(D or G[0,b] g) = G(D or g), where D can only become false.
    fn fallen(&mut self, number: u16, parts: &Ids, other: Flags, existential: bool) -> Applied {
        for at in 0..parts.len() {
            let symbol = self.graph.symbol(parts[at]);
            let Some((window, below)) = windowed(&symbol, existential) else {
                continue;
            };
            let rest = without(parts, at);
            if starts_now(self.graph.window(window)) && rest.iter().all(|id| self.has(*id, other)) {
                let all = rest.into_iter().chain([below]).collect();
                let part = self.joined(all, !existential);
                return Some(("fallen", self.over(number, part, existential)));
            }
        }
        None
    }

    /// Operands under a window with `end` lose their own looks ahead of the
    /// same kind.
    fn stripped(&mut self, parts: &Ids, existential: bool) -> Option<Id> {
        for at in 0..parts.len() {
            let symbol = self.graph.symbol(parts[at]);
            if let Some((window, below)) = windowed(&symbol, existential)
                && starts_now(self.graph.window(window))
            {
                let all = without(parts, at).into_iter().chain([below]).collect();
                return Some(self.joined(all, existential));
            }
        }
        None
    }

    /// G[0,b](f and X) = (G[0,b] f) and X, where X stays true.
    fn move_out(&mut self, number: u16, _: Id, symbol: &Symbol, existential: bool) -> Applied {
        let parts = operands(symbol, existential)?;
        let (own, root) = if existential {
            (Flags::DOWN, Flags::ROOT_STRONG)
        } else {
            (Flags::UP, Flags::ROOT_WEAK)
        };
        let needs = if is_open(self.graph.window(number)) {
            own.or(Flags::STATE)
        } else {
            own.or(root)
        };
        let (staying, rest): (Ids, Ids) = parts
            .iter()
            .copied()
            .partition(|part| self.has(*part, needs));
        if staying.is_empty() || rest.is_empty() {
            return None;
        }
        let rest = self.joined(rest, existential);
        let over = self.over(number, rest, existential);
        let all = staying.into_iter().chain([over]).collect();
        Some(("stays", self.joined(all, existential)))
    }
}

fn without(parts: &Ids, at: usize) -> Ids {
    let kept = parts.iter().enumerate().filter(|(place, _)| *place != at);
    kept.map(|(_, id)| *id).collect()
}

/// A window in a window of the same kind, as one.
fn merged(outer: Window, inner: Window) -> Option<(&'static str, Window)> {
    let (a, b, c, d) = (outer.lower(), outer.upper(), inner.lower(), inner.upper());
    let window = |lower, upper| Window::new(lower, upper).ok();
    let zero = |bound: Bound| matches!(bound, Bound::After(low) if low.is_zero());
    match (a, b, c, d) {
        // Shifts of shifts, and a look ahead that every instant gets anyway.
        (Bound::Slot, Bound::End, Bound::Slot, Bound::End) => {
            Some(("nest-slots", window(a, Bound::End)?))
        }
        (Bound::After(_), Bound::Slot, Bound::After(_), Bound::Slot) if zero(a) && zero(c) => {
            Some(("nest-slots", window(a, Bound::Slot)?))
        }
        (_, Bound::End, Bound::After(_), Bound::Slot) if zero(c) => {
            Some(("nest-slots", window(a, Bound::End)?))
        }
        (Bound::Slot, Bound::End, Bound::After(_), _) if zero(c) => {
            Some(("nest-slots", window(a, Bound::End)?))
        }
        (Bound::After(_), Bound::End, Bound::Slot, Bound::End) if zero(a) => {
            Some(("nest-slots", window(c, Bound::End)?))
        }
        (Bound::After(a), Bound::End, Bound::After(c), Bound::After(_) | Bound::End) => {
            Some(("nest", window(Bound::After(sum(a, c)?), Bound::End)?))
        }
        (Bound::After(a), Bound::After(b), Bound::After(c), Bound::After(d)) => {
            let (lower, upper) = (sum(a, c)?, sum(b, d)?);
            // Whole steps add up only where the bounds are whole steps: real
            // bounds are taken inward one by one.
            let whole = [a, b, c, d]
                .iter()
                .all(|x| x.unit == TimeUnit::Step || x.is_zero());
            let merged = window(Bound::After(lower), Bound::After(upper))?;
            whole.then_some(("nest", merged))
        }
        _ => None,
    }
}

/// The sum of two durations, where it is exact.
fn sum(a: Duration, b: Duration) -> Option<Duration> {
    if a.is_zero() {
        return Some(b);
    }
    if b.is_zero() {
        return Some(a);
    }
    // Only whole steps add up exactly: real bounds are taken inward.
    if a.unit != TimeUnit::Step || b.unit != TimeUnit::Step {
        return None;
    }
    Some(Duration {
        value: Finite::new(a.value.value() + b.value.value()).ok()?,
        unit: TimeUnit::Step,
    })
}
