//! From names to numbers: a formula meets a trace set.

use crate::kernels::{Limit, Reading, Resolved, Shape, Span, Step};
use crate::support::SlotId;
use crate::template::{Atom, Bound, Duration, Formula, Node, Signal, Threshold, Window};
use crate::traces::{DeriveError, TraceSet};

/// Why a formula cannot be evaluated on a trace set.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ResolveError {
    /// A signal cannot be had.
    #[error(transparent)]
    Signal(#[from] DeriveError),
    /// A threshold carries a unit that is not the channel's.
    #[error(
        "the threshold {threshold} {given} is compared with `{signal}`, whose unit is {unit}; \
         give the number in {unit}"
    )]
    Unit {
        /// The number.
        threshold: f64,
        /// The unit it carries.
        given: String,
        /// The signal.
        signal: String,
        /// The signal's unit, or "not known".
        unit: String,
    },
    /// A duration in a unit of time meets data without time.
    #[error(
        "the duration {0} has a unit of time, and the data has none; write it in steps, such as \
         `10 step`"
    )]
    NoTime(Duration),
    /// No step of the grid lies inside a window.
    #[error("no sample lies in the window [{0}, {1}]: it is shorter than a step of the grid")]
    EmptyWindow(Duration, Duration),
}

/// The resolved form of a formula on a trace set. Signals that it derives are
/// computed and kept in the set.
///
/// # Errors
/// When a signal, unit or duration does not fit the data.
pub fn resolve(formula: &Formula, traces: &mut TraceSet) -> Result<Resolved, ResolveError> {
    for signal in formula.signals() {
        traces.derive(&signal)?;
    }
    resolve_derived(formula, traces)
}

/// As [`resolve`], on a trace set that has all signals already.
///
/// # Errors
/// When a signal, unit or duration does not fit the data.
pub fn resolve_derived(formula: &Formula, traces: &TraceSet) -> Result<Resolved, ResolveError> {
    let mut resolver = Resolver {
        traces,
        next_slot: 0,
    };
    Ok(*resolver.formula(formula, Place::Outermost)?)
}

/// Where a formula stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Place {
    /// Under no temporal operator.
    Outermost,
    /// Under one, in this reading.
    Under(Reading),
}

impl Place {
    /// The reading of a formula that stands here. Outermost atoms are weak; an
    /// outermost temporal operator is judged at the first sample only, so its
    /// own reading is never asked for.
    fn reading(self) -> Reading {
        match self {
            Place::Outermost => Reading::Weak,
            Place::Under(reading) => reading,
        }
    }

    /// Where the operand of an operator that stands here stands: an outermost
    /// operator and one with `end` set the reading by their kind.
    fn below(self, window: &Window, kind: Reading) -> Place {
        match self {
            Place::Under(reading) if window.upper() != Bound::End => Place::Under(reading),
            _ => Place::Under(kind),
        }
    }
}

struct Resolver<'a> {
    traces: &'a TraceSet,
    next_slot: u32,
}

impl Resolver<'_> {
    fn slot(&mut self) -> SlotId {
        let slot = SlotId(self.next_slot);
        self.next_slot += 1;
        slot
    }

    fn formula(&mut self, formula: &Formula, place: Place) -> Result<Box<Resolved>, ResolveError> {
        let shape = match formula.node() {
            Node::Atom(atom) => self.atom(atom)?,
            Node::And(operands) => Shape::And(
                operands
                    .iter()
                    .map(|operand| self.formula(operand, place))
                    .collect::<Result<_, _>>()?,
            ),
            Node::Or(operands) => Shape::Or(
                operands
                    .iter()
                    .map(|operand| self.formula(operand, place))
                    .collect::<Result<_, _>>()?,
            ),
            Node::Throughout(window, operand) => {
                let span = self.span(window)?;
                let below = place.below(window, Reading::Weak);
                Shape::Throughout(span, self.formula(operand, below)?)
            }
            Node::Sometime(window, operand) => {
                let span = self.span(window)?;
                let below = place.below(window, Reading::Strong);
                Shape::Sometime(span, self.formula(operand, below)?)
            }
            Node::Until(window, left, right) => {
                let left = self.formula(left, place.below(window, Reading::Weak))?;
                let span = self.span(window)?;
                let right = self.formula(right, place.below(window, Reading::Strong))?;
                Shape::Until(span, left, right)
            }
        };
        Ok(Box::new(Resolved {
            reading: place.reading(),
            shape,
        }))
    }

    fn atom(&mut self, atom: &Atom) -> Result<Shape<Box<Resolved>>, ResolveError> {
        let signal = atom.signal();
        let id = self
            .traces
            .signal_id(signal)
            .ok_or_else(|| self.traces.unknown(signal))?;
        Ok(match atom {
            Atom::Flag { negated, .. } => Shape::Flag {
                signal: id,
                negated: *negated,
            },
            Atom::Compare {
                comparison,
                threshold,
                ..
            } => {
                let limit = match threshold {
                    Threshold::Slot => Limit::Slot(self.slot()),
                    Threshold::Number(value, unit) => {
                        self.check_unit(value.value(), unit.as_deref(), signal)?;
                        Limit::Number(value.value())
                    }
                };
                Shape::Compare {
                    signal: id,
                    comparison: *comparison,
                    limit,
                }
            }
        })
    }

    fn check_unit(
        &self,
        threshold: f64,
        given: Option<&str>,
        signal: &Signal,
    ) -> Result<(), ResolveError> {
        let Some(given) = given else { return Ok(()) };
        let unit = self
            .traces
            .signal_id(signal)
            .and_then(|id| self.traces.channel(id).unit.clone());
        if unit.as_deref() == Some(given) {
            return Ok(());
        }
        Err(ResolveError::Unit {
            threshold,
            given: given.to_owned(),
            signal: signal.to_string(),
            unit: unit.map_or("not known".to_owned(), |unit| unit.to_string()),
        })
    }

    /// A window in whole steps: real bounds are taken inward, with a tolerance
    /// that forgives the noise of binary fractions.
    fn span(&mut self, window: &Window) -> Result<Span, ResolveError> {
        let lower = match window.lower() {
            Bound::After(duration) => {
                Step::At(self.steps(duration, |steps| (steps - 1e-6).ceil())?)
            }
            Bound::Slot => Step::Slot(self.slot()),
            Bound::End => Step::End,
        };
        let upper = match window.upper() {
            Bound::After(duration) => {
                Step::At(self.steps(duration, |steps| (steps + 1e-6).floor())?)
            }
            Bound::Slot => Step::Slot(self.slot()),
            Bound::End => Step::End,
        };
        if let (Step::At(low), Step::At(high)) = (lower, upper)
            && let (Bound::After(from), Bound::After(to)) = (window.lower(), window.upper())
            && low > high
        {
            return Err(ResolveError::EmptyWindow(from, to));
        }
        Ok(Span { lower, upper })
    }

    fn steps(&self, duration: Duration, whole: impl Fn(f64) -> f64) -> Result<u32, ResolveError> {
        let steps = self.traces.grid().steps(duration);
        let steps = steps.ok_or(ResolveError::NoTime(duration))?;
        Ok(whole(steps).clamp(0.0, f64::from(u32::MAX - 1)) as u32)
    }
}
