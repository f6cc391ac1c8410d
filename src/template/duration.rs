//! Durations as written: a number and a unit of time.
//!
//! A duration keeps the unit it was written with, because printing it must
//! give the same text; it becomes a number of steps only when a template
//! meets the grid of a trace set.

use std::fmt;

use crate::support::Finite;

/// The unit a duration is written in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum TimeUnit {
    /// `us`, a millionth of a second.
    Microsecond,
    /// `ms`, a thousandth of a second.
    Millisecond,
    /// `s`.
    Second,
    /// `min`, 60 s.
    Minute,
    /// `h`, 3,600 s.
    Hour,
    /// `d`, 86,400 s.
    Day,
    /// No unit: the unit of the data's own `time` column, or samples where
    /// the data has no time.
    Data,
    /// `step`: samples of the uniform grid.
    Step,
}

impl TimeUnit {
    /// All units that have a name, with the name used in text.
    pub const NAMED: [(TimeUnit, &'static str); 7] = [
        (TimeUnit::Microsecond, "us"),
        (TimeUnit::Millisecond, "ms"),
        (TimeUnit::Second, "s"),
        (TimeUnit::Minute, "min"),
        (TimeUnit::Hour, "h"),
        (TimeUnit::Day, "d"),
        (TimeUnit::Step, "step"),
    ];

    /// The unit of a name, `None` when it is no unit of time.
    pub fn from_name(name: &str) -> Option<TimeUnit> {
        Self::NAMED
            .iter()
            .find(|(_, text)| *text == name || (*text == "step" && name == "steps"))
            .map(|(unit, _)| *unit)
    }

    /// The name in text; empty for [`TimeUnit::Data`].
    pub fn name(self) -> &'static str {
        Self::NAMED
            .iter()
            .find(|(unit, _)| *unit == self)
            .map_or("", |(_, text)| text)
    }

    /// How many seconds one such unit is; `None` for the data's own unit and
    /// for steps, which only a trace set can tell.
    pub fn seconds(self) -> Option<f64> {
        match self {
            TimeUnit::Microsecond => Some(1e-6),
            TimeUnit::Millisecond => Some(1e-3),
            TimeUnit::Second => Some(1.0),
            TimeUnit::Minute => Some(60.0),
            TimeUnit::Hour => Some(3600.0),
            TimeUnit::Day => Some(86_400.0),
            TimeUnit::Data | TimeUnit::Step => None,
        }
    }
}

/// A duration as written, not negative.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Duration {
    /// How many of the unit.
    pub value: Finite,
    /// The unit.
    pub unit: TimeUnit,
}

impl Duration {
    /// A duration of so many steps of the grid.
    pub fn steps(count: u32) -> Self {
        Duration {
            value: Finite::from(count),
            unit: TimeUnit::Step,
        }
    }

    /// No duration at all; written without a unit.
    pub fn zero() -> Self {
        Duration {
            value: Finite::from(0),
            unit: TimeUnit::Data,
        }
    }

    /// Whether it is zero, in whatever unit.
    pub fn is_zero(&self) -> bool {
        self.value == Finite::from(0)
    }
}

impl fmt::Display for Duration {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.unit {
            TimeUnit::Data => write!(f, "{}", self.value),
            unit => write!(f, "{} {}", self.value, unit.name()),
        }
    }
}
