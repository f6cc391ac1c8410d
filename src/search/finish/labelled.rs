//! The end of a search with labels.

use rayon::prelude::*;

use super::super::describe::{Described, GroupNames, describe, rule_verdicts};
use super::super::driver::{Harvest, Kept};
use super::super::family::{Family, families};
use super::super::outcome::{GroupReport, HeldOut};
use super::super::settings::Settings;
use super::{Finished, Founder, PANEL, SHOWN, explanation, family_member, ranked};
use crate::description::{Ballot, Rule, ballot, elect, rules_on_trial};
use crate::embedding::{Embedding, embed};
use crate::grouping::Partition;
use crate::scoring::{LabelChance, Verdict, Witness, capped, label_chance};
use crate::traces::{Labels, TraceSet};

/// Templates that families are gathered from.
const RANKED: usize = 200;
/// Families whose rules are tried on traces they were not found on.
const ON_TRIAL: usize = 60;
/// Draws of the tests against chance.
const LABEL_DRAWS: usize = 199;
/// Two embeddings are nearly the same from this RV coefficient on.
const ALIKE: f64 = 0.95;

pub(super) fn labelled(
    harvest: &Harvest,
    traces: &TraceSet,
    held_out: Option<&TraceSet>,
    labels: &Labels,
    settings: &Settings,
) -> Finished {
    let order = labelled_order(&harvest.kept);
    let founders = labelled_founders(harvest, &order, traces, labels, settings.seed);
    let chance = chance_of(harvest, &order, &founders, traces, labels, settings);
    let names = GroupNames {
        names: &labels.names,
        are_labels: true,
    };
    let mut finished = Finished::empty();
    let mut panel: Vec<(Described, &Embedding)> = Vec::new();
    let described: Vec<Described> = founders
        .par_iter()
        .map(|founder| {
            let embedding = &founder.embedding;
            describe(
                embedding,
                &founder.partition,
                &founder.odd,
                names,
                traces,
                held_out,
            )
        })
        .collect();
    for (rank, (founder, described)) in founders.iter().zip(described).enumerate() {
        let p_value = chance.p_values.get(rank).copied();
        let entry = ranked(rank, founder, harvest, traces, p_value);
        let evidence = labelled_evidence(&harvest.kept[founder.kept], founder, &chance, rank);
        finished
            .explanations
            .push(explanation(&entry, founder, &described, traces, evidence));
        finished.ranked.push(entry);
        panel.push((described, &founder.embedding));
    }
    panel.truncate(PANEL);
    finished.held_out = held_out.and_then(|held_out| try_panel(&panel, traces, held_out));
    (finished.verdict, finished.verdict_text) = labelled_verdict(&finished, labels, &chance);
    finished
}

/// Positions of the kept templates, best first.
fn labelled_order(kept: &[Kept]) -> Vec<usize> {
    let score = |at: &usize| {
        kept[*at]
            .score
            .map_or(f64::NEG_INFINITY, |score| score.score)
    };
    let mut order: Vec<usize> = (0..kept.len()).collect();
    order.sort_by(|a, b| {
        score(b)
            .total_cmp(&score(a))
            .then(kept[*a].formula.size().cmp(&kept[*b].formula.size()))
            .then(a.cmp(b))
    });
    order
}

fn labelled_founders(
    harvest: &Harvest,
    order: &[usize],
    traces: &TraceSet,
    labels: &Labels,
    seed: u64,
) -> Vec<Founder> {
    let first: Vec<(usize, Embedding)> = order[..order.len().min(RANKED)]
        .par_iter()
        .filter_map(|kept| Some((*kept, embed(&harvest.kept[*kept].formula, traces).ok()?)))
        .collect();
    let views: Vec<Option<Witness>> = first
        .par_iter()
        .map(|(kept, embedding)| Witness::new(*kept, &capped(embedding)))
        .collect();
    let alike = |a: usize, b: usize| match (&views[a], &views[b]) {
        (Some(a), Some(b)) => a.likeness(b) >= ALIKE,
        _ => false,
    };
    let member = |rank: &usize, founder: usize| {
        let kept = &harvest.kept[first[*rank].0];
        family_member(
            kept,
            &harvest.kept[founder],
            kept.score.map_or(0.0, |score| score.score),
        )
    };
    let mut founders: Vec<Founder> = families(first.len(), alike)
        .into_iter()
        .take(ON_TRIAL)
        .map(|Family { founder, members }| {
            let (kept, embedding) = &first[founder];
            let score = harvest.kept[*kept].score;
            Founder {
                kept: *kept,
                embedding: embedding.clone(),
                partition: Partition {
                    group_of: labels.of_trace.clone(),
                    groups: labels.names.len(),
                },
                odd: vec![false; traces.count()],
                score: score.map_or(0.0, |score| score.score),
                stability: None,
                silhouette: score.map_or(0.0, |score| score.silhouette),
                support: None,
                trial: None,
                family: members.iter().map(|rank| member(rank, *kept)).collect(),
            }
        })
        .collect();
    put_on_trial(&mut founders, traces, labels, seed);
    founders.truncate(SHOWN);
    founders
}

/// Tries the rules of each founder on traces they were not found on, and ranks
/// again: the score is raised by the mean of the labels' F1 and that of the
/// worst label.
fn put_on_trial(founders: &mut [Founder], traces: &TraceSet, labels: &Labels, seed: u64) {
    founders.par_iter_mut().for_each(|founder| {
        let f1 = rules_on_trial(&founder.embedding, labels, traces.grid(), seed);
        let mean = f1.iter().sum::<f64>() / f1.len().max(1) as f64;
        let worst = f1.iter().copied().fold(1.0, f64::min);
        founder.score += f64::midpoint(mean, worst);
        founder.trial = Some((mean, worst));
    });
    founders.sort_by(|a, b| {
        let size = |founder: &Founder| founder.embedding.formula.size();
        b.score
            .total_cmp(&a.score)
            .then(size(a).cmp(&size(b)))
            .then(a.kept.cmp(&b.kept))
    });
}

