//! The table of functions that derive one signal from others.
//!
//! One row a function: its name in text, what it takes, what it gives. What
//! it *computes* is in `traces::derive`, one arm a function; what it is called
//! in a sentence is in [`super::sentence`]. Adding a function is a row here,
//! an arm there and a phrase there.

/// Whether a signal is a number at each instant, or true or false.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Kind {
    /// A channel: a number at each instant.
    Numeric,
    /// A flag: true or false at each instant.
    Flag,
}

/// A function of the language.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Function {
    /// `rate(x)`: change from the last sample, for each unit of time.
    Rate,
    /// `abs(x)`: magnitude.
    Absolute,
    /// `x - y`: difference of two channels (written with a minus sign).
    Difference,
    /// `smooth(x, w)`: mean of the samples in the window of length w that
    /// ends now.
    Smooth,
    /// `since_start(x)`: difference to the trace's level at its start.
    SinceStart,
    /// `to_final(x)`: difference to the trace's level at its end.
    ToFinal,
    /// `spread(x, w)`: largest minus smallest value over the last w.
    Spread,
    /// `rises(e)`: the flag is on now and was off one sample before.
    Rises,
    /// `falls(e)`: the flag is off now and was on one sample before.
    Falls,
}

/// One row of the table: how a function looks and what it takes and gives.
#[derive(Debug, Clone, Copy)]
pub struct FunctionShape {
    /// The function.
    pub function: Function,
    /// Its name in text; `-` for the difference, which is written between.
    pub name: &'static str,
    /// The kinds of its signal arguments.
    pub arguments: &'static [Kind],
    /// Whether a duration follows the signals.
    pub takes_duration: bool,
    /// The kind of its result.
    pub result: Kind,
    /// Whether a monitor can compute it from the past alone.
    pub live: bool,
    /// Whether it is known wherever its arguments are.
    pub total: bool,
    /// The definition in one line, for help and error messages.
    pub definition: &'static str,
}

/// The table, in the order in which help lists it.
pub const FUNCTIONS: &[FunctionShape] = &[
    row(
        Function::Rate,
        "rate",
        &[Kind::Numeric],
        false,
        Kind::Numeric,
        true,
        "(x(t) - x(t-1)) / step; unknown at the first sample",
    ),
    row(
        Function::Absolute,
        "abs",
        &[Kind::Numeric],
        false,
        Kind::Numeric,
        true,
        "magnitude of x(t)",
    )
    .known_throughout(),
    row(
        Function::Difference,
        "-",
        &[Kind::Numeric, Kind::Numeric],
        false,
        Kind::Numeric,
        true,
        "x(t) - y(t)",
    )
    .known_throughout(),
    row(
        Function::Smooth,
        "smooth",
        &[Kind::Numeric],
        true,
        Kind::Numeric,
        true,
        "mean of the last w of x; unknown until the window is full",
    ),
    row(
        Function::SinceStart,
        "since_start",
        &[Kind::Numeric],
        false,
        Kind::Numeric,
        true,
        "x(t) minus the median of the trace's first samples",
    )
    .known_throughout(),
    row(
        Function::ToFinal,
        "to_final",
        &[Kind::Numeric],
        false,
        Kind::Numeric,
        false,
        "x(t) minus the median of the trace's last samples",
    )
    .known_throughout(),
    row(
        Function::Spread,
        "spread",
        &[Kind::Numeric],
        true,
        Kind::Numeric,
        true,
        "largest minus smallest of x over [t-w, t]; unknown until the window is full",
    ),
    row(
        Function::Rises,
        "rises",
        &[Kind::Flag],
        false,
        Kind::Flag,
        true,
        "e(t) and not e(t-1); unknown at the first sample",
    ),
    row(
        Function::Falls,
        "falls",
        &[Kind::Flag],
        false,
        Kind::Flag,
        true,
        "not e(t) and e(t-1); unknown at the first sample",
    ),
];

const fn row(
    function: Function,
    name: &'static str,
    arguments: &'static [Kind],
    takes_duration: bool,
    result: Kind,
    live: bool,
    definition: &'static str,
) -> FunctionShape {
    FunctionShape {
        function,
        name,
        arguments,
        takes_duration,
        result,
        live,
        total: false,
        definition,
    }
}

impl FunctionShape {
    /// Says that it is known wherever its arguments are.
    const fn known_throughout(mut self) -> Self {
        self.total = true;
        self
    }
}

impl Function {
    /// The function's row in the table.
    ///
    /// # Panics
    /// Never: a test holds that every function has a row.
    pub fn shape(self) -> &'static FunctionShape {
        FUNCTIONS
            .iter()
            .find(|shape| shape.function == self)
            .expect("every function has a row")
    }

    /// The function of a name, if there is one.
    pub fn from_name(name: &str) -> Option<Function> {
        FUNCTIONS
            .iter()
            .find(|shape| shape.name == name)
            .map(|shape| shape.function)
    }
}
