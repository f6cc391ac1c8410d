//! The JSON form of a formula: a tagged tree with a versioned schema.
//!
//! ```json
//! {"schema": "strandline-formula/1",
//!  "formula": {"throughout": {"from": {"after": {"value": 0}}, "to": "end",
//!    "holds": {"compare": {"signal": {"channel": "speed"}, "is": "<=", "threshold": "slot"}}}}}
//! ```
//!
//! The types here mirror the analysed form and exist for files only, so that a
//! change of the internal form never changes a file by accident.

use serde::{Deserialize, Serialize};

use super::atom::{Atom, Comparison, Threshold};
use super::duration::{Duration, TimeUnit};
use super::formula::{Formula, Node};
use super::function::{Function, Kind};
use super::signal::Signal;
use super::window::{Bound, Window};
use crate::support::Finite;

/// The schema this version writes and reads.
const SCHEMA: &str = "strandline-formula/1";

#[derive(Debug, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Document {
    schema: String,
    formula: JsonFormula,
}

#[derive(Debug, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
enum JsonFormula {
    Compare {
        signal: JsonSignal,
        is: JsonComparison,
        threshold: JsonThreshold,
    },
    Flag {
        signal: JsonSignal,
        #[serde(default, skip_serializing_if = "std::ops::Not::not")]
        negated: bool,
    },
    And(Vec<JsonFormula>),
    Or(Vec<JsonFormula>),
    Throughout {
        from: JsonBound,
        to: JsonBound,
        holds: Box<JsonFormula>,
    },
    Sometime {
        from: JsonBound,
        to: JsonBound,
        holds: Box<JsonFormula>,
    },
    Until {
        holds: Box<JsonFormula>,
        from: JsonBound,
        to: JsonBound,
        comes: Box<JsonFormula>,
    },
}

#[derive(Debug, Serialize, Deserialize)]
enum JsonComparison {
    #[serde(rename = "<=")]
    AtMost,
    #[serde(rename = ">=")]
    AtLeast,
    #[serde(rename = "<")]
    Below,
    #[serde(rename = ">")]
    Above,
}

#[derive(Debug, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
enum JsonThreshold {
    Slot,
    Number {
        value: f64,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        unit: Option<String>,
    },
}

#[derive(Debug, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
enum JsonBound {
    Slot,
    End,
    After {
        value: f64,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        unit: Option<String>,
    },
}

#[derive(Debug, Serialize, Deserialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
enum JsonSignal {
    Channel(String),
    Flag(String),
    Derived {
        function: String,
        of: Vec<JsonSignal>,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        over: Option<JsonBound>,
    },
}