/// The test against shuffled labels, on the templates shown and on a sample
/// of the others, taken evenly down the ranking.
fn chance_of(
    harvest: &Harvest,
    order: &[usize],
    founders: &[Founder],
    traces: &TraceSet,
    labels: &Labels,
    settings: &Settings,
) -> LabelChance {
    let shown: Vec<usize> = founders.iter().map(|founder| founder.kept).collect();
    let others: Vec<usize> = order
        .iter()
        .copied()
        .filter(|kept| !shown.contains(kept))
        .collect();
    let count = others.len().min(300 - SHOWN);
    let sample: Vec<Embedding> = (0..count)
        .into_par_iter()
        .map(|k| others[k * others.len() / count])
        .filter_map(|kept| embed(&harvest.kept[kept].formula, traces).ok())
        .collect();
    let embeddings: Vec<&Embedding> = founders
        .iter()
        .map(|founder| &founder.embedding)
        .chain(&sample)
        .collect();
    let searched = harvest.counts.scored;
    label_chance(
        &embeddings,
        founders.len(),
        searched,
        labels,
        LABEL_DRAWS,
        settings.seed,
    )
}

fn labelled_evidence(
    kept: &Kept,
    founder: &Founder,
    chance: &LabelChance,
    rank: usize,
) -> Vec<String> {
    let mut evidence = Vec::new();
    if let Some((mean, worst)) = founder.trial {
        evidence.push(format!(
            "rules of this kind, found on four fifths of the traces and tried on the rest, have a \
             mean F1 of {mean:.3} over the labels and {worst:.3} for the worst one."
        ));
    }
    if let Some(score) = kept.score {
        evidence.push(format!(
            "a short tree of literals of this template put {:.1} % of the traces under their label \
             in 5-fold cross-validation, the nearest trace in its embedding {:.1} %; the silhouette \
             of the labels is {:.2}.",
            100.0 * score.accuracy,
            100.0 * score.neighbour,
            score.silhouette
        ));
    }
    if let Some(p) = chance.p_values.get(rank) {
        evidence.push(format!(
            "with labels shuffled {} times, the best silhouette among {} templates reached this \
             one's with p = {p:.3} (raised to the number of templates searched).",
            chance.draws, chance.looked_at
        ));
    }
    evidence
}

fn labelled_verdict(
    finished: &Finished,
    labels: &Labels,
    chance: &LabelChance,
) -> (Verdict, String) {
    let mut sizes = vec![0; labels.names.len()];
    labels.of_trace.iter().for_each(|label| sizes[*label] += 1);
    let smallest = sizes.iter().copied().min().unwrap_or(0);
    let best = chance.p_values.iter().copied().fold(1.0, f64::min);
    let few = if smallest < 10 {
        format!(
            " The smallest label has {smallest} traces; with fewer than 10, treat thresholds with care."
        )
    } else {
        String::new()
    };
    if finished.ranked.is_empty() {
        return (
            Verdict::Chance,
            "No template tells the traces apart.".to_owned(),
        );
    }
    if labels.of_trace.len() < 12 || smallest < 3 {
        return (
            Verdict::TooFew,
            format!(
                "With {} traces and {smallest} in the smallest label, a perfect rule is found by \
                 chance more often than not.",
                labels.of_trace.len()
            ),
        );
    }
    let test = format!(
        "shuffled labels reached the best template's silhouette with p = {best:.3} ({} shuffles, \
         {} templates, raised to the whole search).",
        chance.draws, chance.looked_at
    );
    if best <= 0.05 {
        (
            Verdict::Reliable,
            format!("Chance does not explain the separation: {test}{few}"),
        )
    } else {
        (
            Verdict::Chance,
            format!("Chance would do as well: {test}{few}"),
        )
    }
}

/// How a panel does on traces held out.
fn try_panel(
    panel: &[(Described, &Embedding)],
    traces: &TraceSet,
    held_out: &TraceSet,
) -> Option<HeldOut> {
    let labels = held_out.labels()?;
    // For each template, each rule with its ballot and its verdicts.
    let tables: Vec<Vec<(Ballot, Vec<bool>)>> = panel
        .iter()
        .map(|(described, embedding)| {
            let rules = described.rules.iter().zip(&described.groups).enumerate();
            let table = |(group, (rule, report)): (usize, (&Option<Rule>, _))| {
                let report: &GroupReport = report;
                let verdicts = rule_verdicts(rule.as_ref()?, embedding, traces.grid(), held_out)?;
                let ballot = Ballot {
                    group,
                    precision: report.description.precision,
                    recall: report.description.recall,
                };
                Some((ballot, verdicts))
            };
            rules.filter_map(table).collect()
        })
        .collect();
    let right = (0..held_out.count())
        .filter(|trace| {
            let ballots = tables.iter().filter_map(|table| {
                ballot(
                    table
                        .iter()
                        .filter(|(_, holds)| holds[*trace])
                        .map(|(ballot, _)| *ballot),
                )
            });
            let group = elect(ballots, labels.names.len()).map(|(group, _)| group);
            group == Some(labels.of_trace[*trace])
        })
        .count();
    Some(HeldOut {
        traces: held_out.count(),
        accuracy: right as f64 / held_out.count() as f64,
        templates: panel.len(),
    })
}
