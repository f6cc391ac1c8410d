//! Derived signals: what each function of the table computes.
//!
//! A sample that cannot be known (a window not yet full, the sample before the
//! first) is NaN, and NaN in makes NaN out.

use std::sync::Arc;

use super::set::{Channel, TraceSet};
use crate::support::{SignalId, TraceId};
use crate::template::{Derivation, Duration, Function, Kind, Signal};

/// Why a signal cannot be had from a trace set.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum DeriveError {
    /// The data has no such channel or flag.
    #[error("the data has no {kind} `{name}`; it has {known}")]
    Unknown {
        /// `channel` or `flag`.
        kind: &'static str,
        /// The name asked for.
        name: String,
        /// What there is.
        known: String,
    },
    /// A flag where a channel is needed, or the other way round.
    #[error("`{name}` is a {is} in this data, and a {needed} is needed there")]
    Kind {
        /// The name.
        name: String,
        /// What it is.
        is: &'static str,
        /// What is needed.
        needed: &'static str,
    },
    /// The difference of channels with different units.
    #[error("`{signal}` takes the difference of {left} and {right}: the units differ")]
    Units {
        /// The difference.
        signal: String,
        /// The unit of the left side.
        left: String,
        /// The unit of the right side.
        right: String,
    },
    /// A window in a unit of time meets data without time.
    #[error(
        "the window {0} has a unit of time, and the data has none; write it in steps, such as \
         `10 step`"
    )]
    NoTime(Duration),
}

impl TraceSet {
    /// The id of a signal, computing it (and what it is made from) when it is
    /// not there yet.
    ///
    /// # Errors
    /// When a name is unknown or of another kind, or units do not fit.
    pub fn derive(&mut self, signal: &Signal) -> Result<SignalId, DeriveError> {
        if let Some(id) = self.signal_id(signal) {
            return Ok(id);
        }
        let Signal::Derived(derivation) = signal else {
            return Err(self.unknown(signal));
        };
        let inputs = derivation
            .arguments
            .iter()
            .map(|argument| self.derive(argument))
            .collect::<Result<Vec<_>, _>>()?;
        let unit = self.derived_unit(signal, derivation, &inputs)?;
        let window = match derivation.duration {
            None => 0,
            Some(duration) => {
                let steps = self.grid().steps(duration);
                steps.ok_or(DeriveError::NoTime(duration))?.round().max(1.0) as usize
            }
        };
        let mut samples = Vec::new();
        for trace in self.traces() {
            samples.extend(self.derived_samples(derivation.function, &inputs, window, trace));
        }
        Ok(self.add_channel(Channel {
            signal: signal.clone(),
            unit,
            samples,
        }))
    }

    /// The error for a signal that is not there, with what is there.
    pub fn unknown(&self, signal: &Signal) -> DeriveError {
        let wanted = signal.kind();
        let name = match signal {
            Signal::Recorded { name, .. } => name.to_string(),
            Signal::Derived(_) => signal.to_string(),
        };
        let mut known: Vec<String> = Vec::new();
        for channel in self.recorded() {
            let Signal::Recorded { name: other, kind } = &channel.signal else {
                continue;
            };
            if **other == *name {
                return DeriveError::Kind {
                    name,
                    is: kind_name(*kind),
                    needed: kind_name(wanted),
                };
            }
            if *kind == wanted {
                known.push(format!("`{}`", channel.signal));
            }
        }
        let known = if known.is_empty() {
            "none".to_owned()
        } else {
            known.join(", ")
        };
        DeriveError::Unknown {
            kind: kind_name(wanted),
            name,
            known,
        }
    }

    fn derived_unit(
        &self,
        signal: &Signal,
        derivation: &Derivation,
        inputs: &[SignalId],
    ) -> Result<Option<Arc<str>>, DeriveError> {
        let unit = self.channel(inputs[0]).unit.clone();
        match derivation.function {
            Function::Rate => {
                let time = self.grid().unit.name();
                let time = if time.is_empty() {
                    "unit of time"
                } else {
                    time
                };
                Ok(unit.map(|unit| format!("{unit}/{time}").into()))
            }
            Function::Difference => match (unit, self.channel(inputs[1]).unit.clone()) {
                (Some(left), Some(right)) if left != right => Err(DeriveError::Units {
                    signal: signal.to_string(),
                    left: left.to_string(),
                    right: right.to_string(),
                }),
                (left, right) => Ok(left.or(right)),
            },
            Function::Rises | Function::Falls => Ok(None),
            _ => Ok(unit),
        }
    }

