//! What the data offers to a grammar.

use std::sync::Arc;

use crate::template::{Duration, Signal};

/// The channels, flags and durations that a grammar can use.
#[derive(Debug, Clone, PartialEq)]
pub struct Palette {
    /// Numeric channels with their units.
    pub channels: Vec<(Signal, Option<Arc<str>>)>,
    /// Flags.
    pub flags: Vec<Signal>,
    /// `short`: 1 % of the median trace, at least 3 steps.
    pub short: Duration,
    /// `long`: 10 % of the median trace.
    pub long: Duration,
    /// `hold`: how long something must last to count as lasting.
    pub hold: Duration,
}

impl Palette {
    /// A palette of so many channels without units (`x1`, `x2`, ...) and flags
    /// (`e1`, ...), for counting.
    pub fn of(channels: usize, flags: usize) -> Self {
        Palette {
            channels: (1..=channels)
                .map(|n| (Signal::channel(&format!("x{n}")), None))
                .collect(),
            flags: (1..=flags)
                .map(|n| Signal::flag(&format!("e{n}")))
                .collect(),
            short: Duration::steps(3),
            long: Duration::steps(30),
            hold: Duration::steps(3),
        }
    }
}
