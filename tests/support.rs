//! What several tests share: random formulas from a seed.

use strandline::support::{Finite, Stream};
use strandline::template::{
    Bound, Comparison, Duration, Formula, Function, Signal, Threshold, TimeUnit, Window,
};

/// What a random formula is made of.
pub(crate) struct Shapes {
    /// Names of numeric channels.
    pub(crate) channels: Vec<&'static str>,
    /// Names of flags.
    pub(crate) flags: Vec<&'static str>,
    /// Whether `until` may occur.
    pub(crate) until: bool,
    /// Whether derived signals may occur.
    pub(crate) derived: bool,
}

impl Shapes {
    /// Two channels, two flags, everything allowed.
    pub(crate) fn all() -> Self {
        Shapes {
            channels: vec!["x", "flow rate"],
            flags: vec!["e", "end"],
            until: true,
            derived: true,
        }
    }
}

/// A random formula of at most the given depth.
pub(crate) fn random_formula(stream: &mut Stream, shapes: &Shapes, depth: u32) -> Formula {
    if depth == 0 || stream.below(6) == 0 {
        return random_atom(stream, shapes);
    }
    let kinds = if shapes.until { 5 } else { 4 };
    let below = |stream: &mut Stream| random_formula(stream, shapes, depth - 1);
    match stream.below(kinds) {
        0 => Formula::and(vec![below(stream), below(stream)]),
        1 => Formula::or(vec![below(stream), below(stream)]),
        2 => {
            let operand = below(stream);
            Formula::throughout(random_window(stream), operand)
        }
        3 => {
            let operand = below(stream);
            Formula::sometime(random_window(stream), operand)
        }
        _ => {
            let (left, right) = (below(stream), below(stream));
            Formula::until(random_window(stream), left, right)
        }
    }
}

fn random_atom(stream: &mut Stream, shapes: &Shapes) -> Formula {
    if stream.below(2) == 0 {
        let flag = Signal::flag(shapes.flags[stream.below(shapes.flags.len())]);
        let flag = match stream.below(4) {
            0 if shapes.derived => Signal::derived(Function::Rises, vec![flag], None),
            1 if shapes.derived => Signal::derived(Function::Falls, vec![flag], None),
            _ => flag,
        };
        return Formula::flag(flag, stream.below(2) == 0);
    }
    let comparison = [
        Comparison::AtMost,
        Comparison::AtLeast,
        Comparison::Below,
        Comparison::Above,
    ][stream.below(4)];
    let threshold = if stream.below(2) == 0 {
        Threshold::Slot
    } else {
        let value = (stream.normal() * 1000.0).round() / 100.0;
        let unit = (stream.below(4) == 0).then(|| "mm/s".into());
        Threshold::Number(Finite::new(value).unwrap(), unit)
    };
    Formula::compare(random_numeric(stream, shapes, 2), comparison, threshold)
}

fn random_numeric(stream: &mut Stream, shapes: &Shapes, depth: u32) -> Signal {
    let plain = Signal::channel(shapes.channels[stream.below(shapes.channels.len())]);
    if !shapes.derived || depth == 0 {
        return plain;
    }
    let inner = |stream: &mut Stream| random_numeric(stream, shapes, depth - 1);
    match stream.below(6) {
        0 => Signal::derived(Function::Rate, vec![inner(stream)], None),
        1 => Signal::derived(Function::Absolute, vec![inner(stream)], None),
        2 => {
            let sides = vec![inner(stream), inner(stream)];
            Signal::derived(Function::Difference, sides, None)
        }
        3 => {
            let argument = vec![inner(stream)];
            let unit = [TimeUnit::Second, TimeUnit::Step, TimeUnit::Data][stream.below(3)];
            let value = Finite::new(1.0 + stream.below(9) as f64).unwrap();
            Signal::derived(Function::Spread, argument, Some(Duration { value, unit }))
        }
        _ => plain,
    }
}

fn random_window(stream: &mut Stream) -> Window {
    let after = |value: usize| {
        Bound::After(Duration {
            value: Finite::new(value as f64 / 2.0).unwrap(),
            unit: TimeUnit::Second,
        })
    };
    let low = stream.below(4);
    let (lower, upper) = match stream.below(5) {
        0 => (after(0), Bound::End),
        1 => (Bound::Slot, Bound::End),
        2 => (after(0), Bound::Slot),
        3 => (after(low), after(low + stream.below(5))),
        _ => (after(low), Bound::Slot),
    };
    Window::new(lower, upper).unwrap()
}
