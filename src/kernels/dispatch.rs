//! One version of every pass for each kind of machine, chosen once at run time.
//!
//! The versions are the same code compiled for other instruction sets, and all
//! arithmetic is on integers, so results are the same bit for bit. This is the
//! only module with `unsafe`: a function compiled for an instruction set may be
//! called only where the machine has it, which [`Level::detect`] makes sure of.
#![allow(
    unsafe_code,
    reason = "calls of functions compiled for instruction sets that were detected"
)]

use std::sync::OnceLock;

use super::code::Code;
use super::passes;

/// A kind of machine.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Level {
    /// What every machine of the target has.
    Portable,
    /// x86-64 with AVX2.
    Avx2,
    /// x86-64 with AVX-512 (F, BW, VL).
    Avx512,
}

static FORCED: OnceLock<Level> = OnceLock::new();

impl Level {
    /// All levels, lowest first.
    pub const ALL: [Level; 3] = [Level::Portable, Level::Avx2, Level::Avx512];

    /// Its name.
    pub fn name(self) -> &'static str {
        match self {
            Level::Portable => "portable",
            Level::Avx2 => "avx2",
            Level::Avx512 => "avx512",
        }
    }

    /// Whether this machine has it.
    pub fn is_here(self) -> bool {
        match self {
            Level::Portable => true,
            #[cfg(target_arch = "x86_64")]
            Level::Avx2 => {
                is_x86_feature_detected!("avx2")
                    && is_x86_feature_detected!("bmi1")
                    && is_x86_feature_detected!("bmi2")
            }
            #[cfg(target_arch = "x86_64")]
            Level::Avx512 => {
                Level::Avx2.is_here()
                    && is_x86_feature_detected!("avx512f")
                    && is_x86_feature_detected!("avx512bw")
                    && is_x86_feature_detected!("avx512vl")
            }
            #[cfg(not(target_arch = "x86_64"))]
            _ => false,
        }
    }

    /// The highest level that this machine has, or the one that was forced.
    pub fn detect() -> Level {
        *FORCED.get_or_init(|| {
            let mut here = Level::ALL.into_iter().filter(|level| level.is_here());
            here.next_back().unwrap_or(Level::Portable)
        })
    }

    /// Uses this level from now on; says whether that is possible: the machine
    /// must have it, and nothing may have been computed yet.
    pub fn force(self) -> bool {
        self.is_here() && FORCED.set(self).is_ok()
    }
}

/// The passes of one level, by whether they take the larger or the smaller.
/// `[usize::from(max)]` picks a version; for passes that fold, the second index
/// is that of the fold.
#[expect(
    clippy::type_complexity,
    reason = "each type is that of one pass and stands here once"
)]
#[derive(Debug, Clone, Copy)]
pub(super) struct Kernels<T: Code> {
    pub(super) widen: [fn(&mut [T], &[T], usize, T); 2],
    pub(super) widen_fold: [[fn(&mut [T], &[T], usize, T) -> T; 2]; 2],
    pub(super) widen_mask_fold: [[MaskFold<T>; 2]; 2],
    pub(super) fold: [fn(&[T]) -> T; 2],
    pub(super) mask_fold: [fn(&[T], &[T]) -> T; 2],
    pub(super) join: [fn(&mut [T], &[T], &[T]); 2],
    pub(super) until_step: UntilStep<T>,
    pub(super) level_narrow: [fn(&mut [T], &[u16], u32, T); 2],
    pub(super) level_wide: [fn(&mut [T], &[u32], u32, T); 2],
    pub(super) cut_narrow: [fn(&mut [T], &[u16], u16, T); 2],
    pub(super) cut_wide: [fn(&mut [T], &[u32], u32, T); 2],
    pub(super) count_narrow: [fn(&mut [T], &[u16], u16); 2],
    pub(super) count_wide: [fn(&mut [T], &[u32], u32); 2],
    pub(super) close_narrow: fn(&mut [T], &[u16], u32, T),
    pub(super) close_wide: fn(&mut [T], &[u32], u32, T),
    pub(super) met: fn(&mut [T], &[T], T),
}

