//! The passes over one trace that everything is made of. Each is one plain loop
//! over slices of equal length, so that the compiler turns it into vector code
//! for whatever the machine has; `dispatch` compiles each once a level.
//!
//! A pass gets all it needs as arguments of its own: loops inside closures lose
//! what the compiler knows about slices that do not overlap.

use super::code::{Code, boolean};

/// The larger (or smaller) of two.
#[inline(always)]
pub(super) fn pick<T: Code, const MAX: bool>(a: T, b: T) -> T {
    if MAX { a.max(b) } else { a.min(b) }
}

/// What leaves a fold as it is.
#[inline(always)]
pub(super) fn neutral<T: Code, const MAX: bool>() -> T {
    if MAX { T::ZERO } else { T::NEVER }
}

/// Joins each value with the one `step` later; `beyond` stands after the end.
#[inline(always)]
pub(super) fn widen<T: Code, const MAX: bool>(out: &mut [T], a: &[T], step: usize, beyond: T) {
    let inside = a.len().saturating_sub(step);
    let (near, tail) = a.split_at(inside);
    let (out_near, out_tail) = out[..a.len()].split_at_mut(inside);
    for ((out, x), y) in out_near.iter_mut().zip(near).zip(&a[a.len() - inside..]) {
        *out = pick::<T, MAX>(*x, *y);
    }
    for (out, x) in out_tail.iter_mut().zip(tail) {
        *out = pick::<T, MAX>(*x, beyond);
    }
}

/// As [`widen`], and folds what comes out.
#[inline(always)]
pub(super) fn widen_fold<T: Code, const MAX: bool, const FOLD: bool>(
    out: &mut [T],
    a: &[T],
    step: usize,
    beyond: T,
) -> T {
    let inside = a.len().saturating_sub(step);
    let (near, tail) = a.split_at(inside);
    let (out_near, out_tail) = out[..a.len()].split_at_mut(inside);
    let mut folded = neutral::<T, FOLD>();
    for ((out, x), y) in out_near.iter_mut().zip(near).zip(&a[a.len() - inside..]) {
        let value = pick::<T, MAX>(*x, *y);
        *out = value;
        folded = pick::<T, FOLD>(folded, value);
    }
    for (out, x) in out_tail.iter_mut().zip(tail) {
        let value = pick::<T, MAX>(*x, beyond);
        *out = value;
        folded = pick::<T, FOLD>(folded, value);
    }
    folded
}

/// As [`widen_fold`], joining each value with a mask before it is folded: the
/// smaller of the two for a fold to the largest, and the other way round.
#[inline(always)]
pub(super) fn widen_mask_fold<T: Code, const MAX: bool, const FOLD: bool>(
    out: &mut [T],
    a: &[T],
    step: usize,
    beyond: T,
    mask: &[T],
) -> T {
    let inside = a.len().saturating_sub(step);
    let (near, tail) = a.split_at(inside);
    let (mask_near, mask_tail) = mask[..a.len()].split_at(inside);
    let (out_near, out_tail) = out[..a.len()].split_at_mut(inside);
    let mut folded = neutral::<T, FOLD>();
    let later = &a[a.len() - inside..];
    for (((out, x), y), mask) in out_near.iter_mut().zip(near).zip(later).zip(mask_near) {
        let value = pick::<T, MAX>(*x, *y);
        *out = value;
        folded = pick::<T, FOLD>(folded, masked::<T, FOLD>(value, *mask));
    }
    for ((out, x), mask) in out_tail.iter_mut().zip(tail).zip(mask_tail) {
        let value = pick::<T, MAX>(*x, beyond);
        *out = value;
        folded = pick::<T, FOLD>(folded, masked::<T, FOLD>(value, *mask));
    }
    folded
}

/// A value under a mask, on its way into a fold.
#[inline(always)]
fn masked<T: Code, const FOLD: bool>(value: T, mask: T) -> T {
    if FOLD {
        value.min(mask)
    } else {
        value.max(mask)
    }
}

/// The largest (or smallest) value.
#[inline(always)]
pub(super) fn fold<T: Code, const FOLD: bool>(a: &[T]) -> T {
    let mut folded = neutral::<T, FOLD>();
    for x in a {
        folded = pick::<T, FOLD>(folded, *x);
    }
    folded
}

