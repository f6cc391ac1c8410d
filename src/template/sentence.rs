//! A formula in plain words, as an engineer would write it in a test report.
//!
//! The words come from the formula alone, so formula and sentence cannot
//! disagree. [`Words`] says how to write the parts that depend on the data:
//! the unit of a signal, and the name of a slot.

use super::atom::{Atom, Comparison, Threshold};
use super::formula::{Formula, Node};
use super::function::Function;
use super::print::implication;
use super::signal::Signal;
use super::window::{Bound, Window};

/// What the sentence needs to know beyond the formula.
pub trait Words {
    /// The unit of a signal, such as `mm/s`; `None` when it has none.
    fn unit(&self, signal: &Signal) -> Option<String>;
}

/// Words for a formula that stands alone: no units.
impl Words for () {
    fn unit(&self, _: &Signal) -> Option<String> {
        None
    }
}

/// The formula as a sentence: capital first, full stop last.
pub fn sentence(formula: &Formula, words: &dyn Words) -> String {
    let mut writer = Writer {
        words,
        next_slot: 1,
    };
    let text = writer.formula(formula, Place::Outermost);
    let mut characters = text.chars();
    match characters.next() {
        Some(first) => format!("{}{}.", first.to_uppercase(), characters.as_str()),
        None => String::new(),
    }
}

/// Where a formula stands: the outermost windows count from the start of the
/// record, inner ones from the instant their context speaks of, and in the
/// strong reading a window must lie inside the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Place {
    Outermost,
    Weak,
    Strong,
}

impl Place {
    /// Where the operand of a temporal operator stands: an outermost operator
    /// and one with `end` set the reading, the others hand it on.
    fn below(self, window: &Window, own: Place) -> Place {
        if self == Place::Outermost || window.upper() == Bound::End {
            own
        } else {
            self
        }
    }
}

struct Writer<'a> {
    words: &'a dyn Words,
    next_slot: usize,
}

