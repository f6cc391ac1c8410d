//! Time heights: the demands of operators whose bound is the slot that is
//! solved. Their operands hold or do not, so everything is a matter of the next
//! or the last instant where they do.
//!
//! A time that is easier the larger it is demands so many steps plus one (0 is
//! kept for "every value will do"); one that is easier the smaller it is is
//! counted from the hard end, the length of the record.

use super::boundary::NEVER;
use super::resolved::Reading;

/// `sometime [lower, ?]`: steps to the first instant that satisfies.
pub(super) fn first_time(demands: &[u32], lower: usize, reading: Reading) -> Vec<u32> {
    let length = demands.len();
    let next = next_where(demands, |demand| demand == 0);
    each(length, |at| {
        let found = at_or_end(&next, at + lower);
        match (found < length, reading) {
            (true, _) => steps(found - at),
            (false, Reading::Weak) => steps((at + lower).max(length) - at),
            (false, Reading::Strong) => NEVER,
        }
    })
}

/// `throughout [?, end]`: steps to just after the last violation.
pub(super) fn last_violation(demands: &[u32]) -> Vec<u32> {
    let last = demands.iter().rposition(|demand| *demand != 0);
    each(demands.len(), |at| {
        steps(last.map_or(0, |last| (last + 1).saturating_sub(at)))
    })
}

/// `throughout [lower, ?]`: the longest time that it keeps holding, which is
/// easier the shorter it is.
pub(super) fn longest_run(demands: &[u32], lower: usize, reading: Reading) -> Vec<u32> {
    let length = demands.len();
    let next = next_where(demands, |demand| demand != 0);
    each(length, |at| {
        let violated = at_or_end(&next, at + lower);
        let violated = match (violated < length, reading) {
            (true, _) => violated,
            (false, Reading::Weak) => return 0,
            (false, Reading::Strong) => length,
        };
        if violated <= at + lower {
            NEVER
        } else {
            from_end(length, violated - 1 - at)
        }
    })
}

/// `sometime [?, end]`: how late it still comes.
pub(super) fn last_time(demands: &[u32]) -> Vec<u32> {
    let last = demands.iter().rposition(|demand| *demand == 0);
    each(demands.len(), |at| match last {
        Some(last) if last >= at => from_end(demands.len(), last - at),
        _ => NEVER,
    })
}

/// `until [lower, ?]`: steps to the first instant of the right side that the
/// left side reaches.
pub(super) fn first_answer(
    before: &[u32],
    then: &[u32],
    lower: usize,
    reading: Reading,
) -> Vec<u32> {
    let length = then.len();
    let broken = next_where(before, |demand| demand != 0);
    let next = next_where(then, |demand| demand == 0);
    each(length, |at| {
        let mut found = at_or_end(&next, at + lower);
        if found >= length {
            if reading == Reading::Strong {
                return NEVER;
            }
            found = (at + lower).max(length);
        }
        if at_or_end(&broken, at) < found.min(length) {
            NEVER
        } else {
            steps(found - at)
        }
    })
}

/// `until [?, end]`: the last instant of the right side that the left side
/// reaches.
pub(super) fn last_answer(before: &[u32], then: &[u32]) -> Vec<u32> {
    let length = then.len();
    let broken = next_where(before, |demand| demand != 0);
    // The last instant up to each one where the right side holds.
    let mut latest: Vec<Option<usize>> = Vec::with_capacity(length);
    for (at, demand) in then.iter().enumerate() {
        let before = latest.last().copied().flatten();
        latest.push(if *demand == 0 { Some(at) } else { before });
    }
    each(length, |at| {
        let reach = at_or_end(&broken, at).min(length - 1);
        match latest[reach] {
            Some(last) if last >= at => from_end(length, last - at),
            _ => NEVER,
        }
    })
}

fn each(length: usize, demand: impl Fn(usize) -> u32) -> Vec<u32> {
    (0..length).map(demand).collect()
}

/// The demand of "at least so many steps".
fn steps(steps: usize) -> u32 {
    u32::try_from(steps).map_or(NEVER, |steps| steps.saturating_add(1))
}

/// The demand of "at most so many steps".
fn from_end(length: usize, steps: usize) -> u32 {
    (length - steps.min(length - 1)) as u32
}

/// For each instant the next one (itself included) whose demand passes; the
/// length where there is none.
fn next_where(demands: &[u32], pass: impl Fn(u32) -> bool) -> Vec<usize> {
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
