//! Temporary: plain memory of what was seen.

use std::collections::BTreeSet;

use crate::template::Formula;

/// What a template is, compared with those before it.
#[derive(Debug, Clone, PartialEq)]
pub enum Outcome {
    /// New, in this form.
    New(Formula),
    /// Seen before.
    Duplicate,
    /// Constant whatever the data.
    Constant,
}

/// Memory of what was seen.
#[derive(Debug, Default)]
pub struct Seen {
    parts: BTreeSet<(u64, usize, Formula)>,
    templates: BTreeSet<Formula>,
}

impl Seen {
    /// An empty memory.
    pub fn new() -> Self {
        Seen::default()
    }
    /// A part.
    pub fn part(&mut self, scope: u64, rule: usize, formula: &Formula) -> Option<Formula> {
        self.parts
            .insert((scope, rule, formula.clone()))
            .then(|| formula.clone())
    }
    /// A template.
    pub fn template(&mut self, formula: &Formula) -> Outcome {
        if self.templates.insert(formula.clone()) {
            Outcome::New(formula.clone())
        } else {
            Outcome::Duplicate
        }
    }
    /// End of a layer.
    pub fn finish_layer(&mut self) {}
}