type MaskFold<T> = fn(&mut [T], &[T], usize, T, &[T]) -> T;
type UntilStep<T> = fn((&mut [T], &mut [T]), (&[T], &[T]), usize, (T, T));

impl<T: Code> Kernels<T> {
    /// The passes of a level. A level that this machine lacks gives the portable
    /// ones.
    pub(super) fn of(level: Level) -> Kernels<T> {
        match level {
            #[cfg(target_arch = "x86_64")]
            Level::Avx512 if level.is_here() => avx512::table(),
            #[cfg(target_arch = "x86_64")]
            Level::Avx2 if level.is_here() => avx2::table(),
            _ => portable::table(),
        }
    }
}

/// Compiles every pass once, with or without an instruction set.
macro_rules! level {
    ($level:ident $(, $feature:literal)?) => {
        mod $level {
            use super::*;

            level!(@pass [$($feature)?] widen<T: Code>[MAX]
                (out: &mut [T], a: &[T], step: usize, beyond: T) -> ());
            level!(@pass [$($feature)?] widen_fold<T: Code>[MAX, FOLD]
                (out: &mut [T], a: &[T], step: usize, beyond: T) -> T);
            level!(@pass [$($feature)?] widen_mask_fold<T: Code>[MAX, FOLD]
                (out: &mut [T], a: &[T], step: usize, beyond: T, mask: &[T]) -> T);
            level!(@pass [$($feature)?] fold<T: Code>[FOLD](a: &[T]) -> T);
            level!(@pass [$($feature)?] mask_fold<T: Code>[FOLD](a: &[T], mask: &[T]) -> T);
            level!(@pass [$($feature)?] join<T: Code>[MAX](out: &mut [T], a: &[T], b: &[T]) -> ());
            level!(@pass [$($feature)?] until_step<T: Code>[]
                (out: (&mut [T], &mut [T]), from: (&[T], &[T]), step: usize, beyond: (T, T)) -> ());
            level!(@pass [$($feature)?] level<S: Code, T: Code>[EASIER]
                (out: &mut [T], ranks: &[S], count: u32, unknown: T) -> ());
            level!(@pass [$($feature)?] cut<S: Code, T: Code>[ABOVE]
                (out: &mut [T], ranks: &[S], cut: S, unknown: T) -> ());
            level!(@pass [$($feature)?] count_failing<S: Code, T: Code>[ABOVE]
                (out: &mut [T], ranks: &[S], cut: S) -> ());
            level!(@pass [$($feature)?] close_counts<S: Code, T: Code>[]
                (out: &mut [T], ranks: &[S], points: u32, unknown: T) -> ());
            level!(@pass [$($feature)?] met<T: Code>[](out: &mut [T], a: &[T], level: T) -> ());

            pub(super) fn table<T: Code>() -> Kernels<T> {
                Kernels {
                    widen: [widen::<T, false>, widen::<T, true>],
                    widen_fold: [
                        [widen_fold::<T, false, false>, widen_fold::<T, false, true>],
                        [widen_fold::<T, true, false>, widen_fold::<T, true, true>],
                    ],
                    widen_mask_fold: [
                        [widen_mask_fold::<T, false, false>, widen_mask_fold::<T, false, true>],
                        [widen_mask_fold::<T, true, false>, widen_mask_fold::<T, true, true>],
                    ],
                    fold: [fold::<T, false>, fold::<T, true>],
                    mask_fold: [mask_fold::<T, false>, mask_fold::<T, true>],
                    join: [join::<T, false>, join::<T, true>],
                    until_step: until_step::<T>,
                    level_narrow: [level::<u16, T, false>, level::<u16, T, true>],
                    level_wide: [level::<u32, T, false>, level::<u32, T, true>],
                    cut_narrow: [cut::<u16, T, false>, cut::<u16, T, true>],
                    cut_wide: [cut::<u32, T, false>, cut::<u32, T, true>],
                    count_narrow: [count_failing::<u16, T, false>, count_failing::<u16, T, true>],
                    count_wide: [count_failing::<u32, T, false>, count_failing::<u32, T, true>],
                    close_narrow: close_counts::<u16, T>,
                    close_wide: close_counts::<u32, T>,
                    met: met::<T>,
                }
            }
        }
    };
    // Without an instruction set: the pass itself.
    (@pass [] $pass:ident<$($code:ident: Code),*>[$($flag:ident),*]
        ($($argument:ident: $kind:ty),*) -> $result:ty) => {
        fn $pass<$($code: Code,)* $(const $flag: bool),*>($($argument: $kind),*) -> $result {
            passes::$pass::<$($code,)* $($flag),*>($($argument),*)
        }
    };
    // With one: the pass compiled for it, behind a function of the usual kind.
    (@pass [$feature:literal] $pass:ident<$($code:ident: Code),*>[$($flag:ident),*]
        ($($argument:ident: $kind:ty),*) -> $result:ty) => {
        fn $pass<$($code: Code,)* $(const $flag: bool),*>($($argument: $kind),*) -> $result {
            #[target_feature(enable = $feature)]
            fn compiled<$($code: Code,)* $(const $flag: bool),*>(
                $($argument: $kind),*
            ) -> $result {
                passes::$pass::<$($code,)* $($flag),*>($($argument),*)
            }
            // SAFETY: `Kernels::of` hands this table out only where the
            // instruction set was detected.
            unsafe { compiled::<$($code,)* $($flag),*>($($argument),*) }
        }
    };
}

