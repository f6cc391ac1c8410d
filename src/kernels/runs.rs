//! Time heights: the demands of operators whose bound is the slot that is
//! solved. Their operands hold or do not, so everything is a matter of the next
//! or the last instant where they do.
//!
//! A time that is easier the larger it is demands so many steps plus one (0 is
//! kept for "every value will do"); one that is easier the smaller it is is
//! counted from the hard end, the length of the record.

use super::code::Code;
use super::plan::Run;

/// The demand of a time height at every instant. `then` is the right side of an
/// `until`; `weak` says how its side that ends the wait is read.
pub(super) fn run<T: Code>(
    run: Run,
    demands: &[T],
    then: &[T],
    lower: usize,
    weak: bool,
) -> Vec<T> {
    match run {
        Run::First => first_time(demands, lower, weak),
        Run::Longest => longest_run(demands, lower, weak),
        Run::LastTime => last_time(demands),
        Run::LastViolation => last_violation(demands),
        Run::FirstAnswer => first_answer(demands, then, lower, weak),
        Run::LastAnswer => last_answer(demands, then),
    }
}

/// The same at the first instant only.
pub(super) fn start<T: Code>(run: Run, demands: &[T], then: &[T], lower: usize, weak: bool) -> T {
    let length = demands.len();
    let holds = |demand: &T| *demand == T::ZERO;
    let next = |row: &[T], from: usize, wanted: bool| {
        let rest = row.get(from..).unwrap_or(&[]);
        let found = rest.iter().position(|demand| holds(demand) == wanted);
        found.map_or(length, |found| from + found)
    };
    match run {
        Run::First => found(next(demands, lower, true), 0, lower, length, weak),
        Run::Longest => kept(next(demands, lower, false), 0, lower, length, weak),
        Run::LastTime => match demands.iter().rposition(holds) {
            Some(last) => from_end(length, last),
            None => T::NEVER,
        },
        Run::LastViolation => {
            let last = demands.iter().rposition(|demand| !holds(demand));
            steps(last.map_or(0, |last| last + 1))
        }
        Run::FirstAnswer => {
            let broken = next(demands, 0, false);
            answered(next(then, lower, true), broken, 0, lower, length, weak)
        }
        Run::LastAnswer => {
            let reach = next(demands, 0, false).min(length - 1);
            match then[..=reach].iter().rposition(holds) {
                Some(last) => from_end(length, last),
                None => T::NEVER,
            }
        }
    }
}

/// The demand at `at` when the next instant that satisfies, from `lower` on, is
/// `next` (the length where there is none).
fn found<T: Code>(next: usize, at: usize, lower: usize, length: usize, weak: bool) -> T {
    match (next < length, weak) {
        (true, _) => steps(next - at),
        (false, true) => steps((at + lower).max(length) - at),
        (false, false) => T::NEVER,
    }
}

/// The demand at `at` when it holds until just before `violated`.
fn kept<T: Code>(violated: usize, at: usize, lower: usize, length: usize, weak: bool) -> T {
    if violated >= length && weak {
        return T::ZERO;
    }
    if violated <= at + lower {
        T::NEVER
    } else {
        from_end(length, violated - 1 - at)
    }
}

/// The demand at `at` when the right side comes at `next` and the left side is
/// broken at `broken`.
fn answered<T: Code>(
    next: usize,
    broken: usize,
    at: usize,
    lower: usize,
    length: usize,
    weak: bool,
) -> T {
    let next = match (next < length, weak) {
        (true, _) => next,
        (false, true) => (at + lower).max(length),
        (false, false) => return T::NEVER,
    };
    if broken < next.min(length) {
        T::NEVER
    } else {
        steps(next - at)
    }
}

/// `sometime [lower, ?]`: steps to the first instant that satisfies.
fn first_time<T: Code>(demands: &[T], lower: usize, weak: bool) -> Vec<T> {
    let next = next_where(demands, |demand| demand == T::ZERO);
    let length = demands.len();
    each(length, |at| {
        found(at_or_end(&next, at + lower), at, lower, length, weak)
    })
}

/// `throughout [?, end]`: steps to just after the last violation.
fn last_violation<T: Code>(demands: &[T]) -> Vec<T> {
    let last = demands.iter().rposition(|demand| *demand != T::ZERO);
    each(demands.len(), |at| {
        steps(last.map_or(0, |last| (last + 1).saturating_sub(at)))
    })
}

/// `throughout [lower, ?]`: the longest time that it keeps holding, which is
/// easier the shorter it is.
fn longest_run<T: Code>(demands: &[T], lower: usize, weak: bool) -> Vec<T> {
    let next = next_where(demands, |demand| demand != T::ZERO);
    let length = demands.len();
    each(length, |at| {
        kept(at_or_end(&next, at + lower), at, lower, length, weak)
    })
}

/// `sometime [?, end]`: how late it still comes.
fn last_time<T: Code>(demands: &[T]) -> Vec<T> {
    let last = demands.iter().rposition(|demand| *demand == T::ZERO);
    each(demands.len(), |at| match last {
        Some(last) if last >= at => from_end(demands.len(), last - at),
        _ => T::NEVER,
    })
}

/// `until [lower, ?]`: steps to the first instant of the right side that the
/// left side reaches.
fn first_answer<T: Code>(before: &[T], then: &[T], lower: usize, weak: bool) -> Vec<T> {
    let length = then.len();
    let broken = next_where(before, |demand| demand != T::ZERO);
    let next = next_where(then, |demand| demand == T::ZERO);
    each(length, |at| {
        let (next, broken) = (at_or_end(&next, at + lower), at_or_end(&broken, at));
        answered(next, broken, at, lower, length, weak)
    })
}

/// `until [?, end]`: the last instant of the right side that the left side
/// reaches.
fn last_answer<T: Code>(before: &[T], then: &[T]) -> Vec<T> {
    let length = then.len();
    let broken = next_where(before, |demand| demand != T::ZERO);
    // The last instant up to each one where the right side holds.
    let mut latest: Vec<Option<usize>> = Vec::with_capacity(length);
    for (at, demand) in then.iter().enumerate() {
        let before = latest.last().copied().flatten();
        latest.push(if *demand == T::ZERO { Some(at) } else { before });
    }
    each(length, |at| {
        let reach = at_or_end(&broken, at).min(length - 1);
        match latest[reach] {
            Some(last) if last >= at => from_end(length, last - at),
            _ => T::NEVER,
        }
    })
}

fn each<T>(length: usize, demand: impl Fn(usize) -> T) -> Vec<T> {
    (0..length).map(demand).collect()
}

/// The demand of "at least so many steps".
fn steps<T: Code>(steps: usize) -> T {
    T::from_u32(u32::try_from(steps).map_or(u32::MAX, |steps| steps.saturating_add(1)))
}

/// The demand of "at most so many steps".
fn from_end<T: Code>(length: usize, steps: usize) -> T {
    T::from_u32((length - steps.min(length - 1)) as u32)
}

/// For each instant the next one (itself included) whose demand passes; the
/// length where there is none.
fn next_where<T: Code>(demands: &[T], pass: impl Fn(T) -> bool) -> Vec<usize> {
    let mut next = vec![demands.len(); demands.len()];
    let mut found = demands.len();
    for at in (0..demands.len()).rev() {
        if pass(demands[at]) {
            found = at;
        }
        next[at] = found;
    }
    next
}

fn at_or_end(next: &[usize], at: usize) -> usize {
    next.get(at).copied().unwrap_or(next.len())
}
