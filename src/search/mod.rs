//! The search: from traces and grammars to ranked, described templates.

mod budget;
mod family;
mod fold;
mod hold_out;
mod noise;
mod outcome;

pub use budget::{Budget, Limits, StopReason};
pub use family::{Family, families};
pub use fold::{Folder, Novelty};
pub use hold_out::hold_out;
pub use noise::noisy_copy;
pub use outcome::{
    CheckReport, DataFacts, DescriptionReport, EXPLANATION_SCHEMA, Explanation, FamilyMember,
    GroupReport, HeldOut, HeldOutDescription, Intervals, LiteralReport, Mode, RANKING_SCHEMA,
    Ranked, RankedBrief, Ranking, RepresentativeReport, RunFacts,
};
