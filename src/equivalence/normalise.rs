//! The normalising constructor: the rules applied at the top of a formula whose
//! parts are canonical, until none applies.
//!
//! Every step makes the formula smaller, or keeps its size and moves it down a
//! fixed order, except `swap`, which is applied in one direction only; so it
//! ends. A cap on the steps stands guard all the same: what is returned then is
//! equal, only perhaps not the smallest.

use egg::{EGraph, Id};

use super::flags::Flags;
use super::language::{Facts, Symbol};
use crate::support::Finite;
use crate::template::{
    Atom, Bound, Comparison, Duration, Formula, Node, Threshold, TimeUnit, Window,
};

/// Steps at the top of one formula.
const MOST_STEPS: usize = 64;

/// Applies the rules, and remembers which.
#[derive(Debug)]
pub(super) struct Normaliser<'a> {
    pub(super) graph: &'a mut EGraph<Symbol, Facts>,
    pub(super) applied: Vec<&'static str>,
}

/// Adds a formula to the e-graph as it is.
pub(super) fn add(graph: &mut EGraph<Symbol, Facts>, formula: &Formula) -> Id {
    let symbol = match formula.node() {
        Node::Atom(atom) => Symbol::Atom(atom.clone()),
        Node::And(parts) => Symbol::And(sorted_ids(graph, parts)),
        Node::Or(parts) => Symbol::Or(sorted_ids(graph, parts)),
        Node::Throughout(window, part) => Symbol::Throughout(*window, [add(graph, part)]),
        Node::Sometime(window, part) => Symbol::Sometime(*window, [add(graph, part)]),
        Node::Until(window, left, right) => {
            let left = add(graph, left);
            Symbol::Until(*window, [left, add(graph, right)])
        }
    };
    graph.add(symbol)
}

fn sorted_ids(graph: &mut EGraph<Symbol, Facts>, parts: &[Formula]) -> Vec<Id> {
    let mut ids: Vec<Id> = parts.iter().map(|part| add(graph, part)).collect();
    ids.sort_unstable();
    ids
}

/// The place of an operand: negated flags first, so that implications print as
/// such, then atoms, then the rest.
fn place(formula: &Formula) -> u8 {
    match formula.node() {
        Node::Atom(Atom::Flag { negated: true, .. }) => 0,
        Node::Atom(_) => 1,
        _ => 2,
    }
}