/// As [`fold`], under a mask as in [`widen_mask_fold`].
#[inline(always)]
pub(super) fn mask_fold<T: Code, const FOLD: bool>(a: &[T], mask: &[T]) -> T {
    let mut folded = neutral::<T, FOLD>();
    for (x, mask) in a.iter().zip(mask) {
        folded = pick::<T, FOLD>(folded, masked::<T, FOLD>(*x, *mask));
    }
    folded
}

/// The larger (or smaller) of two, instant by instant.
#[inline(always)]
pub(super) fn join<T: Code, const MAX: bool>(out: &mut [T], a: &[T], b: &[T]) {
    for ((out, x), y) in out.iter_mut().zip(a).zip(b) {
        *out = pick::<T, MAX>(*x, *y);
    }
}

/// One step of `until` over a window twice as wide: with P the demand to keep
/// the left side and U that for the right side to come, P' = max(P, P later)
/// and U' = min(U, max(P, U later)). Overlap does no harm: what it overstates
/// is dominated.
#[inline(always)]
pub(super) fn until_step<T: Code>(
    out: (&mut [T], &mut [T]),
    from: (&[T], &[T]),
    step: usize,
    beyond: (T, T),
) {
    let ((kept_out, answer_out), (kept, answer)) = (out, from);
    let length = kept.len();
    let inside = length.saturating_sub(step);
    let later = length - inside;
    let near = kept_out[..inside].iter_mut().zip(&mut answer_out[..inside]);
    let now = kept[..inside].iter().zip(&answer[..inside]);
    let then = kept[later..].iter().zip(&answer[later..]);
    for (((kept_out, answer_out), (p, u)), (p_later, u_later)) in near.zip(now).zip(then) {
        *answer_out = (*u).min((*p).max(*u_later));
        *kept_out = (*p).max(*p_later);
    }
    for at in inside..length {
        answer_out[at] = answer[at].min(kept[at].max(beyond.1));
        kept_out[at] = kept[at].max(beyond.0);
    }
}

/// Demands of an atom whose threshold is the height: the rank counted from the
/// easy end, plus one.
#[inline(always)]
pub(super) fn level<S: Code, T: Code, const EASIER: bool>(
    out: &mut [T],
    ranks: &[S],
    count: u32,
    unknown: T,
) {
    let count = T::from_u32(count);
    for (out, rank) in out.iter_mut().zip(ranks) {
        let own = T::from_u32(rank.raw());
        let demand = if EASIER {
            own.plus_one()
        } else {
            count.minus(own)
        };
        *out = if *rank == S::NEVER { unknown } else { demand };
    }
}

/// Whether each sample's rank is below (or, with `ABOVE`, at or above) a cut.
#[inline(always)]
pub(super) fn cut<S: Code, T: Code, const ABOVE: bool>(
    out: &mut [T],
    ranks: &[S],
    cut: S,
    unknown: T,
) {
    for (out, rank) in out.iter_mut().zip(ranks) {
        let demand = boolean((*rank >= cut) == ABOVE);
        *out = if *rank == S::NEVER { unknown } else { demand };
    }
}

/// Counts, for each sample, one more where its rank is at or above (or, with
/// `ABOVE`, below) a cut: after all cuts of an axis, how many of its points
/// fail.
#[inline(always)]
pub(super) fn count_failing<S: Code, T: Code, const ABOVE: bool>(
    out: &mut [T],
    ranks: &[S],
    cut: S,
) {
    for (out, rank) in out.iter_mut().zip(ranks) {
        let fails = (*rank >= cut) != ABOVE;
        *out = if fails { out.plus_one() } else { *out };
    }
}

/// Closes counts: where all points fail none will do, and what is not known
/// reads as it must.
#[inline(always)]
pub(super) fn close_counts<S: Code, T: Code>(out: &mut [T], ranks: &[S], points: u32, unknown: T) {
    let points = T::from_u32(points);
    for (out, rank) in out.iter_mut().zip(ranks) {
        let demand = if *out >= points { T::NEVER } else { *out };
        *out = if *rank == S::NEVER { unknown } else { demand };
    }
}

/// Whether each demand is met at a level.
#[inline(always)]
pub(super) fn met<T: Code>(out: &mut [T], a: &[T], level: T) {
    for (out, x) in out.iter_mut().zip(a) {
        *out = boolean(*x <= level);
    }
}
