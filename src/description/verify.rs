//! An independent check of descriptions: every specification, on every trace,
//! by the evaluator that follows the definition.

use super::rule::Rule;
use crate::embedding::{Embedding, ResolveError, verdicts};
use crate::traces::TraceSet;

/// Verdicts compared, and how many differed.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Check {
    /// Verdicts compared.
    pub verdicts: usize,
    /// Verdicts that differed.
    pub disagreements: usize,
}

impl Check {
    /// Two checks together.
    pub fn and(self, other: Check) -> Check {
        Check {
            verdicts: self.verdicts + other.verdicts,
            disagreements: self.disagreements + other.disagreements,
        }
    }
}

/// Checks every literal of a rule on every trace. The specification goes
/// through its text, so that what is printed is what is checked.
///
/// # Errors
/// When a specification does not fit the traces.
pub fn verify(
    rule: &Rule,
    embedding: &Embedding,
    traces: &TraceSet,
) -> Result<Check, ResolveError> {
    let mut check = Check::default();
    for literal in &rule.literals {
        let formula = literal.specification(embedding, traces.grid());
        let printed = formula.to_string();
        let read = crate::template::parse(&printed).unwrap_or(formula);
        for (trace, satisfied) in verdicts(&read, traces)?.into_iter().enumerate() {
            let expected = literal.holds(embedding, trace) == literal.satisfied;
            check.verdicts += 1;
            check.disagreements += usize::from(satisfied != expected);
        }
    }
    Ok(check)
}
