//! Whether two templates are the same, and how one can see it.
//!
//! Judged as whole templates, outermost: the same when, whatever the data, what
//! one can say by the choice of its slots the other can say too.
//!
//! * By rule: both have one root form in the memory that a search uses. The
//!   steps that lead there are the reason.
//! * By witness: short records, made at random over the channels that the
//!   templates read, on which some choice of slots of one template gives
//!   verdicts that no choice of slots of the other gives. The records are then
//!   thinned to the fewest and shortest that still tell the two apart. Derived
//!   signals are computed by the code that a search uses.
//! * Neither: not decided. No difference shows on many short records, and no
//!   rule says why.
//!
//! On a given data set the question is another: do the two sort these traces
//! alike (`on_data`)?

mod on_data;
mod records;
mod witness;

pub use on_data::{OnData, on_data};
pub use witness::{Record, Witness};

use serde::Serialize;

use crate::equivalence::{Known, Seen};
use crate::template::Formula;

/// One step of a reason: a rule, and what it made of what.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Reason {
    /// The rule; `outermost` for those that hold for whole templates only.
    pub rule: &'static str,
    /// What stood there before, where the language can write it.
    pub from: Option<String>,
    /// What stands there now.
    pub to: Option<String>,
}

/// Whether two templates are the same.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Answer {
    /// `None` when it was not decided.
    pub same: Option<bool>,
    /// Why they are the same.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub because: Vec<Reason>,
    /// What tells them apart.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub witness: Option<Witness>,
}

/// Compares two templates.
pub fn compare(a: &Formula, b: &Formula) -> Answer {
    let mut seen = Seen::new(Known::default());
    let (first, mut because) = reasons(&mut seen, a);
    let (second, more) = reasons(&mut seen, b);
    if first == second {
        because.extend(more);
        return Answer {
            same: Some(true),
            because,
            witness: None,
        };
    }
    let witness = witness::search(a, b);
    Answer {
        same: witness.as_ref().map(|_| false),
        because: Vec::new(),
        witness,
    }
}

fn reasons(seen: &mut Seen, formula: &Formula) -> (usize, Vec<Reason>) {
    let (number, steps) = seen.root_steps(formula);
    let reasons = steps.into_iter().map(|(rule, from, to)| Reason {
        rule,
        from: from.map(|formula| formula.to_string()),
        to: to.map(|formula| formula.to_string()),
    });
    (number, reasons.collect())
}
