//! Windows of temporal operators: two bounds that never make an empty window.

use super::duration::Duration;
use super::slot::SlotValue;
use crate::support::Finite;

/// One end of a window of time.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Bound {
    /// A duration from now.
    After(Duration),
    /// A slot.
    Slot,
    /// `end`: no upper bound.
    End,
}

/// The window of a temporal operator. Never empty by construction: a slot as
/// lower bound goes with `end` only, and a constant lower bound is not above a
/// constant upper one (checked where both are in one unit; across units when
/// the template meets the data).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Window {
    lower: Bound,
    upper: Bound,
}

/// Why two bounds make no window.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum WindowError {
    /// The lower bound is `end`.
    #[error("a window cannot start at `end`")]
    StartsAtEnd,
    /// A slot as lower bound with an upper bound other than `end`.
    #[error("a slot as lower bound goes with `end` only, so that no window is empty")]
    SlotBelowBound,
    /// The lower bound lies above the upper one.
    #[error("the window is empty: its lower bound lies above its upper bound")]
    Empty,
    /// A bound is negative.
    #[error("a bound cannot be negative: a template looks forward in time")]
    Negative,
}

impl Window {
    /// A window from two bounds.
    ///
    /// # Errors
    /// When the bounds make no window, or could make an empty one.
    pub fn new(lower: Bound, upper: Bound) -> Result<Self, WindowError> {
        let zero = Finite::from(0);
        for bound in [lower, upper] {
            if matches!(bound, Bound::After(duration) if duration.value < zero) {
                return Err(WindowError::Negative);
            }
        }
        match (lower, upper) {
            (Bound::End, _) => return Err(WindowError::StartsAtEnd),
            (Bound::Slot, Bound::After(_) | Bound::Slot) => {
                return Err(WindowError::SlotBelowBound);
            }
            (Bound::After(low), Bound::After(high)) if is_above(low, high) => {
                return Err(WindowError::Empty);
            }
            _ => {}
        }
        Ok(Window { lower, upper })
    }

    /// `[0, end]`.
    pub fn whole() -> Self {
        Window {
            lower: Bound::After(Duration::zero()),
            upper: Bound::End,
        }
    }

    /// The lower bound.
    pub fn lower(&self) -> Bound {
        self.lower
    }

    /// The upper bound.
    pub fn upper(&self) -> Bound {
        self.upper
    }
}

impl Window {
    pub(super) fn filled(self, values: &mut std::slice::Iter<'_, Option<SlotValue>>) -> Window {
        let mut fill = |bound: Bound| match bound {
            Bound::Slot => match values.next() {
                Some(Some(SlotValue::Time(duration))) => Bound::After(*duration),
                Some(None) => Bound::Slot,
                other => panic!("a time slot is given {other:?}"),
            },
            _ => bound,
        };
        let lower = fill(self.lower);
        Window {
            lower,
            upper: fill(self.upper),
        }
    }
}

/// Whether one constant bound is certainly above another.
fn is_above(low: Duration, high: Duration) -> bool {
    if low.unit == high.unit {
        return low.value > high.value;
    }
    match (low.unit.seconds(), high.unit.seconds()) {
        (Some(a), Some(b)) => low.value.value() * a > high.value.value() * b * (1.0 + 1e-9),
        _ => high.is_zero() && !low.is_zero(),
    }
}
