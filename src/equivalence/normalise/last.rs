//! Rules for what holds at the last instant.

use egg::Id;

use super::{Normaliser, is_open, starts_now};
use crate::equivalence::flags::Flags;
use crate::equivalence::language::{Ids, Symbol};
use crate::template::{Bound, Duration, TimeUnit, Window};

impl Normaliser {
    pub(super) fn last(&mut self, weak: bool, part: Id) -> Option<(&'static str, Id)> {
        if self.has(part, Flags::FIXED) {
            return Some(("last", part));
        }
        let applied = match self.graph.symbol(part) {
            Symbol::And(parts) => Some(self.last_of_each(weak, &parts, false)),
            Symbol::Or(parts) => Some(self.last_of_each(weak, &parts, true)),
            Symbol::Throughout(number, [below]) => self.last_windowed(weak, number, below, false),
            Symbol::Sometime(number, [below]) => self.last_windowed(weak, number, below, true),
            Symbol::Until(number, [left, right]) => self.last_until(weak, number, left, right),
            _ => None,
        };
        if applied.is_none() && weak && self.has(part, Flags::SAME) {
            return Some(("last-reading", self.last_of(false, part)));
        }
        applied
    }

    /// A window at the last instant: of the record only that instant is left.
    fn last_windowed(
        &mut self,
        weak: bool,
        number: u16,
        below: Id,
        existential: bool,
    ) -> Option<(&'static str, Id)> {
        let window = self.graph.window(number);
        // The reading in which what lies beyond the record is neutral.
        let own = !existential;
        if is_open(window) || weak == own {
            if starts_now(window) {
                return Some(("last-window", self.last_of(own, below)));
            }
            if is_later(window) {
                return Some(("last-window", self.constant(own)));
            }
            // Now or beyond the record, as F[0,?] at the last instant.
            return self.last_shifted(below, own);
        }
        if reaches_beyond(window) {
            return Some(("last-window", self.constant(weak)));
        }
        if starts_now(window) && !self.has(below, Flags::FIXED) {
            let below = self.last_of(weak, below);
            let over = self.over(number, below, existential);
            return Some(("last-part", self.last_of(weak, over)));
        }
        None
    }

    fn last_until(
        &mut self,
        weak: bool,
        number: u16,
        left: Id,
        right: Id,
    ) -> Option<(&'static str, Id)> {
        let window = self.graph.window(number);
        if !starts_now(window) {
            return None;
        }
        if is_open(window) || !weak {
            return Some(("last-window", self.last_of(false, right)));
        }
        if reaches_beyond(window) {
            let either = self.joined(Ids::from_slice(&[left, right]), true);
            return Some(("last-window", self.last_of(true, either)));
        }
        None
    }

    /// `[?, end]` at the last instant: the operand there, or nothing at all.
    fn last_shifted(&mut self, below: Id, weak: bool) -> Option<(&'static str, Id)> {
        let window = self.window_of(Bound::After(Duration::zero()), Bound::Slot)?;
        let below = self.last_of(weak, below);
        let over = self.over(window, below, weak);
        Some(("last-window", self.last_of(weak, over)))
    }

    fn last_of_each(&mut self, weak: bool, parts: &Ids, or: bool) -> (&'static str, Id) {
        let parts = parts.iter().map(|part| self.last_of(weak, *part)).collect();
        ("last-each", self.joined(parts, or))
    }
}

/// Whether a window starts after now for certain.
fn is_later(window: Window) -> bool {
    matches!(window.lower(), Bound::After(low) if !low.is_zero())
}

/// Whether a bounded window is at least one step long for certain: half a
/// second may be less than a step.
fn reaches_beyond(window: Window) -> bool {
    matches!(window.upper(), Bound::After(high)
        if high.unit == TimeUnit::Step && high.value.value() >= 1.0)
}
