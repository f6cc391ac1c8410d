//! The memory of a search: which parts and templates were met.

use std::collections::HashSet;
use std::hash::BuildHasherDefault;

use egg::Id;
use rustc_hash::FxHasher;

use super::graph::{Graph, Table};
use super::language::{Known, Symbol};
use super::normalise::Normaliser;
use crate::template::{Atom, Formula, Node};

/// What a template is, compared with those before it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Outcome {
    /// New, in this form.
    New(Formula),
    /// The same as an earlier one, or as the negation of one.
    Duplicate,
    /// Always true or always false, whatever the data.
    Constant,
}

/// A class that is used as a part.
#[derive(Debug, Clone)]
struct Part {
    /// The form in which it is used: the simplest that was met.
    form: Formula,
    /// Grammars and rules that gave it.
    rules: Vec<(u64, usize)>,
}

/// A rule's name, and what stood there before and after it.
pub type RuleStep = (&'static str, Option<Formula>, Option<Formula>);

/// What was seen so far.
#[derive(Debug)]
pub struct Seen {
    normaliser: Normaliser,
    parts: Table<Id, Part>,
    /// The classes of formulas that are used as parts, by their addresses; the
    /// formulas are kept, so that no address is used twice.
    known: Table<usize, (Formula, Id)>,
    templates: HashSet<Id, BuildHasherDefault<FxHasher>>,
    /// Bytes up to which the e-graph may grow.
    most_bytes: usize,
}

impl Seen {
    /// An empty memory, for data where the signals are known as said.
    pub fn new(known: Known) -> Self {
        Seen {
            normaliser: Normaliser::new(Graph::new(known)),
            parts: Table::default(),
            known: Table::default(),
            templates: HashSet::default(),
            most_bytes: usize::MAX,
        }
    }

    /// As [`Seen::new`], but when about so many bytes are taken, what follows
    /// is compared by its normal form alone.
    pub fn bounded(known: Known, most_bytes: usize) -> Self {
        let mut seen = Seen::new(known);
        seen.most_bytes = most_bytes;
        if most_bytes == 0 {
            seen.normaliser.graph.freeze();
        }
        seen
    }

    /// The form in which a part is used, or `None` when it is the same as one
    /// that the rule (of the grammar that `scope` stands for) gave before, or
    /// is always true or always false.
    pub fn part(&mut self, scope: u64, rule: usize, formula: &Formula) -> Option<Formula> {
        let class = self.class_of(formula);
        if matches!(self.normaliser.graph.symbol(class), Symbol::Constant(_)) {
            return None;
        }
        if !self.parts.contains_key(&class) {
            let form = self.simplest(formula, class);
            let part = Part {
                form,
                rules: Vec::new(),
            };
            self.parts.insert(class, part);
        }
        let part = self.parts.get_mut(&class)?;
        if part.rules.contains(&(scope, rule)) {
            return None;
        }
        part.rules.push((scope, rule));
        let form = part.form.clone();
        self.known.insert(form.address(), (form.clone(), class));
        Some(form)
    }

    /// Whether a whole template is new. It and its negation count once.
    pub fn template(&mut self, formula: &Formula) -> Outcome {
        let class = self.class_of(formula);
        let root = self.normaliser.root(class);
        if matches!(self.normaliser.graph.symbol(root), Symbol::Constant(_)) {
            return Outcome::Constant;
        }
        if self.templates.contains(&root) {
            return Outcome::Duplicate;
        }
        if let Some(negation) = self.normaliser.negation(root) {
            let other = self.normaliser.root(negation);
            if self.templates.contains(&other) {
                return Outcome::Duplicate;
            }
        }
        self.templates.insert(root);
        Outcome::New(self.simplest(formula, root))
    }

    /// The canonical form of a formula as a part of others, and the rules that
    /// led there. A constant has no form; the formula stands for itself.
    pub fn canonical(&mut self, formula: &Formula) -> (Formula, Vec<&'static str>) {
        self.normaliser.steps = Some(Vec::new());
        let class = self.normaliser.class(formula);
        let steps = self.normaliser.steps.take().unwrap_or_default();
        let form = self.normaliser.graph.formula(class);
        let rules = steps.iter().map(|step| step.rule).collect();
        (form.unwrap_or_else(|| formula.clone()), rules)
    }

    /// A number that is the same for formulas found to be the same in any
    /// place.
    pub fn class_number(&mut self, formula: &Formula) -> usize {
        let class = self.class_of(formula);
        self.normaliser.graph.find(class).into()
    }

    /// A number that is the same for templates found to be the same when they
    /// stand outermost.
    pub fn root_number(&mut self, formula: &Formula) -> usize {
        let class = self.class_of(formula);
        self.normaliser.root(class).into()
    }

    /// As [`Seen::root_number`], with the rules that led there: for each its
    /// name and what stood there before and after, where the language can write
    /// it.
    pub fn root_steps(&mut self, formula: &Formula) -> (usize, Vec<RuleStep>) {
        self.normaliser.steps = Some(Vec::new());
        let class = self.normaliser.class(formula);
        let root = self.normaliser.root(class);
        let steps = self.normaliser.steps.take().unwrap_or_default();
        let steps = steps
            .into_iter()
            .map(|step| (step.rule, step.from, step.to));
        (root.into(), steps.collect())
    }

    /// The facts that are known of a formula's family.
    pub fn flags(&mut self, formula: &Formula) -> super::Flags {
        let class = self.class_of(formula);
        self.normaliser.graph.flags(class)
    }

    /// The simpler of a formula as it is written and the normal form of its
    /// class: smaller, with fewer slots, or else as it is written.
    fn simplest(&self, formula: &Formula, class: Id) -> Formula {
        let data = self.normaliser.graph.data(class);
        let normal = (u32::from(data.size), usize::from(data.slots));
        let own = (formula.size(), formula.slots().len());
        let form = if normal < own {
            self.normaliser.graph.formula(class)
        } else {
            None
        };
        arranged(&form.unwrap_or_else(|| formula.clone()))
    }

    /// The class of a formula, which is added beside its normal form.
    fn class_of(&mut self, formula: &Formula) -> Id {
        if let Some((_, class)) = self.known.get(&formula.address()) {
            return self.normaliser.graph.find(*class);
        }
        if self.normaliser.graph.bytes() > self.most_bytes && !self.normaliser.graph.is_frozen() {
            self.normaliser.graph.freeze();
        }
        let operands: Vec<Id> = formula
            .operands()
            .iter()
            .map(|operand| match self.known.get(&operand.address()) {
                Some((_, class)) => self.normaliser.graph.find(*class),
                None => self.normaliser.class(operand),
            })
            .collect();
        let atoms = self.normaliser.graph.dictionary().atoms.len();
        let raw = self.normaliser.graph.node(formula, &operands);
        if self.normaliser.graph.dictionary().atoms.len() > atoms {
            self.normaliser.forget_missing_negations();
        }
        let class = self.normaliser.make(raw.clone());
        self.normaliser.graph.unite(raw, class)
    }

    /// Closes a layer: one rebuild, after which classes that turned out to be
    /// one are known under one number.
    pub fn finish_layer(&mut self) {
        self.normaliser.graph.rebuild();
        let graph = &self.normaliser.graph;
        let templates = std::mem::take(&mut self.templates);
        self.templates = templates.into_iter().map(|id| graph.find(id)).collect();
        let mut moved: Vec<(Id, Part)> = Vec::new();
        self.parts.retain(|id, part| {
            let class = graph.find(*id);
            if class != *id {
                moved.push((class, part.clone()));
            }
            class == *id
        });
        for (class, part) in moved {
            match self.parts.get_mut(&class) {
                None => {
                    self.parts.insert(class, part);
                }
                Some(own) => {
                    let rank = |form: &Formula| (form.size(), form.slots().len(), form.clone());
                    if rank(&part.form) < rank(&own.form) {
                        own.form = part.form;
                    }
                    own.rules.extend(part.rules);
                }
            }
        }
    }

    /// Nodes and classes of the e-graph.
    pub fn size(&self) -> (usize, usize) {
        self.normaliser.graph.size()
    }

    /// Bytes taken, about.
    pub fn bytes(&self) -> usize {
        self.normaliser.graph.bytes()
    }

    /// Whether memory grew short, so that candidates are compared by their
    /// normal form alone.
    pub fn is_frozen(&self) -> bool {
        self.normaliser.graph.is_frozen()
    }
}

/// Operands of the outermost connective in the order in which they read well:
/// negated flags first, so that implications print as such, then atoms, then
/// the rest.
fn arranged(formula: &Formula) -> Formula {
    let place = |formula: &Formula| match formula.node() {
        Node::Atom(Atom::Flag { negated: true, .. }) => 0,
        Node::Atom(_) => 1,
        _ => 2,
    };
    let sorted = |parts: &[Formula]| {
        let mut parts = parts.to_vec();
        parts.sort_by_key(place);
        parts
    };
    let is_sorted = |parts: &[Formula]| parts.is_sorted_by_key(place);
    match formula.node() {
        Node::And(parts) if !is_sorted(parts) => Formula::and(sorted(parts)),
        Node::Or(parts) if !is_sorted(parts) => Formula::or(sorted(parts)),
        _ => formula.clone(),
    }
}