impl Writer<'_> {
    fn formula(&mut self, formula: &Formula, place: Place) -> String {
        match formula.node() {
            Node::Atom(atom) => self.atom(atom),
            Node::And(operands) => self.joined(operands, place, " and "),
            Node::Or(operands) => match implication(formula) {
                Some((cause, effect)) => {
                    let cause = cause_clause(cause);
                    format!("{cause}, {}", self.formula(effect, place))
                }
                None => self.disjunction(operands, place),
            },
            Node::Throughout(window, operand) => self.throughout(window, operand, place),
            Node::Sometime(window, operand) => self.sometime(window, operand, place),
            Node::Until(window, left, right) => {
                let left = self.operand(left, place.below(window, Place::Weak));
                let when = self.deadline(window, place);
                let right = self.operand(right, place.below(window, Place::Strong));
                format!("{left} until {right}{when}")
            }
        }
    }

    /// An operand of a longer phrase: `both` and `either` say where a phrase
    /// with parts of its own begins.
    fn operand(&mut self, formula: &Formula, place: Place) -> String {
        let text = self.formula(formula, place);
        match formula.node() {
            Node::And(operands) if operands.len() == 2 => format!("both {text}"),
            Node::And(_) => format!("all of: {text}"),
            Node::Or(_) if implication(formula).is_none() && !text.starts_with("whenever") => {
                format!("either {text}")
            }
            _ => text,
        }
    }

    fn joined(&mut self, operands: &[Formula], place: Place, word: &str) -> String {
        let parts: Vec<String> = operands
            .iter()
            .map(|operand| self.operand(operand, place))
            .collect();
        let has_parts = |f: &Formula| matches!(f.node(), Node::And(_) | Node::Or(_));
        if operands.iter().any(has_parts) {
            return parts.join(&format!(",{word}"));
        }
        parts.join(word)
    }

    /// `x is at most a, or ...` reads "whenever x is above a, ..." where the
    /// other part speaks of what follows.
    fn disjunction(&mut self, operands: &[Formula], place: Place) -> String {
        if let [first, effect] = operands
            && let Node::Atom(Atom::Compare {
                signal,
                comparison: comparison @ (Comparison::AtMost | Comparison::AtLeast),
                threshold,
            }) = first.node()
            && effect.temporal_depth() > 0
        {
            let level = self.threshold(signal, threshold);
            let side = match comparison {
                Comparison::AtMost => "above",
                _ => "below",
            };
            let effect = self.formula(effect, place);
            return format!("whenever {} is {side} {level}, {effect}", name(signal));
        }
        self.joined(operands, place, " or ")
    }

    fn throughout(&mut self, window: &Window, operand: &Formula, place: Place) -> String {
        if *window == Window::whole() && place == Place::Outermost {
            let text = self.formula(operand, Place::Weak);
            return match operand.node() {
                Node::Or(_) if text.starts_with("each time") || text.starts_with("whenever") => {
                    text
                }
                Node::Atom(_) | Node::And(_) => format!("throughout the record, {text}"),
                Node::Sometime(..) => format!("from every instant on, {text}"),
                Node::Or(_) | Node::Throughout(..) | Node::Until(..) => {
                    format!("at every instant, {text}")
                }
            };
        }
        let span = self.span(window, place);
        let text = self.formula(operand, place.below(window, Place::Weak));
        match operand.node() {
            Node::Atom(_) => format!("{text} {span}"),
            Node::Or(_) => format!("{span}, at every instant {text}"),
            _ => format!("{span}, {text}"),
        }
    }

    fn sometime(&mut self, window: &Window, operand: &Formula, place: Place) -> String {
        if *window == Window::whole() {
            let text = self.formula(operand, Place::Strong);
            return match (place, operand.node()) {
                (Place::Outermost, Node::Atom(_)) => format!("at some time {text}"),
                (Place::Outermost, _) => format!("at some time, {text}"),
                (_, Node::Atom(_)) => format!("{text} then or later"),
                _ => format!("then or later, {text}"),
            };
        }
        let when = self.deadline(window, place);
        let text = self.formula(operand, place.below(window, Place::Strong));
        match operand.node() {
            Node::Atom(_) => format!("{text}{when}"),
            Node::And(_) | Node::Or(_) => format!("at an instant{when}, {text}"),
            Node::Throughout(..) | Node::Sometime(..) | Node::Until(..) => {
                format!("{text}, starting{when}")
            }
        }
    }

    /// How long something holds.
    fn span(&mut self, window: &Window, place: Place) -> String {
        let from_start = place == Place::Outermost;
        match (window.lower(), window.upper()) {
            (Bound::After(low), Bound::End) if low.is_zero() => "from then on".to_owned(),
            (low, Bound::End) => {
                let low = self.bound(low);
                if from_start {
                    format!("from {low} on")
                } else {
                    format!("from {low} later on")
                }
            }
            (Bound::After(low), high) if low.is_zero() => {
                let high = self.bound(high);
                match place {
                    Place::Outermost => format!("for the first {high}"),
                    Place::Weak => format!("for {high} or until the record ends"),
                    Place::Strong => format!("for {high}"),
                }
            }
            (low, high) => {
                let (low, high) = (self.bound(low), self.bound(high));
                format!("from {low} to {high} {}", reference(from_start))
            }
        }
    }

    /// By when something comes.
    fn deadline(&mut self, window: &Window, place: Place) -> String {
        let from_start = place == Place::Outermost;
        match (window.lower(), window.upper()) {
            (Bound::After(low), Bound::End) if low.is_zero() => String::new(),
            (low, Bound::End) => {
                let low = self.bound(low);
                format!(" at some time from {low} on")
            }
            (Bound::After(low), high) if low.is_zero() => {
                let high = self.bound(high);
                if from_start {
                    format!(" within the first {high}")
                } else {
                    format!(" within {high}")
                }
            }
            (low, high) => {
                let (low, high) = (self.bound(low), self.bound(high));
                format!(
                    " at some time from {low} to {high} {}",
                    reference(from_start)
                )
            }
        }
    }

    fn bound(&mut self, bound: Bound) -> String {
        match bound {
            Bound::After(duration) => duration.to_string(),
            Bound::Slot => self.slot(),
            Bound::End => "the end".to_owned(),
        }
    }

    fn slot(&mut self) -> String {
        let text = format!("?{}", self.next_slot);
        self.next_slot += 1;
        text
    }

    fn atom(&mut self, atom: &Atom) -> String {
        match atom {
            Atom::Flag { signal, negated } => flag_clause(signal, *negated),
            Atom::Compare {
                signal,
                comparison,
                threshold,
            } => {
                let level = self.threshold(signal, threshold);
                let relation = match comparison {
                    Comparison::AtMost => "at or below",
                    Comparison::AtLeast => "at or above",
                    Comparison::Below => "below",
                    Comparison::Above => "above",
                };
                format!("{} is {relation} {level}", name(signal))
            }
        }
    }

    fn threshold(&mut self, signal: &Signal, threshold: &Threshold) -> String {
        let (number, own_unit) = match threshold {
            Threshold::Number(value, unit) => (value.to_string(), unit.as_deref()),
            Threshold::Slot => (self.slot(), None),
        };
        match own_unit
            .map(str::to_owned)
            .or_else(|| self.words.unit(signal))
        {
            Some(unit) => format!("{number} {unit}"),
            None => number,
        }
    }
}