impl Normaliser<'_> {
    /// The normal form of a formula.
    pub(super) fn normal(&mut self, formula: &Formula) -> Formula {
        let mut current = formula.clone();
        for _ in 0..MOST_STEPS {
            // A step may leave parts that are not canonical.
            current = self.with_normal_parts(&current);
            match self.step(&current) {
                Some((rule, next)) => {
                    self.applied.push(rule);
                    current = next;
                }
                None => break,
            }
        }
        current
    }

    fn with_normal_parts(&mut self, formula: &Formula) -> Formula {
        match formula.node() {
            Node::Atom(_) => formula.clone(),
            Node::And(parts) => Formula::and(parts.iter().map(|f| self.normal(f)).collect()),
            Node::Or(parts) => Formula::or(parts.iter().map(|f| self.normal(f)).collect()),
            Node::Throughout(window, part) => Formula::throughout(*window, self.normal(part)),
            Node::Sometime(window, part) => Formula::sometime(*window, self.normal(part)),
            Node::Until(window, left, right) => {
                let left = self.normal(left);
                Formula::until(*window, left, self.normal(right))
            }
        }
    }

    fn flags(&mut self, formula: &Formula) -> Flags {
        let id = add(self.graph, formula);
        self.graph[self.graph.find(id)].data
    }

    fn has(&mut self, formula: &Formula, flags: Flags) -> bool {
        self.flags(formula).has(flags)
    }

    /// One rule at the top, if one applies.
    fn step(&mut self, formula: &Formula) -> Option<(&'static str, Formula)> {
        match formula.node() {
            Node::Atom(_) => None,
            Node::And(parts) => self.connective(parts, false),
            Node::Or(parts) => self.connective(parts, true),
            Node::Throughout(window, part) => self.window(*window, part, false),
            Node::Sometime(window, part) => self.window(*window, part, true),
            Node::Until(window, left, right) => self.until(*window, left, right),
        }
    }

    fn connective(
        &mut self,
        parts: &[Formula],
        disjunction: bool,
    ) -> Option<(&'static str, Formula)> {
        let make = |parts: Vec<Formula>| {
            if disjunction {
                Formula::or(parts)
            } else {
                Formula::and(parts)
            }
        };
        let mut sorted = parts.to_vec();
        sorted.sort_by(|a, b| place(a).cmp(&place(b)).then(a.cmp(b)));
        if sorted != parts {
            return Some(("order", make(sorted)));
        }
        for first in 0..parts.len() {
            for second in 0..parts.len() {
                if first == second {
                    continue;
                }
                let joined = self.pair(&parts[first], &parts[second], disjunction);
                if let Some((rule, with)) = joined {
                    let mut rest: Vec<Formula> = parts
                        .iter()
                        .enumerate()
                        .filter(|(at, _)| *at != first && *at != second)
                        .map(|(_, part)| part.clone())
                        .collect();
                    rest.push(with);
                    return Some((rule, make(rest)));
                }
            }
        }
        None
    }

    /// Two operands of `and` (or of `or`) as one.
    fn pair(
        &mut self,
        a: &Formula,
        b: &Formula,
        disjunction: bool,
    ) -> Option<(&'static str, Formula)> {
        let closed = if disjunction {
            Flags::JOIN
        } else {
            Flags::MEET
        };
        if a == b && self.has(a, closed) {
            return Some(("repeat", a.clone()));
        }
        let other = match b.node() {
            Node::Or(parts) if !disjunction => Some(parts),
            Node::And(parts) if disjunction => Some(parts),
            _ => None,
        };
        if let Some(parts) = other
            && parts.contains(a)
        {
            if self.has(a, Flags::SINGLETON) {
                return Some(("absorb", a.clone()));
            }
            // f and (f or g) = f or (f and g): the `or` of the two is kept.
            if !disjunction && self.has(a, Flags::CHAIN) {
                let at = parts.iter().position(|part| part == a)?;
                let mut rest = parts.clone();
                rest.remove(at);
                let inner = Formula::and(vec![a.clone(), Formula::or(rest)]);
                return Some(("swap", Formula::or(vec![a.clone(), inner])));
            }
        }
        if let Some(kept) = levels(a, b, disjunction) {
            return Some(("levels", kept));
        }
        spread(a, b, disjunction).map(|formula| ("spread", formula))
    }

    fn window(
        &mut self,
        window: Window,
        part: &Formula,
        existential: bool,
    ) -> Option<(&'static str, Formula)> {
        let make = |window: Window, part: Formula| {
            if existential {
                Formula::sometime(window, part)
            } else {
                Formula::throughout(window, part)
            }
        };
        let reads = if existential {
            Flags::ROOT_STRONG
        } else {
            Flags::ROOT_WEAK
        };
        if is_now(window) && self.has(part, reads) {
            return Some(("now", part.clone()));
        }
        if let Some((inner, below)) = same_kind(part, existential)
            && let Some((rule, merged)) = nested(window, inner)
        {
            return Some((rule, make(merged, below.clone())));
        }
        if window.upper() != Bound::End {
            return None;
        }
        if existential
            && let Node::Until(inner, _, right) = part.node()
            && starts_now(*inner)
        {
            return Some(("until-comes", make(window, right.clone())));
        }
        if let Some(stripped) = strip(part, existential) {
            return Some(("strip", make(window, stripped)));
        }
        if window == Window::whole() {
            return self
                .inner(part, existential)
                .map(|part| ("inner", make(window, part)));
        }
        None
    }

    /// f or G[0,b] f, under G[0,end], where f is a chain.
    fn inner(&mut self, part: &Formula, existential: bool) -> Option<Formula> {
        let parts = match part.node() {
            Node::Or(parts) if !existential => parts,
            Node::And(parts) if existential => parts,
            _ => return None,
        };
        // Beside other operands the weaker of the two would still matter.
        if parts.len() > 2 {
            return None;
        }
        let below = parts.iter().find_map(|part| {
            let (window, below) = same_kind(part, existential)?;
            (starts_now(window) && parts.contains(below)).then(|| below.clone())
        })?;
        self.has(&below, Flags::CHAIN).then_some(below)
    }

    fn until(
        &mut self,
        window: Window,
        left: &Formula,
        right: &Formula,
    ) -> Option<(&'static str, Formula)> {
        if is_now(window) && self.has(right, Flags::ROOT_STRONG) {
            return Some(("until-now", right.clone()));
        }
        let Node::Or(parts) = left.node() else {
            return None;
        };
        let at = parts.iter().position(|part| part == right)?;
        let fits = starts_now(window) && self.has(right, Flags::SINGLETON.or(Flags::SAME));
        if !fits {
            return None;
        }
        let mut rest = parts.clone();
        rest.remove(at);
        Some((
            "until-or",
            Formula::until(window, Formula::or(rest), right.clone()),
        ))
    }
}

fn starts_now(window: Window) -> bool {
    matches!(window.lower(), Bound::After(low) if low.is_zero())
}

fn is_now(window: Window) -> bool {
    starts_now(window) && matches!(window.upper(), Bound::After(high) if high.is_zero())
}

/// The window and operand of a formula of the same kind.
fn same_kind(formula: &Formula, existential: bool) -> Option<(Window, &Formula)> {
    match formula.node() {
        Node::Throughout(window, part) if !existential => Some((*window, part)),
        Node::Sometime(window, part) if existential => Some((*window, part)),
        _ => None,
    }
}

