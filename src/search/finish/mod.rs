//! The end of a search: rank, gather families, describe, test against chance.

mod labelled;
mod unlabelled;

use super::describe::{Described, Units, height_text};
use super::driver::{Harvest, Kept};
use super::family::parents;
use super::outcome::{
    EXPLANATION_SCHEMA, Explanation, FamilyMember, HeldOut, Ranked, RankedBrief, Relation,
};
use super::settings::Settings;
use crate::embedding::Embedding;
use crate::grouping::{Partition, adjusted_rand};
use crate::scoring::Verdict;
use crate::support::short_id;
use crate::template::{Formula, is_special_case, sentence};
use crate::traces::TraceSet;

/// Families shown.
const SHOWN: usize = 20;
/// Templates that vote when the search is tried on traces held out.
pub const PANEL: usize = 5;

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

impl Finished {
    /// Nothing found yet.
    fn empty() -> Self {
        Finished {
            ranked: Vec::new(),
            explanations: Vec::new(),
            verdict: Verdict::Chance,
            verdict_text: String::new(),
            held_out: None,
        }
    }
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
    let mut finished = match traces.labels().filter(|_| settings.use_labels) {
        Some(labels) => labelled::labelled(harvest, traces, held_out, labels, settings),
        None => unlabelled::unlabelled(harvest, traces, settings),
    };
    relate(&mut finished.ranked, harvest);
    finished
}

/// Says of each ranked template of which other one it is a special case: the
/// least general one, so that a chain reads step by step.
fn relate(ranked: &mut [Ranked], harvest: &Harvest) {
    let formula = |entry: &Ranked| {
        let kept = harvest.kept.iter();
        let mut fitting = kept.filter(|kept| short_id(&kept.formula.to_string()) == entry.id);
        fitting.next().map(|kept| kept.formula.clone())
    };
    let formulas: Vec<Option<Formula>> = ranked.iter().map(formula).collect();
    let parents = parents(&formulas);
    for (place, parent) in parents.into_iter().enumerate() {
        ranked[place].special_case_of = parent.map(|parent| ranked[parent].id.clone());
    }
}

/// A member of the family of a founder.
fn family_member(kept: &Kept, founder: &Kept, score: f64) -> FamilyMember {
    let text = kept.formula.to_string();
    let relation = if is_special_case(&kept.formula, &founder.formula) {
        Some(Relation::SpecialCase)
    } else if is_special_case(&founder.formula, &kept.formula) {
        Some(Relation::MoreGeneral)
    } else {
        None
    };
    FamilyMember {
        id: short_id(&text),
        text,
        score,
        relation,
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
        special_case_of: None,
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
        same_on_data: entry.same_on_data,
        family: entry.family.clone(),
        check: described.check,
    }
}
