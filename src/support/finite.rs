//! Finite numbers: an `f64` that is neither NaN nor infinite, and so has an
//! order, an equality and a hash.

use std::fmt;

use ordered_float::OrderedFloat;

/// A finite number.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Finite(OrderedFloat<f64>);

/// The value given was NaN or infinite.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("a finite number is needed here")]
pub struct NotFinite;

impl Finite {
    /// Checks a number. Minus zero becomes zero, so that equal numbers are
    /// written alike.
    ///
    /// # Errors
    /// When the number is NaN or infinite.
    pub fn new(value: f64) -> Result<Self, NotFinite> {
        if value.is_finite() {
            Ok(Finite(OrderedFloat(value + 0.0)))
        } else {
            Err(NotFinite)
        }
    }

    /// The number.
    pub fn value(self) -> f64 {
        self.0.0
    }
}

impl From<u32> for Finite {
    fn from(value: u32) -> Self {
        Finite(OrderedFloat(f64::from(value)))
    }
}

impl fmt::Display for Finite {
    /// The shortest decimal text that reads back as the same number.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.0.0)
    }
}
