//! What a search finds, as plain data: the ranking, and for each ranked
//! template its groups with their descriptions. These types are what the run
//! file stores and what `--json` prints; fields may be added, never changed.

use serde::{Deserialize, Serialize};

/// The schema of [`Ranking`].
pub const RANKING_SCHEMA: &str = "strandline-ranking/1";
/// The schema of [`Explanation`].
pub const EXPLANATION_SCHEMA: &str = "strandline-template/1";

/// Whether a search used labels.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Mode {
    /// Templates are judged by how well they separate the labels.
    Labelled,
    /// Templates are judged by the groups they find.
    Unlabelled,
}

/// The result of a search.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Ranking {
    /// [`RANKING_SCHEMA`].
    pub schema: String,
    /// About the run as a whole.
    pub run: RunFacts,
    /// The ranked templates, best first.
    pub templates: Vec<Ranked>,
}

/// About a run as a whole.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RunFacts {
    /// The program and its version.
    pub program: String,
    /// Whether labels were used.
    pub mode: Mode,
    /// The data: path as given, digest, counts.
    pub data: DataFacts,
    /// The grammars searched, in order.
    pub grammars: Vec<String>,
    /// The seed of all randomness.
    pub seed: u64,
    /// Templates that the grammars listed.
    pub templates_listed: usize,
    /// Templates left after equivalence.
    pub templates_distinct: usize,
    /// Templates whose embedding is the same on every trace, dropped.
    pub templates_constant: usize,
    /// Templates indistinguishable on this data from a simpler one, folded.
    pub templates_folded: usize,
    /// Templates scored.
    pub templates_scored: usize,
    /// Why the search stopped.
    pub stopped: String,
    /// `reliable`, `chance` or `too-few`.
    pub verdict: String,
    /// The verdict in a sentence, with what was tested against what.
    pub verdict_text: String,
    /// With hold-out: how the panel of the first templates did on traces that
    /// the search never saw.
    pub held_out: Option<HeldOut>,
    /// What was noticed about the data.
    pub findings: Vec<String>,
}

/// The data of a run.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct DataFacts {
    /// The path as it was given.
    pub path: String,
    /// SHA-256 over the files read.
    pub digest: String,
    /// Number of traces searched.
    pub traces: usize,
    /// Number of traces held out.
    pub traces_held_out: usize,
    /// Samples of the shortest and the longest trace.
    pub samples: (usize, usize),
    /// The step of the time grid.
    pub step: f64,
    /// The unit of the step; `step` where the data has no time.
    pub time_unit: String,
    /// Numeric channels.
    pub channels: Vec<String>,
    /// Flags.
    pub flags: Vec<String>,
    /// The labels, where there are any.
    pub labels: Vec<String>,
}

/// Accuracy on traces that the search never saw.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct HeldOut {
    /// Number of traces.
    pub traces: usize,
    /// Share put into the right group.
    pub accuracy: f64,
    /// Templates that voted.
    pub templates: usize,
}

/// One line of the ranking: a template that stands for its family.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Ranked {
    /// Its place, from 1.
    pub rank: usize,
    /// Its short id, made from the text.
    pub id: String,
    /// The template.
    pub text: String,
    /// The template in words.
    pub sentence: String,
    /// Its size.
    pub size: u32,
    /// The grammar that proposed it.
    pub grammar: String,
    /// What it is ranked by.
    pub score: f64,
    /// How often chance does as well, over the whole search.
    pub p_value: Option<f64>,
    /// The number of groups.
    pub groups: usize,
    /// Mean silhouette of its groups in its embedding.
    pub silhouette: f64,
    /// Stability of its groups under resampling, where groups were found.
    pub stability: Option<f64>,
    /// Cross-validated accuracy, where there are labels.
    pub accuracy: Option<f64>,
    /// Adjusted Rand index to the labels, where there are any (also where the
    /// search did not use them).
    pub agreement_with_labels: Option<f64>,
    /// How many templates are indistinguishable from it on this data.
    pub same_on_data: usize,
    /// Other templates that group the traces nearly alike.
    pub family: Vec<FamilyMember>,
    /// The id of a ranked template of which this is a special case, with a slot
    /// fixed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub special_case_of: Option<String>,
}