level!(portable);
#[cfg(target_arch = "x86_64")]
level!(avx2, "avx2,bmi1,bmi2");
#[cfg(target_arch = "x86_64")]
level!(avx512, "avx512f,avx512bw,avx512vl,avx2,bmi1,bmi2");

#[cfg(test)]
mod tests {
    use super::*;
    use crate::support::Stream;

    /// Lengths around the borders of vectors of 8 to 64 lanes.
    const LENGTHS: [usize; 17] = [
        1, 2, 7, 8, 9, 15, 16, 17, 31, 32, 33, 63, 64, 65, 127, 130, 257,
    ];

    fn random<T: Code>(stream: &mut Stream, length: usize) -> Vec<T> {
        let mut code = || match stream.below(12) {
            0 => T::NEVER,
            1 => T::ZERO,
            _ => T::from_u32(stream.below(60_000) as u32),
        };
        (0..length).map(|_| code()).collect()
    }

    /// Each pass at each level, against the definition written as a plain loop.
    fn passes_follow_their_definitions<T: Code>() {
        let pick = |max: bool, a: T, b: T| if max { a.max(b) } else { a.min(b) };
        let neutral = |max: bool| if max { T::ZERO } else { T::NEVER };
        for level in Level::ALL.into_iter().filter(|level| level.is_here()) {
            let kernels: Kernels<T> = Kernels::of(level);
            for (case, length) in LENGTHS.into_iter().enumerate() {
                let mut stream = Stream::new(5, "passes", case as u64);
                let (a, b): (Vec<T>, Vec<T>) =
                    (random(&mut stream, length), random(&mut stream, length));
                for step in [1, 2, length / 2 + 1, length, length + 3] {
                    for max in [false, true] {
                        let beyond = [T::ZERO, T::NEVER][stream.below(2)];
                        let later = |row: &[T], at: usize, beyond| {
                            row.get(at + step).copied().unwrap_or(beyond)
                        };
                        let wide: Vec<T> = (0..length)
                            .map(|at| pick(max, a[at], later(&a, at, beyond)))
                            .collect();
                        let own = usize::from(max);
                        let mut out = vec![T::ZERO; length];
                        (kernels.widen[own])(&mut out, &a, step, beyond);
                        assert_eq!(out, wide);
                        for fold in [false, true] {
                            let folded = |row: &mut dyn Iterator<Item = T>| {
                                row.fold(neutral(fold), |x, y| pick(fold, x, y))
                            };
                            let to = usize::from(fold);
                            let got = (kernels.widen_fold[own][to])(&mut out, &a, step, beyond);
                            assert_eq!(got, folded(&mut wide.iter().copied()));
                            let masked = |row: &[T]| -> Vec<T> {
                                let pairs = row.iter().zip(&b);
                                pairs.map(|(x, m)| pick(!fold, *x, *m)).collect()
                            };
                            let got =
                                (kernels.widen_mask_fold[own][to])(&mut out, &a, step, beyond, &b);
                            assert_eq!(got, folded(&mut masked(&wide).into_iter()));
                            assert_eq!((kernels.fold[to])(&a), folded(&mut a.iter().copied()));
                            let got = (kernels.mask_fold[to])(&a, &b);
                            assert_eq!(got, folded(&mut masked(&a).into_iter()));
                        }
                        (kernels.join[own])(&mut out, &a, &b);
                        let joined: Vec<T> =
                            a.iter().zip(&b).map(|(x, y)| pick(max, *x, *y)).collect();
                        assert_eq!(out, joined);
                    }
                    let beyond = (T::ZERO, T::NEVER);
                    let (mut kept, mut answer) = (vec![T::ZERO; length], vec![T::ZERO; length]);
                    (kernels.until_step)((&mut kept, &mut answer), (&a, &b), step, beyond);
                    for at in 0..length {
                        let at_or =
                            |row: &[T], beyond| row.get(at + step).copied().unwrap_or(beyond);
                        assert_eq!(kept[at], a[at].max(at_or(&a, beyond.0)));
                        assert_eq!(answer[at], b[at].min(a[at].max(at_or(&b, beyond.1))));
                    }
                }
            }
        }
    }

