//! Signals: what an atom looks at. A recorded channel or flag, or one derived
//! from others by a function of the table.

use std::fmt;
use std::sync::Arc;

use super::duration::Duration;
use super::function::{Function, Kind};
use super::print::write_name;

/// A recorded or derived channel or flag, by name.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Signal {
    /// A channel or flag of the data.
    Recorded {
        /// Its name as the data has it, without unit.
        name: Arc<str>,
        /// What the place where it stands needs it to be.
        kind: Kind,
    },
    /// A signal computed once from others.
    Derived(Arc<Derivation>),
}

/// How a derived signal is made.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Derivation {
    /// The function.
    pub function: Function,
    /// The signals it takes.
    pub arguments: Vec<Signal>,
    /// The length of its window, for functions that have one.
    pub duration: Option<Duration>,
}

impl Signal {
    /// A recorded numeric channel.
    pub fn channel(name: &str) -> Self {
        Signal::Recorded {
            name: name.into(),
            kind: Kind::Numeric,
        }
    }

    /// A recorded flag.
    pub fn flag(name: &str) -> Self {
        Signal::Recorded {
            name: name.into(),
            kind: Kind::Flag,
        }
    }

    /// A signal derived by a function.
    ///
    /// # Panics
    /// When the arguments do not fit the function's row in the table: callers
    /// check what users write before they build it.
    pub fn derived(function: Function, arguments: Vec<Signal>, duration: Option<Duration>) -> Self {
        let shape = function.shape();
        let kinds: Vec<Kind> = arguments.iter().map(Signal::kind).collect();
        assert_eq!(kinds, shape.arguments, "arguments of {}", shape.name);
        assert_eq!(duration.is_some(), shape.takes_duration, "{}", shape.name);
        Signal::Derived(Arc::new(Derivation {
            function,
            arguments,
            duration,
        }))
    }

    /// Whether it is numeric or a flag.
    pub fn kind(&self) -> Kind {
        match self {
            Signal::Recorded { kind, .. } => *kind,
            Signal::Derived(derivation) => derivation.function.shape().result,
        }
    }

    /// Its share of a template's size: 1 for each channel, flag and function.
    pub fn size(&self) -> u32 {
        match self {
            Signal::Recorded { .. } => 1,
            Signal::Derived(derivation) => {
                1 + derivation.arguments.iter().map(Signal::size).sum::<u32>()
            }
        }
    }

    /// Whether a monitor can compute it from the past alone.
    pub fn is_live(&self) -> bool {
        match self {
            Signal::Recorded { .. } => true,
            Signal::Derived(derivation) => {
                derivation.function.shape().live && derivation.arguments.iter().all(Signal::is_live)
            }
        }
    }

    /// Calls `visit` with every recorded signal in it, from left to right.
    pub fn for_each_recorded(&self, visit: &mut impl FnMut(&Arc<str>, Kind)) {
        match self {
            Signal::Recorded { name, kind } => visit(name, *kind),
            Signal::Derived(derivation) => {
                for argument in &derivation.arguments {
                    argument.for_each_recorded(visit);
                }
            }
        }
    }
}

impl fmt::Display for Signal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let derivation = match self {
            Signal::Recorded { name, .. } => return write_name(f, name),
            Signal::Derived(derivation) => derivation,
        };
        if derivation.function == Function::Difference {
            let [left, right] = [&derivation.arguments[0], &derivation.arguments[1]];
            // The difference groups to the left, so only a difference on the
            // right needs parentheses.
            return if matches!(right, Signal::Derived(d) if d.function == Function::Difference) {
                write!(f, "{left} - ({right})")
            } else {
                write!(f, "{left} - {right}")
            };
        }
        write!(f, "{}(", derivation.function.shape().name)?;
        for (place, argument) in derivation.arguments.iter().enumerate() {
            let comma = if place == 0 { "" } else { ", " };
            write!(f, "{comma}{argument}")?;
        }
        if let Some(duration) = derivation.duration {
            write!(f, ", {duration}")?;
        }
        write!(f, ")")
    }
}