/// A template that says nearly the same as a ranked one.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct FamilyMember {
    /// Its short id.
    pub id: String,
    /// The template.
    pub text: String,
    /// What it would be ranked by.
    pub score: f64,
    /// How it is related to the ranked one, where one is the other with a slot
    /// fixed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub relation: Option<Relation>,
}

/// One template is another with a slot fixed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Relation {
    /// It is the ranked template with a slot fixed.
    SpecialCase,
    /// The ranked template is this one with a slot fixed.
    MoreGeneral,
}

/// One ranked template, explained.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Explanation {
    /// [`EXPLANATION_SCHEMA`].
    pub schema: String,
    /// The line of the ranking.
    #[serde(flatten)]
    pub ranked: RankedBrief,
    /// What the height is: the slot that is solved exactly.
    pub height: String,
    /// The groups.
    pub groups: Vec<GroupReport>,
    /// Odd traces that belong to no group.
    pub none: Vec<String>,
    /// What was tested, against what, with what result.
    pub evidence: Vec<String>,
    /// How many templates are indistinguishable from it on this data.
    #[serde(default)]
    pub same_on_data: usize,
    /// Other templates that group the traces nearly alike, best first.
    #[serde(default)]
    pub family: Vec<FamilyMember>,
    /// The result of re-checking every description by the naive evaluator.
    pub check: CheckReport,
}

/// The part of the ranking that an explanation repeats.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RankedBrief {
    /// Its place.
    pub rank: usize,
    /// Its short id.
    pub id: String,
    /// The template.
    pub text: String,
    /// The template in words.
    pub sentence: String,
    /// What it is ranked by.
    pub score: f64,
    /// How often chance does as well.
    pub p_value: Option<f64>,
}

/// Descriptions re-checked by the evaluator that follows the definition.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub struct CheckReport {
    /// Verdicts compared.
    pub verdicts: usize,
    /// Verdicts that differed. Anything but 0 is a fault of the program.
    pub disagreements: usize,
}

/// One group of traces.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct GroupReport {
    /// `A`, `B`, ..., or the label.
    pub name: String,
    /// The label, in a labelled search.
    pub label: Option<String>,
    /// Its traces.
    pub traces: Vec<String>,
    /// What sets it apart.
    pub description: DescriptionReport,
    /// Traces to look at.
    pub representatives: RepresentativeReport,
}

/// What sets a group apart, as a formula with numbers and in words.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct DescriptionReport {
    /// Formula with numbers.
    pub text: String,
    /// The same in words.
    pub sentence: String,
    /// Number of traces that satisfy it.
    pub support: usize,
    /// Share of those that are in the group.
    pub precision: f64,
    /// Share of the group that satisfies it.
    pub recall: f64,
    /// 95 % Wilson intervals of precision and recall.
    pub intervals: Intervals,
    /// The same figures on traces held out of the search.
    pub held_out: Option<HeldOutDescription>,
    /// The parts, all of which must hold.
    pub literals: Vec<LiteralReport>,
}

/// Precision and recall of a description on traces held out of the search.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct HeldOutDescription {
    /// Traces of the group among those held out.
    pub members: usize,
    /// Number of held-out traces that satisfy it.
    pub support: usize,
    /// Share of those that are in the group; 1 when there are none.
    pub precision: f64,
    /// Share of the group that satisfies it; 1 when there are none.
    pub recall: f64,
}

/// 95 % Wilson intervals.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Intervals {
    /// Of the precision.
    pub precision: (f64, f64),
    /// Of the recall.
    pub recall: (f64, f64),
}

/// One part of a description: a specification that must, or must not, hold.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LiteralReport {
    /// The specification.
    pub specification: String,
    /// Whether it must be satisfied (else violated).
    pub satisfied: bool,
    /// The number that decides.
    pub threshold: f64,
    /// Nearest heights seen on both sides of the threshold.
    pub gap: (Option<f64>, Option<f64>),
    /// The unit of the threshold.
    pub unit: Option<String>,
}

/// Traces to look at.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct RepresentativeReport {
    /// The trace in the middle of its group.
    pub typical: Option<String>,
    /// The trace that fits its group least.
    pub borderline: Option<String>,
}
