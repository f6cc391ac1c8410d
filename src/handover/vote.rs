//! Sorting traces by a hand-over file.

use super::file::{Handover, HandoverError};
use crate::template::Formula;

/// Where a trace belongs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Assignment {
    /// The position of its group in the file's list; `None` where no rule of
    /// any template fits.
    pub group: Option<usize>,
    /// How many templates voted for it.
    pub votes: usize,
}

/// A rule ready to be tried on traces.
struct Rule {
    group: usize,
    precision: f64,
    recall: f64,
    /// Positions in the list of specifications, and the verdict each must have.
    literals: Vec<(usize, bool)>,
}

/// Sorts traces. `verdicts(formula)` gives the verdict of a specification on
/// every trace, or what is wrong with the traces.
///
/// # Errors
/// When a formula cannot be read, or what `verdicts` says.
pub fn assign<E: From<HandoverError>>(
    handover: &Handover,
    count: usize,
    mut verdicts: impl FnMut(&Formula) -> Result<Vec<bool>, E>,
) -> Result<Vec<Assignment>, E> {
    // Rules share specifications; each is judged once.
    let mut specifications: Vec<Formula> = Vec::new();
    let templates = rules(handover, &mut specifications)?;
    let table = specifications
        .iter()
        .map(&mut verdicts)
        .collect::<Result<Vec<_>, E>>()?;
    Ok((0..count)
        .map(|trace| elect(&templates, handover.groups.len(), &table, trace))
        .collect())
}

/// The rules of each template, with their specifications gathered in a list.
fn rules(
    handover: &Handover,
    specifications: &mut Vec<Formula>,
) -> Result<Vec<Vec<Rule>>, HandoverError> {
    let mut templates = Vec::new();
    for template in &handover.templates {
        let mut rules = Vec::new();
        for rule in &template.rules {
            let mut literals = Vec::new();
            for literal in &rule.literals {
                let formula = literal.formula()?;
                let known = specifications.iter().position(|other| *other == formula);
                let position = known.unwrap_or_else(|| {
                    specifications.push(formula);
                    specifications.len() - 1
                });
                literals.push((position, literal.satisfied));
            }
            // A file is checked when it is read, so the group is in the list.
            if let Some(group) = handover.groups.iter().position(|name| *name == rule.group) {
                rules.push(Rule {
                    group,
                    precision: rule.precision,
                    recall: rule.recall,
                    literals,
                });
            }
        }
        templates.push(rules);
    }
    Ok(templates)
}

/// Counts the votes on one trace. Equal numbers of votes are told apart by the
/// sum of the rules' precisions, then by the order of the groups.
fn elect(templates: &[Vec<Rule>], groups: usize, table: &[Vec<bool>], trace: usize) -> Assignment {
    let mut votes = vec![(0usize, 0.0f64); groups];
    for rules in templates {
        if let Some(rule) = choice(rules, table, trace) {
            votes[rule.group].0 += 1;
            votes[rule.group].1 += rule.precision;
        }
    }
    let mut best: Option<usize> = None;
    for (group, tally) in votes.iter().enumerate() {
        if tally.0 > 0 && best.is_none_or(|other| *tally > votes[other]) {
            best = Some(group);
        }
    }
    Assignment {
        group: best,
        votes: best.map_or(0, |group| votes[group].0),
    }
}

/// The rule of a template that speaks for a trace: of those that fit, the one
/// with the best precision, then recall.
fn choice<'a>(rules: &'a [Rule], table: &[Vec<bool>], trace: usize) -> Option<&'a Rule> {
    let fits = |rule: &&Rule| {
        rule.literals
            .iter()
            .all(|(position, satisfied)| table[*position][trace] == *satisfied)
    };
    let mut chosen: Option<&Rule> = None;
    for rule in rules.iter().filter(fits) {
        let better = chosen
            .is_none_or(|other| (rule.precision, rule.recall) > (other.precision, other.recall));
        if better {
            chosen = Some(rule);
        }
    }
    chosen
}
