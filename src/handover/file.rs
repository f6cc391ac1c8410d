//! The hand-over file in JSON: what it holds, and reading it with care.

use serde::{Deserialize, Serialize};

use crate::search::{Explanation, LiteralReport, Ranking};
use crate::template::{Direction, Formula, Kind, SlotKind, TextError, parse};

/// The schema this version writes and reads.
pub const HANDOVER_SCHEMA: &str = "strandline-handover/1";

/// How formulas are read at the end of a record; stands in every file.
const READINGS: &str = "Time is a uniform grid and a formula is judged at the first sample. Beyond \
    the record, and at samples that are not known, every formula counts as satisfied in the weak \
    reading and as violated in the strong one. An outermost temporal operator, and every one with \
    `end`, reads its operand weak if it is `throughout`, strong if it is `sometime`; for `until` \
    the left side weak and the right side strong. All other operators hand on the reading they \
    stand in; an atom under no temporal operator is read weak. Bounds are taken inward to whole \
    steps. `f until [a, b] g` needs g at some instant of the window and f from now until just \
    before it.";

/// What must be said wherever a description goes.
const CAUTION: &str = "These rules were found in recorded traces. They are statements about those \
    traces: not requirements, and no proof of safety. Limits for lifting, pressure, heat, medical \
    or vehicle equipment come from the applicable codes and from qualified people.";

/// A hand-over file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Handover {
    /// [`HANDOVER_SCHEMA`].
    pub schema: String,
    /// What must be said wherever this file goes.
    pub caution: String,
    /// Where the rules come from.
    pub provenance: Provenance,
    /// The time grid of the traces they were found on.
    pub grid: GridFacts,
    /// How formulas are read at the end of a record.
    pub readings: String,
    /// The signals that the rules read.
    pub signals: Vec<SignalFacts>,
    /// The names of the groups.
    pub groups: Vec<String>,
    /// The templates that vote, each with its rules.
    pub templates: Vec<TemplateRules>,
}

/// Where rules come from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Provenance {
    /// The program and its version.
    pub program: String,
    /// The path of the traces, as it was given.
    pub data: String,
    /// SHA-256 over the files read.
    pub digest: String,
    /// The number of traces searched.
    pub traces: usize,
    /// The seed.
    pub seed: u64,
    /// The grammars.
    pub grammars: Vec<String>,
    /// `labelled` or `unlabelled`.
    pub mode: String,
    /// The verdict on the run.
    pub verdict: String,
    /// The verdict in a sentence.
    pub verdict_text: String,
}

/// A time grid.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct GridFacts {
    /// The step, in the unit.
    pub step: f64,
    /// The unit of time; `step` where the data has no time.
    pub unit: String,
}

/// A signal that the rules read.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SignalFacts {
    /// Its text in the language.
    pub text: String,
    /// `channel` or `flag`.
    pub kind: String,
    /// Its unit, where one is known.
    pub unit: Option<String>,
    /// Whether it can be computed while the record is being made.
    pub live: bool,
}

/// A slot of a template.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SlotFacts {
    /// `?1`, `?2`, ...
    pub name: String,
    /// `threshold` or `time`.
    pub kind: String,
    /// For a threshold, the signal that it limits.
    pub signal: Option<String>,
    /// What a larger value does: `easier` or `harder` to satisfy.
    pub larger_is: String,
}

/// A template with a rule for each group.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TemplateRules {
    /// Its short id.
    pub id: String,
    /// The template.
    pub text: String,
    /// The template in words.
    pub sentence: String,
    /// Its slots, in the order of the text.
    pub slots: Vec<SlotFacts>,
    /// The rules.
    pub rules: Vec<GroupRule>,
    /// What was tested, against what, with what result.
    pub evidence: Vec<String>,
}

/// What sets a group apart.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct GroupRule {
    /// The group.
    pub group: String,
    /// Formula with numbers.
    pub text: String,
    /// The same in words.
    pub sentence: String,
    /// Number of traces that satisfied it.
    pub support: usize,
    /// Share of those that were in the group.
    pub precision: f64,
    /// Share of the group that satisfied it.
    pub recall: f64,
    /// The parts, all of which must hold.
    pub literals: Vec<LiteralReport>,
}

