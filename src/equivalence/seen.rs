//! The memory of a search: one persistent e-graph, grown layer by layer.

use std::collections::{BTreeMap, BTreeSet};

use egg::{EGraph, Id};

use super::language::{Facts, Symbol};
use super::normalise::{Normaliser, add};
use crate::template::Formula;

/// What a template is, compared with those before it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Outcome {
    /// New, in this form.
    New(Formula),
    /// The same as an earlier one, or as the negation of one.
    Duplicate,
}

/// How a class has been used.
#[derive(Debug, Clone, Default)]
struct Use {
    /// The form in which it is used: the smallest normal form met.
    form: Option<Formula>,
    /// Grammars and rules that gave it as a part.
    parts: BTreeSet<(u64, usize)>,
    /// Whether it is one of the templates kept.
    is_template: bool,
}

impl Use {
    fn join(&mut self, other: Use) {
        self.parts.extend(other.parts);
        self.is_template |= other.is_template;
        self.form = match (self.form.take(), other.form) {
            (Some(a), Some(b)) if (b.size(), &b) < (a.size(), &a) => Some(b),
            (Some(a), _) => Some(a),
            (None, b) => b,
        };
    }
}

/// What was seen so far.
#[derive(Debug)]
pub struct Seen {
    graph: EGraph<Symbol, Facts>,
    uses: BTreeMap<Id, Use>,
}

impl Default for Seen {
    fn default() -> Self {
        Seen::new()
    }
}

impl Seen {
    /// An empty memory.
    pub fn new() -> Self {
        Seen {
            graph: EGraph::new(Facts),
            uses: BTreeMap::new(),
        }
    }

    /// The form in which a part is used, or `None` when it is the same as one
    /// that the rule (of the grammar that `scope` stands for) gave before.
    pub fn part(&mut self, scope: u64, rule: usize, formula: &Formula) -> Option<Formula> {
        let class = self.class_of(formula);
        let used = self.uses.entry(class).or_default();
        used.parts
            .insert((scope, rule))
            .then(|| used.form.clone())?
    }

    /// Whether a whole template is new. It and its negation count once.
    pub fn template(&mut self, formula: &Formula) -> Outcome {
        if let Ok(negation) = formula.negated() {
            let other = self.class_of(&negation);
            if self.uses[&other].is_template {
                return Outcome::Duplicate;
            }
        }
        let class = self.class_of(formula);
        let used = self.uses.entry(class).or_default();
        if std::mem::replace(&mut used.is_template, true) {
            return Outcome::Duplicate;
        }
        Outcome::New(used.form.clone().unwrap_or_else(|| formula.clone()))
    }

    /// The canonical form of a formula, and the rules that led there.
    pub fn canonical(&mut self, formula: &Formula) -> (Formula, Vec<&'static str>) {
        let mut normaliser = Normaliser {
            graph: &mut self.graph,
            applied: Vec::new(),
        };
        let form = normaliser.normal(formula);
        (form, normaliser.applied)
    }

    /// Adds a formula beside its normal form, unites the two, and gives the
    /// class.
    fn class_of(&mut self, formula: &Formula) -> Id {
        let (form, _) = self.canonical(formula);
        let raw = add(&mut self.graph, formula);
        let normal = add(&mut self.graph, &form);
        let before = [self.graph.find(raw), self.graph.find(normal)];
        self.graph.union(raw, normal);
        let class = self.graph.find(normal);
        let mut used = Use {
            form: Some(form),
            ..Use::default()
        };
        for id in before {
            if let Some(other) = self.uses.remove(&id) {
                used.join(other);
            }
        }
        self.uses.insert(class, used);
        class
    }

    /// Closes a layer: one rebuild, after which classes that turned out to be
    /// one are known under one number.
    pub fn finish_layer(&mut self) {
        self.graph.rebuild();
        let mut uses: BTreeMap<Id, Use> = BTreeMap::new();
        for (id, used) in std::mem::take(&mut self.uses) {
            uses.entry(self.graph.find(id)).or_default().join(used);
        }
        self.uses = uses;
    }

    /// Nodes and classes of the e-graph.
    pub fn size(&self) -> (usize, usize) {
        (self.graph.total_size(), self.graph.number_of_classes())
    }
}
