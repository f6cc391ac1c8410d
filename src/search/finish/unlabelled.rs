//! The end of a search without labels.

use rayon::prelude::*;

use super::super::describe::{GroupNames, describe};
use super::super::driver::Harvest;
use super::super::settings::Settings;
use super::{Finished, Founder, SHOWN, explanation, family_member, ranked};
use crate::embedding::{Embedding, embed};
use crate::grouping::{Distances, Partition, adjusted_rand, widths};
use crate::scoring::{
    Grouping, Scaling, SurrogateChance, Verdict, capped, scaled, surrogate_chance,
};
use crate::traces::TraceSet;

const SURROGATE_DRAWS: usize = 19;
/// Two groupings are nearly the same from this adjusted Rand index on.
const SAME_GROUPS: f64 = 0.8;
/// Two groupings are the same but for a trace or two; the simpler template
/// stands for both.
const EQUAL_GROUPS: f64 = 0.98;

pub(super) fn unlabelled(harvest: &Harvest, traces: &TraceSet, settings: &Settings) -> Finished {
    let (groupings, guards) = harvest.consensus.finish();
    let founders = unlabelled_founders(harvest, &groupings, traces);
    let sample = evenly(harvest, traces, 60);
    let embeddings: Vec<&Embedding> = sample.iter().collect();
    let chance = (traces.count() >= 20 && !founders.is_empty())
        .then(|| surrogate_chance(&embeddings, SURROGATE_DRAWS, settings.seed))
        .flatten();
    let mut finished = Finished::empty();
    (finished.verdict, finished.verdict_text) =
        unlabelled_verdict(chance, founders.is_empty(), traces.count());
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
            let founder = &mut founders[known].1;
            let member = family_member(kept, &harvest.kept[founder.kept], grouping.score);
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

fn unlabelled_verdict(
    chance: Option<SurrogateChance>,
    nothing: bool,
    traces: usize,
) -> (Verdict, String) {
    match (&chance, nothing) {
        _ if traces < 20 => (
            Verdict::TooFew,
            format!("{} traces are too few to tell groups from chance.", traces),
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
    }
}