/// A hand-over file that cannot be used.
#[derive(Debug, thiserror::Error)]
pub enum HandoverError {
    /// Not JSON, or a field is missing or of the wrong type.
    #[error("not a strandline hand-over file: {0}")]
    Shape(#[from] serde_json::Error),
    /// A schema this version does not read.
    #[error("the schema `{0}` is unknown; this version reads `{HANDOVER_SCHEMA}`")]
    Schema(String),
    /// A formula in it cannot be read.
    #[error("a formula in the file cannot be read:\n{0}")]
    Formula(String),
    /// A rule names a group that the file does not list, or has no parts.
    #[error("{0}")]
    Meaning(String),
}

impl Handover {
    /// A panel of the given templates. `unit` gives the unit of a signal.
    pub fn new(
        ranking: &Ranking,
        chosen: &[Explanation],
        unit: impl Fn(&crate::template::Signal) -> Option<String>,
    ) -> Result<Self, TextError> {
        let run = &ranking.run;
        let mut signals: Vec<SignalFacts> = Vec::new();
        let mut templates = Vec::new();
        for explanation in chosen {
            let formula = parse(&explanation.ranked.text)?;
            for signal in formula.signals() {
                let facts = SignalFacts {
                    text: signal.to_string(),
                    kind: kind_name(signal.kind()).to_owned(),
                    unit: unit(&signal),
                    live: signal.is_live(),
                };
                if !signals.contains(&facts) {
                    signals.push(facts);
                }
            }
            templates.push(TemplateRules::new(explanation, &formula));
        }
        let groups = chosen
            .first()
            .map(|first| {
                first
                    .groups
                    .iter()
                    .map(|group| group.name.clone())
                    .collect()
            })
            .unwrap_or_default();
        Ok(Handover {
            schema: HANDOVER_SCHEMA.to_owned(),
            caution: CAUTION.to_owned(),
            provenance: Provenance {
                program: run.program.clone(),
                data: run.data.path.clone(),
                digest: run.data.digest.clone(),
                traces: run.data.traces,
                seed: run.seed,
                grammars: run.grammars.clone(),
                mode: format!("{:?}", run.mode).to_lowercase(),
                verdict: run.verdict.clone(),
                verdict_text: run.verdict_text.clone(),
            },
            grid: GridFacts {
                step: run.data.step,
                unit: run.data.time_unit.clone(),
            },
            readings: READINGS.to_owned(),
            signals,
            groups,
            templates,
        })
    }

    /// Reads a file's text.
    ///
    /// # Errors
    /// When it is not a hand-over file of this version, or says something that
    /// has no meaning.
    pub fn read(text: &str) -> Result<Self, HandoverError> {
        let value: serde_json::Value = serde_json::from_str(text)?;
        if let Some(schema) = value.get("schema").and_then(serde_json::Value::as_str)
            && schema != HANDOVER_SCHEMA
        {
            return Err(HandoverError::Schema(schema.to_owned()));
        }
        let handover = Handover::deserialize(value)?;
        handover.check()?;
        Ok(handover)
    }

    fn check(&self) -> Result<(), HandoverError> {
        for rule in self.templates.iter().flat_map(|template| &template.rules) {
            if !self.groups.contains(&rule.group) {
                let name = &rule.group;
                return Err(HandoverError::Meaning(format!(
                    "a rule is for the group `{name}`, which the file does not list"
                )));
            }
            if rule.literals.is_empty() {
                let name = &rule.group;
                return Err(HandoverError::Meaning(format!(
                    "a rule for the group `{name}` has no parts"
                )));
            }
            for literal in &rule.literals {
                literal.formula()?;
            }
        }
        Ok(())
    }
}

impl LiteralReport {
    /// The specification as a formula.
    ///
    /// # Errors
    /// When its text cannot be read, or it has a slot.
    pub fn formula(&self) -> Result<Formula, HandoverError> {
        let formula = parse(&self.specification).map_err(|error| {
            HandoverError::Formula(error.draw(&self.specification, "specification"))
        })?;
        if formula.is_specification() {
            Ok(formula)
        } else {
            let text = &self.specification;
            Err(HandoverError::Meaning(format!(
                "`{text}` has a slot that is not filled"
            )))
        }
    }
}

impl TemplateRules {
    fn new(explanation: &Explanation, formula: &Formula) -> Self {
        let slots = formula
            .slots()
            .iter()
            .enumerate()
            .map(|(position, slot)| SlotFacts {
                name: format!("?{}", position + 1),
                kind: match slot.kind {
                    SlotKind::Threshold(_) => "threshold".to_owned(),
                    SlotKind::Time => "time".to_owned(),
                },
                signal: match &slot.kind {
                    SlotKind::Threshold(signal) => Some(signal.to_string()),
                    SlotKind::Time => None,
                },
                larger_is: match slot.direction {
                    Direction::LargerIsEasier => "easier".to_owned(),
                    Direction::LargerIsHarder => "harder".to_owned(),
                },
            })
            .collect();
        let rules = explanation
            .groups
            .iter()
            .filter(|group| !group.description.literals.is_empty())
            .map(|group| GroupRule {
                group: group.name.clone(),
                text: group.description.text.clone(),
                sentence: group.description.sentence.clone(),
                support: group.description.support,
                precision: group.description.precision,
                recall: group.description.recall,
                literals: group.description.literals.clone(),
            })
            .collect();
        TemplateRules {
            id: explanation.ranked.id.clone(),
            text: explanation.ranked.text.clone(),
            sentence: explanation.ranked.sentence.clone(),
            slots,
            rules,
            evidence: explanation.evidence.clone(),
        }
    }
}

fn kind_name(kind: Kind) -> &'static str {
    match kind {
        Kind::Numeric => "channel",
        Kind::Flag => "flag",
    }
}
