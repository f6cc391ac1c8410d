//! How well rules found on some traces hold on others: cross-validation of the
//! descriptions themselves.
//!
//! A template can tell labels apart by a hair, with thresholds that happen to
//! fit. So before templates are shown, their rules are found again on four
//! fifths of the traces and tried on the rest, each fifth in turn.

use super::literal::LiteralSearch;
use super::rule::{Quality, rule_among};
use crate::embedding::Embedding;
use crate::scoring::stratified_folds;
use crate::support::Stream;
use crate::traces::{Grid, Labels};

/// Folds.
const FOLDS: usize = 5;

/// F1 of each label's rule on traces that it was not found on.
pub fn rules_on_trial(embedding: &Embedding, labels: &Labels, grid: &Grid, seed: u64) -> Vec<f64> {
    let search = LiteralSearch::new(embedding, grid);
    let mut stream = Stream::new(seed, "trial", 0);
    let fold = stratified_folds(&labels.of_trace, labels.names.len(), FOLDS, &mut stream);
    (0..labels.names.len())
        .map(|label| {
            let member = |trace: usize| labels.of_trace[trace] == label;
            let mut verdicts: Vec<(bool, bool)> = Vec::with_capacity(fold.len());
            for held in 0..FOLDS {
                let training: Vec<bool> = fold.iter().map(|fold| *fold != held).collect();
                let members: Vec<bool> = training
                    .iter()
                    .enumerate()
                    .map(|(i, used)| *used && member(i))
                    .collect();
                let rule = rule_among(&search, &members, &training);
                let tried = (0..fold.len()).filter(|trace| !training[*trace]);
                verdicts.extend(tried.map(|trace| {
                    let holds = rule
                        .as_ref()
                        .is_some_and(|rule| rule.holds(embedding, trace));
                    (holds, member(trace))
                }));
            }
            Quality::of(verdicts.into_iter()).f1()
        })
        .collect()
}
