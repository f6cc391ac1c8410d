//! The search: from traces and grammars to ranked, described templates.
//!
//! [`harvest`] is the loop: list, drop, embed, score, batch by batch, watched
//! by an [`Observer`] that stores each batch. [`finish`] ranks what was kept,
//! gathers families, describes groups and tests against chance. What comes out
//! is the plain data of `outcome`, which the run file stores and `--json`
//! prints. Nothing here touches a file, and only `budget` looks at a clock.

mod budget;
mod describe;
mod driver;
mod family;
mod finish;
mod fold;
mod hold_out;
mod noise;
mod outcome;
mod settings;

pub use budget::{Budget, Limits, StopReason};
pub use describe::{Described, GroupNames, Units, describe};
pub use driver::{BatchRecord, Counts, Harvest, Kept, Observer, SearchError, harvest};
pub use family::{Family, families};
pub use finish::{Finished, PANEL, finish};
pub use fold::{Folder, Novelty};
pub use hold_out::hold_out;
pub use noise::noisy_copy;
pub use outcome::{
    CheckReport, DataFacts, DescriptionReport, EXPLANATION_SCHEMA, Explanation, FamilyMember,
    GroupReport, HeldOut, HeldOutDescription, Intervals, LiteralReport, Mode, RANKING_SCHEMA,
    Ranked, RankedBrief, Ranking, Relation, RepresentativeReport, RunFacts,
};
pub use settings::{Settings, palette};