/// What can be wrong with a formula in JSON.
#[derive(Debug, thiserror::Error)]
pub enum JsonError {
    /// Not JSON, or not of this shape.
    #[error("not a formula in JSON: {0}")]
    Shape(#[from] serde_json::Error),
    /// A schema this version does not read.
    #[error("the schema `{0}` is unknown; this version reads `{SCHEMA}`")]
    Schema(String),
    /// A part that has the right shape but no meaning.
    #[error("{0}")]
    Meaning(String),
}

/// The JSON form of a formula.
pub fn to_json(formula: &Formula) -> serde_json::Value {
    let document = Document {
        schema: SCHEMA.to_owned(),
        formula: JsonFormula::from(formula),
    };
    serde_json::to_value(document).unwrap_or(serde_json::Value::Null)
}

/// Reads a formula from its JSON form.
///
/// # Errors
/// When the value is not of the shape, of another schema, or without meaning.
pub fn from_json(value: &serde_json::Value) -> Result<Formula, JsonError> {
    if let Some(schema) = value.get("schema").and_then(serde_json::Value::as_str)
        && schema != SCHEMA
    {
        return Err(JsonError::Schema(schema.to_owned()));
    }
    let document = Document::deserialize(value)?;
    document.formula.read()
}

impl From<&Formula> for JsonFormula {
    fn from(formula: &Formula) -> Self {
        let all = |operands: &[Formula]| operands.iter().map(JsonFormula::from).collect();
        match formula.node() {
            Node::Atom(Atom::Flag { signal, negated }) => JsonFormula::Flag {
                signal: signal.into(),
                negated: *negated,
            },
            Node::Atom(Atom::Compare {
                signal,
                comparison,
                threshold,
            }) => JsonFormula::Compare {
                signal: signal.into(),
                is: (*comparison).into(),
                threshold: threshold.into(),
            },
            Node::And(operands) => JsonFormula::And(all(operands)),
            Node::Or(operands) => JsonFormula::Or(all(operands)),
            Node::Throughout(window, operand) => JsonFormula::Throughout {
                from: window.lower().into(),
                to: window.upper().into(),
                holds: Box::new(operand.into()),
            },
            Node::Sometime(window, operand) => JsonFormula::Sometime {
                from: window.lower().into(),
                to: window.upper().into(),
                holds: Box::new(operand.into()),
            },
            Node::Until(window, left, right) => JsonFormula::Until {
                holds: Box::new(left.into()),
                from: window.lower().into(),
                to: window.upper().into(),
                comes: Box::new(right.into()),
            },
        }
    }
}

impl JsonFormula {
    fn read(&self) -> Result<Formula, JsonError> {
        let all = |operands: &[JsonFormula]| {
            if operands.len() < 2 {
                return Err(JsonError::Meaning(
                    "`and` and `or` need two operands".into(),
                ));
            }
            operands.iter().map(JsonFormula::read).collect()
        };
        Ok(match self {
            JsonFormula::Compare {
                signal,
                is,
                threshold,
            } => Formula::compare(signal.read(Kind::Numeric)?, is.into(), threshold.read()?),
            JsonFormula::Flag { signal, negated } => {
                Formula::flag(signal.read(Kind::Flag)?, *negated)
            }
            JsonFormula::And(operands) => Formula::and(all(operands)?),
            JsonFormula::Or(operands) => Formula::or(all(operands)?),
            JsonFormula::Throughout { from, to, holds } => {
                Formula::throughout(read_window(from, to)?, holds.read()?)
            }
            JsonFormula::Sometime { from, to, holds } => {
                Formula::sometime(read_window(from, to)?, holds.read()?)
            }
            JsonFormula::Until {
                holds,
                from,
                to,
                comes,
            } => Formula::until(read_window(from, to)?, holds.read()?, comes.read()?),
        })
    }
}

impl From<Comparison> for JsonComparison {
    fn from(comparison: Comparison) -> Self {
        match comparison {
            Comparison::AtMost => JsonComparison::AtMost,
            Comparison::AtLeast => JsonComparison::AtLeast,
            Comparison::Below => JsonComparison::Below,
            Comparison::Above => JsonComparison::Above,
        }
    }
}

impl From<&JsonComparison> for Comparison {
    fn from(comparison: &JsonComparison) -> Self {
        match comparison {
            JsonComparison::AtMost => Comparison::AtMost,
            JsonComparison::AtLeast => Comparison::AtLeast,
            JsonComparison::Below => Comparison::Below,
            JsonComparison::Above => Comparison::Above,
        }
    }
}

impl From<&Threshold> for JsonThreshold {
    fn from(threshold: &Threshold) -> Self {
        match threshold {
            Threshold::Slot => JsonThreshold::Slot,
            Threshold::Number(value, unit) => JsonThreshold::Number {
                value: value.value(),
                unit: unit.as_deref().map(str::to_owned),
            },
        }
    }
}

impl JsonThreshold {
    fn read(&self) -> Result<Threshold, JsonError> {
        Ok(match self {
            JsonThreshold::Slot => Threshold::Slot,
            JsonThreshold::Number { value, unit } => {
                Threshold::Number(read_finite(*value)?, unit.as_deref().map(Into::into))
            }
        })
    }
}

impl From<Duration> for JsonBound {
    fn from(duration: Duration) -> Self {
        JsonBound::After {
            value: duration.value.value(),
            unit: Some(duration.unit.name())
                .filter(|name| !name.is_empty())
                .map(str::to_owned),
        }
    }
}

impl From<Bound> for JsonBound {
    fn from(bound: Bound) -> Self {
        match bound {
            Bound::Slot => JsonBound::Slot,
            Bound::End => JsonBound::End,
            Bound::After(duration) => duration.into(),
        }
    }
}

impl JsonBound {
    fn read(&self) -> Result<Bound, JsonError> {
        Ok(match self {
            JsonBound::Slot => Bound::Slot,
            JsonBound::End => Bound::End,
            JsonBound::After { value, unit } => {
                let unit = match unit {
                    None => TimeUnit::Data,
                    Some(name) => TimeUnit::from_name(name).ok_or_else(|| {
                        JsonError::Meaning(format!("`{name}` is not a unit of time"))
                    })?,
                };
                let value = read_finite(*value)?;
                Bound::After(Duration { value, unit })
            }
        })
    }
}

impl From<&Signal> for JsonSignal {
    fn from(signal: &Signal) -> Self {
        match signal {
            Signal::Recorded {
                name,
                kind: Kind::Numeric,
            } => JsonSignal::Channel(name.to_string()),
            Signal::Recorded { name, .. } => JsonSignal::Flag(name.to_string()),
            Signal::Derived(derivation) => JsonSignal::Derived {
                function: derivation.function.shape().name.to_owned(),
                of: derivation.arguments.iter().map(JsonSignal::from).collect(),
                over: derivation.duration.map(JsonBound::from),
            },
        }
    }
}

impl JsonSignal {
    fn read(&self, kind: Kind) -> Result<Signal, JsonError> {
        let signal = match self {
            JsonSignal::Channel(name) => Signal::channel(name),
            JsonSignal::Flag(name) => Signal::flag(name),
            JsonSignal::Derived { function, of, over } => read_derived(function, of, over)?,
        };
        if signal.kind() == kind {
            Ok(signal)
        } else {
            Err(JsonError::Meaning(format!(
                "`{signal}` is of the wrong kind"
            )))
        }
    }
}

fn read_derived(
    name: &str,
    of: &[JsonSignal],
    over: &Option<JsonBound>,
) -> Result<Signal, JsonError> {
    let function = Function::from_name(name)
        .ok_or_else(|| JsonError::Meaning(format!("there is no function `{name}`")))?;
    let shape = function.shape();
    let duration = match over.as_ref().map(JsonBound::read).transpose()? {
        Some(Bound::After(duration)) => Some(duration),
        None => None,
        Some(_) => {
            return Err(JsonError::Meaning(format!(
                "`{name}` needs a plain duration"
            )));
        }
    };
    if of.len() != shape.arguments.len() || duration.is_some() != shape.takes_duration {
        return Err(JsonError::Meaning(format!("wrong arguments for `{name}`")));
    }
    let arguments = of
        .iter()
        .zip(shape.arguments)
        .map(|(argument, kind)| argument.read(*kind))
        .collect::<Result<Vec<_>, _>>()?;
    Ok(Signal::derived(function, arguments, duration))
}

fn read_finite(value: f64) -> Result<Finite, JsonError> {
    Finite::new(value).map_err(|error| JsonError::Meaning(error.to_string()))
}

fn read_window(from: &JsonBound, to: &JsonBound) -> Result<Window, JsonError> {
    Window::new(from.read()?, to.read()?).map_err(|error| JsonError::Meaning(error.to_string()))
}
