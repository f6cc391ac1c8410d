//! The end of a search: rank, gather families, describe, test against chance.

use rayon::prelude::*;

use super::describe::{Described, GroupNames, Units, describe, height_text, rule_verdicts};

use super::driver::{Harvest, Kept};
use super::family::{Family, families};
use super::outcome::{EXPLANATION_SCHEMA, Explanation, FamilyMember, HeldOut, Ranked, RankedBrief};
use super::settings::Settings;
use crate::description::{Ballot, Rule, ballot, elect, rules_on_trial};
use crate::embedding::{Embedding, embed};
use crate::grouping::{Distances, Partition, adjusted_rand, widths};
use crate::scoring::{
    Grouping, LabelChance, Scaling, Verdict, Witness, capped, label_chance, scaled,
    surrogate_chance,
};
use crate::support::short_id;
use crate::template::sentence;
use crate::traces::{Labels, TraceSet};

/// Templates that families are gathered from.
const RANKED: usize = 200;
/// Families whose rules are tried on traces they were not found on.
const ON_TRIAL: usize = 60;
/// Families shown.
const SHOWN: usize = 20;
/// Templates that vote when the search is tried on traces held out.
pub const PANEL: usize = 5;
/// Draws of the tests against chance.
const LABEL_DRAWS: usize = 199;
const SURROGATE_DRAWS: usize = 19;
/// Two embeddings are nearly the same from this RV coefficient on.
const ALIKE: f64 = 0.95;
/// Two groupings are nearly the same from this adjusted Rand index on.
const SAME_GROUPS: f64 = 0.8;
/// Two groupings are the same but for a trace or two; the simpler template
/// stands for both.
const EQUAL_GROUPS: f64 = 0.98;

/// The end of a search.
#[derive(Debug)]
pub struct Finished {
    /// The ranking.
    pub ranked: Vec<Ranked>,
    /// An explanation for each.
    pub explanations: Vec<Explanation>,
    /// How far to believe it.
    pub verdict: Verdict,
    /// The verdict in a sentence.
    pub verdict_text: String,
    /// How the first templates do on traces held out.
    pub held_out: Option<HeldOut>,
}

/// One template that stands for a family.
struct Founder {
    kept: usize,
    embedding: Embedding,
    partition: Partition,
    odd: Vec<bool>,
    score: f64,
    stability: Option<f64>,
    silhouette: f64,
    support: Option<f64>,
    /// F1 of the rules on traces they were not found on: mean over the labels,
    /// and the worst label.
    trial: Option<(f64, f64)>,
    family: Vec<FamilyMember>,
}

/// Ranks and explains what a search kept.
pub fn finish(
    harvest: &Harvest,
    traces: &TraceSet,
    held_out: Option<&TraceSet>,
    settings: &Settings,
) -> Finished {
    match traces.labels().filter(|_| settings.use_labels) {
        Some(labels) => labelled(harvest, traces, held_out, labels, settings),
        None => unlabelled(harvest, traces, settings),
    }
}

