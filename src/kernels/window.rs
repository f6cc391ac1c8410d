//! Sliding extremes over windows that look ahead.
//!
//! Beyond the end of the record every value is one constant. A bounded window
//! is built by doubling: the extreme over 2w values is that of two neighbouring
//! runs of w, and since extremes do not mind overlap, the last step reaches any
//! width. That is log2(width) plain passes over the trace, each a loop over two
//! slices, which is faster than a queue for all widths that occur.

/// For each instant the largest value over `[t + a, t + b]`.
pub fn sliding_max(values: &[u32], window: (usize, usize), beyond: u32) -> Vec<u32> {
    sliding(values, window, beyond, u32::max)
}

/// For each instant the smallest value over `[t + a, t + b]`.
pub fn sliding_min(values: &[u32], window: (usize, usize), beyond: u32) -> Vec<u32> {
    sliding(values, window, beyond, u32::min)
}

/// The extreme over the window of one instant.
pub(super) fn fold_at(
    values: &[u32],
    at: usize,
    (lower, upper): (usize, usize),
    beyond: u32,
    pick: impl Fn(u32, u32) -> u32,
) -> u32 {
    let length = values.len();
    let first = at.saturating_add(lower).min(length);
    let last = at.saturating_add(upper);
    let inside = &values[first..last.saturating_add(1).min(length).max(first)];
    let reaches_beyond = last >= length;
    let start = reaches_beyond.then_some(beyond);
    let folded = inside.iter().copied().reduce(&pick);
    match (folded, start) {
        (Some(a), Some(b)) => pick(a, b),
        (Some(one), None) | (None, Some(one)) => one,
        (None, None) => beyond,
    }
}

fn sliding(
    values: &[u32],
    (lower, upper): (usize, usize),
    beyond: u32,
    pick: impl Fn(u32, u32) -> u32,
) -> Vec<u32> {
    let length = values.len();
    let mut current = values.to_vec();
    if upper >= length {
        let mut so_far = beyond;
        for value in current.iter_mut().rev() {
            so_far = pick(*value, so_far);
            *value = so_far;
        }
    } else {
        let count = upper - lower + 1;
        let mut width = 1;
        while width < count {
            let step = width.min(count - width);
            widen(&mut current, step, beyond, &pick);
            width += step;
        }
    }
    shift(&mut current, lower, beyond);
    current
}

/// Joins each value with the one `step` later.
fn widen(current: &mut [u32], step: usize, beyond: u32, pick: &impl Fn(u32, u32) -> u32) {
    let length = current.len();
    let inside = length.saturating_sub(step);
    for at in 0..inside {
        current[at] = pick(current[at], current[at + step]);
    }
    for value in &mut current[inside..] {
        *value = pick(*value, beyond);
    }
}

/// Moves all values so many instants earlier.
fn shift(current: &mut [u32], by: usize, beyond: u32) {
    let length = current.len();
    let by = by.min(length);
    current.copy_within(by.., 0);
    current[length - by..].fill(beyond);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::support::Stream;

    #[test]
    fn sliding_extremes_equal_the_definition() {
        for case in 0..2000 {
            let mut stream = Stream::new(1, "window", case);
            let values: Vec<u32> = (0..1 + stream.below(40))
                .map(|_| stream.below(9) as u32)
                .collect();
            let lower = stream.below(12);
            let upper = match stream.below(4) {
                0 => usize::MAX,
                _ => lower + stream.below(45),
            };
            let beyond = [0, u32::MAX][stream.below(2)];
            let direct = |at: usize, pick: fn(u32, u32) -> u32| {
                let last = at.saturating_add(upper).min(values.len().max(at + lower));
                (at + lower..=last)
                    .map(|t| values.get(t).copied().unwrap_or(beyond))
                    .reduce(pick)
            };
            let expected = |pick| {
                (0..values.len())
                    .filter_map(|at| direct(at, pick))
                    .collect::<Vec<_>>()
            };
            assert_eq!(
                sliding_max(&values, (lower, upper), beyond),
                expected(u32::max)
            );
            assert_eq!(
                sliding_min(&values, (lower, upper), beyond),
                expected(u32::min)
            );
        }
    }
}