fn reference(from_start: bool) -> &'static str {
    if from_start {
        "after the start"
    } else {
        "later"
    }
}

/// A signal as a noun phrase.
fn name(signal: &Signal) -> String {
    let derivation = match signal {
        Signal::Recorded { name, .. } => return format!("the {}", spoken(name)),
        Signal::Derived(derivation) => derivation,
    };
    let first = name(&derivation.arguments[0]);
    let over = derivation
        .duration
        .map(|duration| duration.to_string())
        .unwrap_or_default();
    match derivation.function {
        Function::Rate => format!("the rate of change of {first}"),
        Function::Absolute => format!("the magnitude of {first}"),
        Function::Difference => {
            format!("{first} minus {}", name(&derivation.arguments[1]))
        }
        Function::Smooth => format!("{first}, averaged over {over},"),
        Function::SinceStart => format!("the change of {first} since the start"),
        Function::ToFinal => format!("the distance of {first} from its final value"),
        Function::Spread => format!("the range of {first} within {over}"),
        Function::Rises | Function::Falls => flag_clause(signal, false),
    }
}

/// A recorded name as it is spoken: underscores are spaces.
fn spoken(name: &str) -> String {
    name.replace('_', " ")
}

/// A flag as a clause.
fn flag_clause(signal: &Signal, negated: bool) -> String {
    match signal {
        Signal::Recorded { name, .. } => {
            format!("{} is {}", spoken(name), if negated { "off" } else { "on" })
        }
        Signal::Derived(derivation) => {
            let inner = match &derivation.arguments[0] {
                Signal::Recorded { name, .. } => spoken(name),
                other => other.to_string(),
            };
            let verb = match (derivation.function, negated) {
                (Function::Rises, false) => "comes on",
                (Function::Rises, true) => "does not come on",
                (Function::Falls, false) => "goes off",
                (_, _) => "does not go off",
            };
            format!("{inner} {verb}")
        }
    }
}

/// The left side of an implication.
fn cause_clause(signal: &Signal) -> String {
    match signal {
        Signal::Recorded { .. } => format!("whenever {}", flag_clause(signal, false)),
        Signal::Derived(_) => format!("each time {}", flag_clause(signal, false)),
    }
}

#[cfg(test)]
mod tests {
    use super::super::parse;
    use super::*;

    fn check(text: &str, expected: &str) {
        assert_eq!(sentence(&parse(text).unwrap(), &()), expected);
    }

    #[test]
    fn sentences_read_as_an_engineer_would_write_them() {
        check(
            "throughout [0, end] (speed <= 4.2)",
            "Throughout the record, the speed is at or below 4.2.",
        );
        check(
            "throughout [12 s, end] (pressure <= 4.2 bar)",
            "The pressure is at or below 4.2 bar from 12 s on.",
        );
        check(
            "throughout [0, end] (rises(call) implies sometime [0, 9 s] door_open)",
            "Each time call comes on, door open is on within 9 s.",
        );
        check(
            "throughout [0, end] (level <= 3 or sometime [0, 2 s] (flow >= 5))",
            "Whenever the level is above 3, the flow is at or above 5 within 2 s.",
        );
        check(
            "sometime [0, end] (throughout [0, 40 s] (temperature >= 71))",
            "At some time, the temperature is at or above 71 for 40 s.",
        );
        check(
            "sometime [0, end] (throughout [0, ?] (brake and speed >= ?))",
            "At some time, for ?1, brake is on and the speed is at or above ?2.",
        );
        check(
            "throughout [0, end] (rises(call) implies sometime [0, ?] (throughout [0, 2 s] (x <= 3)))",
            "Each time call comes on, the x is at or below 3 for 2 s or until the record ends, \
             starting within ?1.",
        );
        check(
            "throughout [0, end] (sometime [0, ?] (x <= ? and a))",
            "From every instant on, at an instant within ?1, the x is at or below ?2 and a is on.",
        );
        check(
            "throughout [0, end] ((a or b) and c)",
            "Throughout the record, either a is on or b is on, and c is on.",
        );
        check(
            "(speed <= ?) until [0, end] locked",
            "The speed is at or below ?1 until locked is on.",
        );
    }
}
