//! `until` with demands on both sides.
//!
//! Over a window of m instants from t, let P be the largest demand of the left
//! side and U the smallest demand for the right side to come with the left side
//! kept until then. Two windows join: P' = max(P(t), P(t+d)) and
//! U' = min(U(t), max(P(t), U(t+d))) for any d up to m; where they overlap, the
//! overestimate is dominated by U(t). So a window of any width takes log2 of it
//! passes, and an unbounded one a single scan from the end.

/// For each instant the demand of `left until [lower, upper] right`.
pub(super) fn until(
    before: &[u32],
    then: &[u32],
    (lower, upper): (usize, usize),
    [left_beyond, right_beyond]: [u32; 2],
) -> Vec<u32> {
    let length = then.len();
    let mut answer = then.to_vec();
    let mut kept = before.to_vec();
    if upper.saturating_sub(lower) >= length {
        let mut after = right_beyond;
        for at in (0..length).rev() {
            after = answer[at].min(kept[at].max(after));
            answer[at] = after;
        }
    } else {
        let count = upper - lower + 1;
        let mut width = 1;
        while width < count {
            let step = width.min(count - width);
            for at in 0..length {
                let (later_kept, later) = match kept.get(at + step) {
                    Some(kept) => (*kept, answer[at + step]),
                    None => (left_beyond, right_beyond),
                };
                answer[at] = answer[at].min(kept[at].max(later));
                kept[at] = kept[at].max(later_kept);
            }
            width += step;
        }
    }
    if lower == 0 {
        return answer;
    }
    // The left side must hold until the window opens, too.
    let opening = super::window::sliding_max(before, (0, lower - 1), left_beyond);
    (0..length)
        .map(|at| {
            let later = answer
                .get(at.saturating_add(lower))
                .copied()
                .unwrap_or(right_beyond);
            opening[at].max(later)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::support::Stream;

    /// Straight from the definition.
    fn naive(
        before: &[u32],
        then: &[u32],
        (lower, upper): (usize, usize),
        beyond: [u32; 2],
    ) -> Vec<u32> {
        let at_or = |values: &[u32], at: usize, beyond| values.get(at).copied().unwrap_or(beyond);
        (0..then.len())
            .map(|t| {
                let last = t.saturating_add(upper).min(then.len().max(t + lower));
                (t + lower..=last)
                    .map(|s| {
                        let kept = (t..s)
                            .map(|u| at_or(before, u, beyond[0]))
                            .max()
                            .unwrap_or(0);
                        kept.max(at_or(then, s, beyond[1]))
                    })
                    .min()
                    .unwrap_or(u32::MAX)
            })
            .collect()
    }

    #[test]
    fn until_equals_the_definition() {
        for case in 0..3000 {
            let mut stream = Stream::new(2, "until", case);
            let length = 1 + stream.below(30);
            let mut values = || {
                (0..length)
                    .map(|_| stream.below(9) as u32)
                    .collect::<Vec<_>>()
            };
            let (before, then) = (values(), values());
            let lower = stream.below(6);
            let upper = match stream.below(4) {
                0 => usize::MAX,
                _ => lower + stream.below(35),
            };
            for beyond in [[0, u32::MAX], [0, 0], [u32::MAX, u32::MAX]] {
                assert_eq!(
                    until(&before, &then, (lower, upper), beyond),
                    naive(&before, &then, (lower, upper), beyond),
                    "{before:?} {then:?} {lower} {upper} {beyond:?}"
                );
            }
        }
    }
}