    #[test]
    fn passes_are_the_same_at_all_levels() {
        passes_follow_their_definitions::<u16>();
        passes_follow_their_definitions::<u32>();
    }

    /// Atoms from either code of ranks.
    #[test]
    fn atoms_follow_their_definitions() {
        for level in Level::ALL.into_iter().filter(|level| level.is_here()) {
            let kernels: Kernels<u16> = Kernels::of(level);
            for (case, length) in LENGTHS.into_iter().enumerate() {
                let mut stream = Stream::new(6, "atoms", case as u64);
                let ranks: Vec<u32> = (0..length)
                    .map(|_| match stream.below(9) {
                        0 => u32::MAX,
                        _ => stream.below(50) as u32,
                    })
                    .collect();
                let narrow: Vec<u16> = ranks.iter().map(|rank| *rank as u16).collect();
                let mut out = [vec![0_u16; length], vec![0_u16; length]];
                for above in [false, true] {
                    let at = usize::from(above);
                    let unknown = [0, u16::MAX][stream.below(2)];
                    let expected = |known: &dyn Fn(u32) -> u16| -> Vec<u16> {
                        let each = |rank: &u32| match rank {
                            &u32::MAX => unknown,
                            rank => known(*rank),
                        };
                        ranks.iter().map(each).collect()
                    };
                    (kernels.cut_narrow[at])(&mut out[0], &narrow, 20, unknown);
                    (kernels.cut_wide[at])(&mut out[1], &ranks, 20, unknown);
                    let cut = expected(&|rank| if (rank >= 20) == above { 0 } else { u16::MAX });
                    assert_eq!(out, [cut.clone(), cut]);
                    (kernels.level_narrow[at])(&mut out[0], &narrow, 50, unknown);
                    (kernels.level_wide[at])(&mut out[1], &ranks, 50, unknown);
                    let levels =
                        expected(&|rank| (if above { rank + 1 } else { 50 - rank }) as u16);
                    assert_eq!(out, [levels.clone(), levels]);
                    for out in &mut out {
                        out.fill(0);
                    }
                    for cut in [10, 20, 30] {
                        (kernels.count_narrow[at])(&mut out[0], &narrow, cut);
                        (kernels.count_wide[at])(&mut out[1], &ranks, u32::from(cut));
                    }
                    (kernels.close_narrow)(&mut out[0], &narrow, 3, unknown);
                    (kernels.close_wide)(&mut out[1], &ranks, 3, unknown);
                    let places = expected(&|rank| {
                        let fails = |cut: &&u32| (rank >= **cut) != above;
                        match [10, 20, 30].iter().filter(fails).count() {
                            3 => u16::MAX,
                            count => count as u16,
                        }
                    });
                    assert_eq!(out, [places.clone(), places]);
                }
                (kernels.met)(&mut out[0], &narrow, 7);
                let met = |rank: &u16| if *rank <= 7 { 0 } else { u16::MAX };
                assert_eq!(out[0], narrow.iter().map(met).collect::<Vec<_>>());
            }
        }
    }
}
