//! The numbers that kernels compute with: ranks of samples and demands, as
//! 16-bit codes where a signal has few enough different values, else 32-bit
//! ones. Both are lossless; values are looked up only at the end.

/// An unsigned integer that holds demands and ranks.
pub trait Code: Copy + Ord + Send + Sync + std::fmt::Debug + 'static {
    /// The demand that every value meets.
    const ZERO: Self;
    /// The demand that no value meets; as a rank: not known.
    const NEVER: Self;

    /// From a number; the largest one stands for [`Code::NEVER`].
    fn from_u32(number: u32) -> Self;

    /// As a number; [`Code::NEVER`] becomes `u32::MAX`.
    fn to_u32(self) -> u32;

    /// As it is, widened.
    fn raw(self) -> u32;

    /// One more, which must not reach [`Code::NEVER`].
    #[must_use]
    fn plus_one(self) -> Self;

    /// The difference to a smaller one.
    #[must_use]
    fn minus(self, smaller: Self) -> Self;
}

impl Code for u16 {
    const ZERO: Self = 0;
    const NEVER: Self = u16::MAX;

    #[inline(always)]
    #[expect(
        clippy::cast_possible_truncation,
        reason = "numbers fit, by the choice of code"
    )]
    fn from_u32(number: u32) -> Self {
        number as u16
    }

    #[inline(always)]
    fn to_u32(self) -> u32 {
        if self == u16::MAX {
            u32::MAX
        } else {
            u32::from(self)
        }
    }

    #[inline(always)]
    fn raw(self) -> u32 {
        u32::from(self)
    }

    #[inline(always)]
    fn plus_one(self) -> Self {
        self.wrapping_add(1)
    }

    #[inline(always)]
    fn minus(self, smaller: Self) -> Self {
        self.wrapping_sub(smaller)
    }
}

impl Code for u32 {
    const ZERO: Self = 0;
    const NEVER: Self = u32::MAX;

    #[inline(always)]
    fn from_u32(number: u32) -> Self {
        number
    }

    #[inline(always)]
    fn to_u32(self) -> u32 {
        self
    }

    #[inline(always)]
    fn raw(self) -> u32 {
        self
    }

    #[inline(always)]
    fn plus_one(self) -> Self {
        self.wrapping_add(1)
    }

    #[inline(always)]
    fn minus(self, smaller: Self) -> Self {
        self.wrapping_sub(smaller)
    }
}

/// The demand of something that holds or does not.
#[inline(always)]
pub(super) fn boolean<T: Code>(holds: bool) -> T {
    if holds { T::ZERO } else { T::NEVER }
}