fn labelled(
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
    let mut finished = Finished {
        ranked: Vec::new(),
        explanations: Vec::new(),
        verdict: Verdict::Chance,
        verdict_text: String::new(),
        held_out: None,
    };
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
    let member = |rank: &usize| {
        let kept = &harvest.kept[first[*rank].0];
        family_member(kept, kept.score.map_or(0.0, |score| score.score))
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
                family: members.iter().map(member).collect(),
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

fn family_member(kept: &Kept, score: f64) -> FamilyMember {
    let text = kept.formula.to_string();
    FamilyMember {
        id: short_id(&text),
        text,
        score,
    }
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
                let report: &super::outcome::GroupReport = report;
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

fn unlabelled(harvest: &Harvest, traces: &TraceSet, settings: &Settings) -> Finished {
    let (groupings, guards) = harvest.consensus.finish();
    let founders = unlabelled_founders(harvest, &groupings, traces);
    let sample = evenly(harvest, traces, 60);
    let embeddings: Vec<&Embedding> = sample.iter().collect();
    let chance = (traces.count() >= 20 && !founders.is_empty())
        .then(|| surrogate_chance(&embeddings, SURROGATE_DRAWS, settings.seed))
        .flatten();
    let mut finished = Finished {
        ranked: Vec::new(),
        explanations: Vec::new(),
        verdict: Verdict::Chance,
        verdict_text: String::new(),
        held_out: None,
    };
    (finished.verdict, finished.verdict_text) = match (&chance, founders.is_empty()) {
        _ if traces.count() < 20 => (
            Verdict::TooFew,
            format!(
                "{} traces are too few to tell groups from chance.",
                traces.count()
            ),
        ),
        (_, true) => (
            Verdict::Chance,
            "No grouping passed the guards: every candidate was tiny, unstable, or gone with a \
             little noise."
                .to_owned(),
        ),
        (None, _) => (
            Verdict::Chance,
            "The test against chance could not be made.".to_owned(),
        ),
        (Some(chance), _) => {
            let test = format!(
                "surrogates of the same data without groups reached as much with p = {:.2} ({} \
                 draws, on {} templates and {} traces).",
                chance.p_value, chance.draws, chance.templates, chance.traces
            );
            if chance.p_value <= 0.05 {
                (
                    Verdict::Reliable,
                    format!("Chance does not explain the groups: {test}"),
                )
            } else {
                (Verdict::Chance, format!("Chance would do as well: {test}"))
            }
        }
    };
    for (rank, founder) in founders.iter().enumerate() {
        let names: Vec<String> = (0..founder.partition.groups).map(letters).collect();
        let names = GroupNames {
            names: &names,
            are_labels: false,
        };
        let described = describe(
            &founder.embedding,
            &founder.partition,
            &founder.odd,
            names,
            traces,
            None,
        );
        let p_value = chance.map(|chance| chance.p_value);
        let entry = ranked(rank, founder, harvest, traces, p_value);
        let evidence = unlabelled_evidence(founder, guards.noise_agreement, &finished.verdict_text);
        finished
            .explanations
            .push(explanation(&entry, founder, &described, traces, evidence));
        finished.ranked.push(entry);
    }
    finished
}

/// Embeddings of some of the templates kept, taken evenly.
fn evenly(harvest: &Harvest, traces: &TraceSet, most: usize) -> Vec<Embedding> {
    let all = harvest.kept.len();
    let count = all.min(most);
    (0..count)
        .into_par_iter()
        .filter_map(|k| embed(&harvest.kept[k * all / count].formula, traces).ok())
        .filter(|embedding| crate::scoring::has_enough_finite(embedding, 0.1))
        .collect()
}

/// Walks down the groupings: each that is not nearly the same as one before
/// founds a family; the simplest template of those with equal groups stands
/// for it, and no template stands twice.
fn unlabelled_founders(
    harvest: &Harvest,
    groupings: &[Grouping],
    traces: &TraceSet,
) -> Vec<Founder> {
    let first = &groupings[..groupings.len().min(600)];
    let like = |a: &Grouping, b: &Grouping| {
        adjusted_rand(
            &a.candidate.partition.group_of,
            &b.candidate.partition.group_of,
        )
    };
    let mut founders: Vec<(usize, Founder)> = Vec::new();
    for (at, grouping) in first.iter().enumerate() {
        if founders.len() == SHOWN {
            break;
        }
        let known = founders
            .iter()
            .position(|(at, _)| like(&first[*at], grouping) >= SAME_GROUPS);
        if let Some(known) = known {
            let kept = &harvest.kept[grouping.candidate.template];
            let member = family_member(kept, grouping.score);
            let founder = &mut founders[known].1;
            let own = founder.kept == grouping.candidate.template;
            if !own && founder.family.iter().all(|other| other.id != member.id) {
                founder.family.push(member);
            }
            continue;
        }
        let taken = |template: usize| founders.iter().any(|(_, other)| other.kept == template);
        let equal = first[at..].iter().filter(|other| {
            other.score >= 0.8 * grouping.score
                && !taken(other.candidate.template)
                && like(grouping, other) >= EQUAL_GROUPS
        });
        let simplest = equal.min_by_key(|other| other.candidate.size);
        if let Some(founder) = simplest.and_then(|g| unlabelled_founder(harvest, g, traces)) {
            founders.push((at, founder));
        }
    }
    founders.into_iter().map(|(_, founder)| founder).collect()
}

fn unlabelled_founder(
    harvest: &Harvest,
    grouping: &Grouping,
    traces: &TraceSet,
) -> Option<Founder> {
    let candidate = &grouping.candidate;
    let embedding = embed(&harvest.kept[candidate.template].formula, traces).ok()?;
    let odd = odd_traces(&embedding, &candidate.partition);
    Some(Founder {
        kept: candidate.template,
        embedding,
        partition: candidate.partition.clone(),
        odd,
        score: grouping.score,
        stability: Some(candidate.stability),
        silhouette: candidate.silhouette,
        support: Some(grouping.support),
        trial: None,
        family: Vec::new(),
    })
}

/// Traces that belong to no group: further from the others of their group than
/// three times what is usual there, and hardly nearer to them than to another
/// group.
fn odd_traces(embedding: &Embedding, partition: &Partition) -> Vec<bool> {
    let count = partition.group_of.len();
    let Some(points) = scaled(&capped(embedding), Scaling::SignedLog) else {
        return vec![false; count];
    };
    let distances = Distances::euclidean(&points);
    let widths = widths(&distances, partition);
    let mut odd = vec![false; count];
    for group in 0..partition.groups {
        let members = partition.members(group);
        let spread = |trace: usize| {
            let mut to: Vec<f64> = members
                .iter()
                .map(|o| distances.between(trace, *o))
                .collect();
            to.sort_unstable_by(f64::total_cmp);
            to[to.len() / 2]
        };
        let mut usual: Vec<f64> = members.iter().map(|trace| spread(*trace)).collect();
        usual.sort_unstable_by(f64::total_cmp);
        let limit = 3.0 * usual[usual.len() / 2];
        for trace in &members {
            odd[*trace] = spread(*trace) > limit && widths[*trace] < 0.2;
        }
    }
    odd
}

fn unlabelled_evidence(founder: &Founder, noise: f64, verdict_text: &str) -> Vec<String> {
    let mut evidence = Vec::new();
    if let (Some(stability), Some(support)) = (founder.stability, founder.support) {
        evidence.push(format!(
            "groups found again from 60 % of the traces agree with these with a mean adjusted Rand \
             index of {stability:.2}; with a little noise on the traces the agreement stays above \
             {noise:.1}."
        ));
        evidence.push(format!(
            "in the embeddings of other templates that make up {:.0} % of the weight, neighbours \
             are in one group nearly always (agreement beyond chance of 0.8 or more).",
            100.0 * support
        ));
    }
    evidence.push(verdict_text.to_owned());
    evidence
}

/// `A` to `Z`, then `AA` and on.
fn letters(number: usize) -> String {
    let letter = char::from(b'A' + (number % 26) as u8);
    match number / 26 {
        0 => letter.to_string(),
        more => format!("{}{letter}", letters(more - 1)),
    }
}

fn ranked(
    rank: usize,
    founder: &Founder,
    harvest: &Harvest,
    traces: &TraceSet,
    p_value: Option<f64>,
) -> Ranked {
    let kept = &harvest.kept[founder.kept];
    let text = kept.formula.to_string();
    let agreement = traces
        .labels()
        .filter(|_| kept.score.is_none())
        .map(|labels| adjusted_rand(&founder.partition.group_of, &labels.of_trace));
    Ranked {
        rank: rank + 1,
        id: short_id(&text),
        sentence: sentence(&kept.formula, &Units(traces)),
        text,
        size: kept.formula.size(),
        grammar: kept.grammar.clone(),
        score: founder.score,
        p_value,
        groups: founder.partition.groups,
        silhouette: founder.silhouette,
        stability: founder.stability,
        accuracy: kept.score.map(|score| score.accuracy),
        agreement_with_labels: agreement,
        same_on_data: kept.same_on_data,
        family: founder.family.clone(),
    }
}

fn explanation(
    entry: &Ranked,
    founder: &Founder,
    described: &Described,
    traces: &TraceSet,
    evidence: Vec<String>,
) -> Explanation {
    let odd = founder
        .odd
        .iter()
        .zip(traces.names())
        .filter(|(odd, _)| **odd);
    Explanation {
        schema: EXPLANATION_SCHEMA.to_owned(),
        ranked: RankedBrief {
            rank: entry.rank,
            id: entry.id.clone(),
            text: entry.text.clone(),
            sentence: entry.sentence.clone(),
            score: entry.score,
            p_value: entry.p_value,
        },
        height: height_text(&founder.embedding, traces),
        groups: described.groups.clone(),
        none: odd.map(|(_, name)| name.clone()).collect(),
        evidence,
        check: described.check,
    }
}