    fn derived_samples(
        &self,
        function: Function,
        inputs: &[SignalId],
        window: usize,
        trace: TraceId,
    ) -> Vec<f64> {
        let x = self.samples(inputs[0], trace);
        match function {
            Function::Rate => differences(x, self.grid().step),
            Function::Absolute => x.iter().map(|sample| sample.abs()).collect(),
            Function::Difference => {
                let y = self.samples(inputs[1], trace);
                x.iter().zip(y).map(|(x, y)| x - y).collect()
            }
            Function::Smooth => moving_mean(x, window),
            Function::SinceStart => minus(x, level(&x[..level_length(x)])),
            Function::ToFinal => minus(x, level(&x[x.len() - level_length(x)..])),
            Function::Spread => moving_range(x, window),
            Function::Rises => edges(x, 1.0),
            Function::Falls => edges(x, 0.0),
        }
    }
}

fn kind_name(kind: Kind) -> &'static str {
    match kind {
        Kind::Numeric => "channel",
        Kind::Flag => "flag",
    }
}

fn differences(x: &[f64], step: f64) -> Vec<f64> {
    let rates = x.windows(2).map(|pair| (pair[1] - pair[0]) / step);
    std::iter::once(f64::NAN).chain(rates).collect()
}

/// On where the flag has just become `to`.
fn edges(flag: &[f64], to: f64) -> Vec<f64> {
    let edge = |pair: &[f64]| {
        if pair[0].is_nan() || pair[1].is_nan() {
            return f64::NAN;
        }
        let (before, now) = (pair[0] > 0.5, pair[1] > 0.5);
        f64::from(u8::from(before != now && now == (to > 0.5)))
    };
    let edges = flag.windows(2).map(edge);
    std::iter::once(f64::NAN).chain(edges).collect()
}

/// How many samples make the level at the start or end of a trace: 1 %, at
/// least one.
fn level_length(x: &[f64]) -> usize {
    ((x.len() as f64 * 0.01).round() as usize).clamp(1, x.len())
}

/// The median of the known samples; of an even number the mean of the two in
/// the middle.
fn level(x: &[f64]) -> f64 {
    let mut known: Vec<f64> = x
        .iter()
        .copied()
        .filter(|sample| !sample.is_nan())
        .collect();
    if known.is_empty() {
        return f64::NAN;
    }
    known.sort_unstable_by(f64::total_cmp);
    let middle = known.len() / 2;
    if known.len() % 2 == 1 {
        known[middle]
    } else {
        f64::midpoint(known[middle - 1], known[middle])
    }
}

fn minus(x: &[f64], level: f64) -> Vec<f64> {
    x.iter().map(|sample| sample - level).collect()
}

/// The mean of the last `window` samples, each summed afresh so that no error
/// gathers and an unknown sample is forgotten when it leaves the window.
fn moving_mean(x: &[f64], window: usize) -> Vec<f64> {
    let mut means = vec![f64::NAN; x.len()];
    for (end, mean) in means.iter_mut().enumerate().skip(window - 1) {
        *mean = x[end + 1 - window..=end].iter().sum::<f64>() / window as f64;
    }
    means
}

/// Largest minus smallest over `[t - window, t]`.
fn moving_range(x: &[f64], window: usize) -> Vec<f64> {
    let mut ranges = vec![f64::NAN; x.len()];
    for (end, range) in ranges.iter_mut().enumerate().skip(window) {
        let mut low = f64::INFINITY;
        let mut high = f64::NEG_INFINITY;
        let mut unknown = false;
        for sample in &x[end - window..=end] {
            unknown |= sample.is_nan();
            low = low.min(*sample);
            high = high.max(*sample);
        }
        if !unknown {
            *range = high - low;
        }
    }
    ranges
}
