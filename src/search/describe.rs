//! From a template and a partition of the traces to an explanation.

use super::outcome::{
    CheckReport, DescriptionReport, GroupReport, HeldOutDescription, Intervals, LiteralReport,
    RepresentativeReport,
};
use crate::description::{
    Check, LiteralSearch, Quality, Rule, representatives, rule, rule_text, verify,
};
use crate::embedding::{Embedding, verdicts};
use crate::grouping::{Distances, Partition};
use crate::scoring::{Scaling, capped, scaled, wilson};
use crate::support::TraceId;
use crate::template::{Formula, Signal, SlotKind, Words};
use crate::traces::TraceSet;

/// Units of a trace set's signals, for sentences.
#[derive(Debug, Clone, Copy)]
pub struct Units<'a>(pub &'a TraceSet);

impl Words for Units<'_> {
    fn unit(&self, signal: &Signal) -> Option<String> {
        let id = self.0.signal_id(signal)?;
        self.0.channel(id).unit.as_deref().map(str::to_owned)
    }
}

/// The groups of a partition, described by rules of one template.
#[derive(Debug)]
pub struct Described {
    /// A rule for each group; `None` where nothing sets it apart.
    pub rules: Vec<Option<Rule>>,
    /// The groups as they are reported.
    pub groups: Vec<GroupReport>,
    /// The result of checking every description again.
    pub check: CheckReport,
}

/// What groups are called.
#[derive(Debug, Clone, Copy)]
pub struct GroupNames<'a> {
    /// The names.
    pub names: &'a [String],
    /// Whether they are labels.
    pub are_labels: bool,
}

/// Describes the groups of a partition. `odd[i]` says that trace i belongs to
/// none of them; `held_out` are traces with labels that the search never saw.
pub fn describe(
    embedding: &Embedding,
    partition: &Partition,
    odd: &[bool],
    names: GroupNames<'_>,
    traces: &TraceSet,
    held_out: Option<&TraceSet>,
) -> Described {
    let search = LiteralSearch::new(embedding, traces.grid());
    let points = scaled(&capped(embedding), Scaling::SignedLog);
    let chosen = match &points {
        Some(points) => representatives(&Distances::euclidean(points), partition),
        None => vec![None; partition.groups],
    };
    let mut check = Check::default();
    let mut rules = Vec::new();
    let mut groups = Vec::new();
    for (group, typical) in chosen.iter().enumerate() {
        let members: Vec<bool> = partition
            .group_of
            .iter()
            .zip(odd)
            .map(|(own, odd)| *own == group && !odd)
            .collect();
        let rule = rule(&search, &members);
        let description = match &rule {
            Some(rule) => {
                let own = verify(rule, embedding, traces).unwrap_or(Check {
                    verdicts: 1,
                    disagreements: 1,
                });
                check = check.and(own);
                let held_out = held_out.filter(|_| names.are_labels);
                description(
                    rule,
                    embedding,
                    &members,
                    traces,
                    held_out.map(|h| (h, group)),
                )
            }
            None => nothing(&members),
        };
        let name = |trace: usize| traces.names()[trace].clone();
        groups.push(GroupReport {
            name: names.names[group].clone(),
            label: names.are_labels.then(|| names.names[group].clone()),
            traces: (0..members.len())
                .filter(|i| members[*i])
                .map(name)
                .collect(),
            description,
            representatives: RepresentativeReport {
                typical: typical.map(|chosen| name(chosen.typical)),
                borderline: typical.map(|chosen| name(chosen.borderline)),
            },
        });
        rules.push(rule);
    }
    Described {
        rules,
        groups,
        check: CheckReport {
            verdicts: check.verdicts,
            disagreements: check.disagreements,
        },
    }
}

