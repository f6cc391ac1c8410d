//! What a grammar can say, for a person: rules, counts, an example of each.

use std::ops::ControlFlow;

use serde::Serialize;

use super::count::{count, count_piece};
use super::enumerate::{Enumerator, Identity};
use super::file::{Alternative, Grammar, Rule};
use super::palette::Palette;
use super::production::{ProductionError, productions};
use crate::template::sentence;

/// What a grammar can say.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct GrammarReport {
    /// Its name.
    pub name: String,
    /// Channels and flags counted with.
    pub channels: usize,
    /// See `channels`.
    pub flags: usize,
    /// Number of templates by size: pairs of size and number, without zeros.
    pub counts: Vec<(usize, String)>,
    /// All of them.
    pub total: String,
    /// The alternatives of the goal.
    pub rules: Vec<RuleReport>,
    /// What looks useless but may be meant.
    pub warnings: Vec<String>,
}

/// One alternative of the goal.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct RuleReport {
    /// The alternative as written.
    pub name: String,
    /// Number of templates.
    pub templates: String,
    /// The first of them.
    pub example: String,
    /// The same in words.
    pub sentence: String,
}

/// Looks a grammar over on a palette.
///
/// # Errors
/// When rules do not fit together.
pub fn report(grammar: &Grammar, palette: &Palette) -> Result<GrammarReport, ProductionError> {
    let counts = count(grammar, palette, None)?;
    let mut rules = Vec::new();
    for alternative in &grammar.rules[grammar.goal].alternatives {
        rules.push(rule_report(grammar, palette, alternative)?);
    }
    Ok(GrammarReport {
        name: grammar.name.clone(),
        channels: palette.channels.len(),
        flags: palette.flags.len(),
        total: counts.total().to_string(),
        counts: counts
            .of
            .iter()
            .enumerate()
            .filter(|(_, count)| **count > 0)
            .map(|(size, count)| (size, count.to_string()))
            .collect(),
        rules,
        warnings: grammar.warnings.clone(),
    })
}

/// The grammar with one alternative of the goal only.
fn rule_report(
    grammar: &Grammar,
    palette: &Palette,
    alternative: &Alternative,
) -> Result<RuleReport, ProductionError> {
    let mut alone = grammar.clone();
    alone.rules[grammar.goal] = Rule {
        alternatives: vec![alternative.clone()],
        ..grammar.rules[grammar.goal].clone()
    };
    let found = productions(&alone, palette)?;
    let counts = count_piece(&found, grammar.limits, None, found.goal);
    let mut enumerator = Enumerator::new(&alone, palette)?;
    let mut example = None;
    for (size, _) in counts
        .of
        .iter()
        .enumerate()
        .filter(|(_, count)| **count > 0)
    {
        let _ = enumerator.for_each(size as u32, &mut Identity, |_, formula| {
            example = Some(formula);
            ControlFlow::Break(())
        });
        if example.is_some() {
            break;
        }
    }
    let span = &alternative.ast.span;
    Ok(RuleReport {
        name: grammar.text[span.start..span.end]
            .split_whitespace()
            .collect::<Vec<_>>()
            .join(" "),
        templates: counts.total().to_string(),
        example: example
            .as_ref()
            .map(ToString::to_string)
            .unwrap_or_default(),
        sentence: example
            .map(|formula| sentence(&formula, &()))
            .unwrap_or_default(),
    })
}