/// A window in a window of the same kind.
fn nested(outer: Window, inner: Window) -> Option<(&'static str, Window)> {
    let (a, b, c, d) = (outer.lower(), outer.upper(), inner.lower(), inner.upper());
    let merged = |lower, upper| Window::new(lower, upper).ok();
    match (a, b, c, d) {
        // Shifts of shifts, and a look ahead that every instant gets anyway.
        (Bound::Slot, Bound::End, Bound::Slot, Bound::End) => {
            Some(("nest-slots", merged(a, Bound::End)?))
        }
        // Two looks ahead of any length are one look ahead of any length.
        (Bound::After(a), Bound::Slot, Bound::After(c), Bound::Slot)
            if a.is_zero() && c.is_zero() =>
        {
            Some(("nest-slots", merged(Bound::After(a), Bound::Slot)?))
        }
        (_, Bound::End, Bound::After(low), Bound::Slot) if low.is_zero() => {
            Some(("nest-slots", merged(a, Bound::End)?))
        }
        (Bound::Slot, Bound::End, Bound::After(low), Bound::After(_) | Bound::End)
            if low.is_zero() =>
        {
            Some(("nest-slots", merged(a, Bound::End)?))
        }
        (Bound::After(low), Bound::End, Bound::Slot, Bound::End) if low.is_zero() => {
            Some(("nest-slots", merged(c, Bound::End)?))
        }
        (Bound::After(a), Bound::End, Bound::After(c), Bound::After(_) | Bound::End) => {
            Some(("nest", merged(Bound::After(sum(a, c)?), Bound::End)?))
        }
        (Bound::After(a), Bound::After(b), Bound::After(c), Bound::After(d)) => {
            let (lower, upper) = (sum(a, c)?, sum(b, d)?);
            // Whole steps add up only where the bounds are whole steps: real
            // bounds are taken inward one by one.
            let whole = [a, b, c, d]
                .iter()
                .all(|x| x.unit == TimeUnit::Step || x.is_zero());
            let merged = merged(Bound::After(lower), Bound::After(upper))?;
            whole.then_some(("nest", merged))
        }
        _ => None,
    }
}

/// The sum of two durations in one unit.
fn sum(a: Duration, b: Duration) -> Option<Duration> {
    if a.is_zero() {
        return Some(b);
    }
    if b.is_zero() {
        return Some(a);
    }
    // Only whole steps add up exactly; see `nested`.
    if a.unit != TimeUnit::Step || b.unit != TimeUnit::Step {
        return None;
    }
    Some(Duration {
        value: Finite::new(a.value.value() + b.value.value()).ok()?,
        unit: TimeUnit::Step,
    })
}

/// G f and G g over one window without slots.
fn spread(a: &Formula, b: &Formula, disjunction: bool) -> Option<Formula> {
    let (window, f) = same_kind(a, disjunction)?;
    let (other, g) = same_kind(b, disjunction)?;
    let has_slot = [window.lower(), window.upper()].contains(&Bound::Slot);
    if window != other || has_slot {
        return None;
    }
    let parts = vec![f.clone(), g.clone()];
    Some(if disjunction {
        Formula::sometime(window, Formula::or(parts))
    } else {
        Formula::throughout(window, Formula::and(parts))
    })
}

/// Looks ahead of the same kind are dropped from the operands under a window
/// with `end`.
fn strip(part: &Formula, existential: bool) -> Option<Formula> {
    let parts = match part.node() {
        Node::And(parts) if !existential => parts,
        Node::Or(parts) if existential => parts,
        _ => return None,
    };
    let at = parts.iter().position(|part| {
        same_kind(part, existential).is_some_and(|(window, _)| starts_now(window))
    })?;
    let mut rest = parts.clone();
    let (_, below) = same_kind(&parts[at], existential)?;
    rest[at] = below.clone();
    Some(if existential {
        Formula::or(rest)
    } else {
        Formula::and(rest)
    })
}

/// x <= 1 and x <= 2, with numbers: the one that decides.
fn levels(a: &Formula, b: &Formula, disjunction: bool) -> Option<Formula> {
    let level = |formula: &Formula| match formula.node() {
        Node::Atom(Atom::Compare {
            signal,
            comparison,
            threshold: Threshold::Number(value, unit),
        }) => Some((signal.clone(), *comparison, *value, unit.clone())),
        _ => None,
    };
    let (x, relation, first, unit) = level(a)?;
    let (y, other, second, other_unit) = level(b)?;
    if x != y || relation != other || unit != other_unit || first == second {
        return None;
    }
    let upper = matches!(relation, Comparison::AtMost | Comparison::Below);
    // Of two upper limits the smaller decides an `and`, the larger an `or`.
    let smaller = upper != disjunction;
    Some(if (first < second) == smaller {
        a.clone()
    } else {
        b.clone()
    })
}