fn description(
    rule: &Rule,
    embedding: &Embedding,
    members: &[bool],
    traces: &TraceSet,
    held_out: Option<(&TraceSet, usize)>,
) -> DescriptionReport {
    let grid = traces.grid();
    let (text, sentence) = rule_text(rule, embedding, grid, &Units(traces));
    let quality = rule.quality(embedding, members);
    let literals = rule
        .literals
        .iter()
        .map(|literal| LiteralReport {
            specification: literal.specification(embedding, grid).to_string(),
            satisfied: literal.satisfied,
            threshold: in_unit(embedding, literal.height, traces),
            gap: (
                finite(in_unit(embedding, literal.gap.0, traces)),
                finite(in_unit(embedding, literal.gap.1, traces)),
            ),
            unit: unit(embedding, traces),
        })
        .collect();
    DescriptionReport {
        text,
        sentence,
        support: quality.support,
        precision: quality.precision(),
        recall: quality.recall(),
        intervals: Intervals {
            precision: wilson(quality.hits, quality.support),
            recall: wilson(quality.hits, quality.members),
        },
        held_out: held_out
            .and_then(|(held_out, group)| on_held_out(rule, embedding, grid, held_out, group)),
        literals,
    }
}

/// A group that no literal sets apart.
fn nothing(members: &[bool]) -> DescriptionReport {
    let count = members.iter().filter(|member| **member).count();
    DescriptionReport {
        text: String::new(),
        sentence: "Nothing in this template sets the group apart.".to_owned(),
        support: 0,
        precision: 1.0,
        recall: 0.0,
        intervals: Intervals {
            precision: (0.0, 1.0),
            recall: wilson(0, count),
        },
        held_out: None,
        literals: Vec::new(),
    }
}

/// The verdict of a rule on every trace of another set, by the evaluator that
/// follows the definition. `None` when the set lacks something.
pub(super) fn rule_verdicts(
    rule: &Rule,
    embedding: &Embedding,
    grid: &crate::traces::Grid,
    traces: &TraceSet,
) -> Option<Vec<bool>> {
    let mut holds = vec![true; traces.count()];
    for literal in &rule.literals {
        let formula: Formula = literal.specification(embedding, grid);
        for (holds, verdict) in holds.iter_mut().zip(verdicts(&formula, traces).ok()?) {
            *holds &= verdict == literal.satisfied;
        }
    }
    Some(holds)
}

fn on_held_out(
    rule: &Rule,
    embedding: &Embedding,
    grid: &crate::traces::Grid,
    held_out: &TraceSet,
    group: usize,
) -> Option<HeldOutDescription> {
    let labels = held_out.labels()?;
    let holds = rule_verdicts(rule, embedding, grid, held_out)?;
    let member = |trace: TraceId| labels.of_trace[trace.index()] == group;
    let pairs = held_out
        .traces()
        .map(|trace| (holds[trace.index()], member(trace)));
    let quality = Quality::of(pairs);
    Some(HeldOutDescription {
        members: quality.members,
        support: quality.support,
        precision: quality.precision(),
        recall: quality.recall(),
    })
}

/// A height in the unit of its slot: times from steps to the data's unit.
fn in_unit(embedding: &Embedding, height: f64, traces: &TraceSet) -> f64 {
    match embedding.formula.slot(embedding.height).kind {
        SlotKind::Threshold(_) => height,
        SlotKind::Time => traces.grid().duration(height),
    }
}

fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

fn unit(embedding: &Embedding, traces: &TraceSet) -> Option<String> {
    match &embedding.formula.slot(embedding.height).kind {
        SlotKind::Threshold(signal) => Units(traces).unit(signal),
        SlotKind::Time => Some(traces.grid().unit.name().to_owned()).filter(|n| !n.is_empty()),
    }
}

/// What the height of a template is, in words.
pub(super) fn height_text(embedding: &Embedding, traces: &TraceSet) -> String {
    let number = embedding.height.index() + 1;
    let unit = unit(embedding, traces)
        .map(|unit| format!(", in {unit}"))
        .unwrap_or_default();
    let what = match &embedding.formula.slot(embedding.height).kind {
        SlotKind::Threshold(signal) => format!("the level of {signal}"),
        SlotKind::Time => "a time".to_owned(),
    };
    let grid = match embedding.axes.len() {
        0 => String::new(),
        _ => format!(
            ", solved exactly at {} grid point(s) of the other slot(s)",
            embedding.columns.len()
        ),
    };
    format!("?{number}, {what}{unit}{grid}")
}
