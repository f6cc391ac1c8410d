//! Rules: a conjunction of at most three literals that describes a group.

use super::literal::{Cut, Literal, LiteralSearch};
use crate::embedding::Embedding;
use crate::template::{Formula, Words, sentence};
use crate::traces::Grid;

/// First literals that are tried.
const BEAM: usize = 6;
/// What a second and a third literal must add to F1.
const SECOND: f64 = 0.01;
const THIRD: f64 = 0.03;

/// A conjunction of literals of one template.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// The literals, all of which must hold.
    pub literals: Vec<Literal>,
}

/// How well a rule describes a group on some traces.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Quality {
    /// Traces for which the rule holds.
    pub support: usize,
    /// Those of them that are in the group.
    pub hits: usize,
    /// Traces in the group.
    pub members: usize,
}

impl Quality {
    /// Counts verdicts: whether the rule holds, and whether the trace is in
    /// the group.
    pub fn of(verdicts: impl Iterator<Item = (bool, bool)>) -> Self {
        let mut quality = Quality {
            support: 0,
            hits: 0,
            members: 0,
        };
        for (holds, member) in verdicts {
            quality.support += usize::from(holds);
            quality.hits += usize::from(holds && member);
            quality.members += usize::from(member);
        }
        quality
    }

    /// Share of the traces for which it holds that are in the group; 1 when it
    /// holds for none.
    pub fn precision(&self) -> f64 {
        share(self.hits, self.support)
    }

    /// Share of the group for which it holds; 1 when the group is empty.
    pub fn recall(&self) -> f64 {
        share(self.hits, self.members)
    }

    /// Harmonic mean of the two.
    pub fn f1(&self) -> f64 {
        share(2 * self.hits, self.support + self.members)
    }
}

fn share(part: usize, whole: usize) -> f64 {
    if whole == 0 {
        1.0
    } else {
        part as f64 / whole as f64
    }
}

impl Rule {
    /// Whether a trace, given by number, passes.
    pub fn holds(&self, embedding: &Embedding, trace: usize) -> bool {
        self.literals
            .iter()
            .all(|literal| literal.holds(embedding, trace))
    }

    /// How well it describes a group.
    pub fn quality(&self, embedding: &Embedding, members: &[bool]) -> Quality {
        let verdict = |(trace, member): (usize, &bool)| (self.holds(embedding, trace), *member);
        Quality::of(members.iter().enumerate().map(verdict))
    }
}

/// The best rule for a group: the best single literal, made narrower by a
/// second and a third where that is worth it. `None` when no column has two
/// different heights.
pub fn rule(search: &LiteralSearch<'_>, members: &[bool]) -> Option<Rule> {
    rule_among(search, members, &vec![true; members.len()])
}

/// As [`rule`], looking at some of the traces only. `members` must be among
/// them.
pub fn rule_among(
    search: &LiteralSearch<'_>,
    members: &[bool],
    considered: &[bool],
) -> Option<Rule> {
    let mut best: Option<(f64, f64, Vec<Cut>)> = None;
    for first in search.cuts(members, considered).into_iter().take(BEAM) {
        let (quality, cuts) = narrowed(search, members, considered, first);
        // Fewer literals and better placed ones go first among equals.
        let value = first.value - 0.02 * (cuts.len() - 1) as f64;
        let better = best.as_ref().is_none_or(|(best_quality, best_value, _)| {
            quality > best_quality + 1e-9 || (quality > best_quality - 1e-9 && value > *best_value)
        });
        if better {
            best = Some((quality, value, cuts));
        }
    }
    let (_, _, cuts) = best?;
    let literals = cuts.iter().map(|cut| search.literal(cut)).collect();
    Some(Rule { literals })
}

/// A first cut with more cuts among the traces that it leaves, while they add
/// enough.
fn narrowed(
    search: &LiteralSearch<'_>,
    members: &[bool],
    considered: &[bool],
    first: Cut,
) -> (f64, Vec<Cut>) {
    let mut quality = first.quality;
    let mut cuts = vec![first];
    let mut left: Vec<bool> = considered.to_vec();
    for needed in [SECOND, THIRD] {
        let last = search.literal(&cuts[cuts.len() - 1]);
        for (trace, left) in left.iter_mut().enumerate() {
            *left &= last.holds(search.embedding, trace);
        }
        let next = search.cuts(members, &left).into_iter().max_by(|a, b| {
            a.quality
                .total_cmp(&b.quality)
                .then(a.value.total_cmp(&b.value))
        });
        match next {
            Some(next) if next.quality > quality + needed => {
                quality = next.quality;
                cuts.push(next);
            }
            _ => break,
        }
    }
    (quality, cuts)
}

/// A rule as a formula with numbers and as a sentence.
pub fn rule_text(
    rule: &Rule,
    embedding: &Embedding,
    grid: &Grid,
    words: &dyn Words,
) -> (String, String) {
    let mut formulas: Vec<Formula> = Vec::new();
    let mut negations: Vec<Formula> = Vec::new();
    for literal in &rule.literals {
        let formula = literal.specification(embedding, grid);
        match (literal.satisfied, formula.negated()) {
            (true, _) => formulas.push(formula),
            (false, Ok(negation)) => formulas.push(negation),
            // `until` has no negation in the language; it is said around it.
            (false, Err(_)) => negations.push(formula),
        }
    }
    let mut texts = Vec::new();
    let mut sentences = Vec::new();
    if !formulas.is_empty() {
        let formula = Formula::and(formulas);
        texts.push(formula.to_string());
        sentences.push(sentence(&formula, words));
    }
    for formula in negations {
        texts.push(format!("not ({formula})"));
        let said = sentence(&formula, words);
        sentences.push(format!("It is not so that: {said}"));
    }
    (texts.join(" and "), sentences.join(" "))
}
