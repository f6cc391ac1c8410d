//! Never the same template twice.
//!
//! Two templates are the same when, whatever the data, the specifications that
//! come from filling their slots are the same set of statements (their
//! **family**). A formula says something in the weak reading, in the strong
//! one, and when it stands outermost; parts of larger templates must agree in
//! all three.
//!
//! * `language` is the e-graph's language: sorted n-ary `and` and `or`, windows
//!   as payload, atoms by number.
//! * `flags` is class data: what kind of family a class is, and how the end of
//!   a record reads it. Facts about the meaning, so merging classes joins them.
//! * `rules` is the table of equalities: name, sides, condition, reason.
//! * `normalise` applies them at the top of a formula whose parts are canonical.
//! * `seen` is the memory of a search: candidates are built from canonical
//!   parts, each is added beside its normal form, the two are united, and the
//!   e-graph is rebuilt once a layer.
//! * `brute` is the judge: families worked out value by value on short traces.
//!   A rule that has not passed it does not go in.
//!
//! A template and its negation have the same boundary, so of the two only one
//! is kept; that is decided for whole templates, never in the e-graph.

pub mod brute;
mod flags;
mod graph;
mod language;
mod normalise;
mod rules;
mod seen;

pub use flags::Flags;
pub use language::Known;
pub use rules::{Place, RULES, RuleText};
pub use seen::{Outcome, RuleStep, Seen};
