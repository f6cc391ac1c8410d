//! Sorting traces by a hand-over file.

use super::file::{Handover, HandoverError};
use crate::description::{self, Ballot, ballot};
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
    ballot: Ballot,
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
                    ballot: Ballot {
                        group,
                        precision: rule.precision,
                        recall: rule.recall,
                    },
                    literals,
                });
            }
        }
        templates.push(rules);
    }
    Ok(templates)
}

/// Counts the votes on one trace.
fn elect(templates: &[Vec<Rule>], groups: usize, table: &[Vec<bool>], trace: usize) -> Assignment {
    let fits = |rule: &&Rule| {
        let mut literals = rule.literals.iter();
        literals.all(|(position, satisfied)| table[*position][trace] == *satisfied)
    };
    let ballots = templates
        .iter()
        .filter_map(|rules| ballot(rules.iter().filter(fits).map(|rule| rule.ballot)));
    match description::elect(ballots, groups) {
        Some((group, votes)) => Assignment {
            group: Some(group),
            votes,
        },
        None => Assignment {
            group: None,
            votes: 0,
        },
    }
}
