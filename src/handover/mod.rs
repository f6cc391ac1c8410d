//! Hand-over: chosen templates as files for other programs, and new traces
//! sorted by such a file.
//!
//! A hand-over file holds a **panel**: one template or several, each with a
//! rule for every group. A rule is a list of specifications that must hold, or
//! must not. A template votes for the group whose rule fits a trace (for the
//! rule with the best precision, then recall, where several fit; for none
//! where none does), and the group with most votes takes the trace.

mod file;
mod vote;

pub use file::{
    GridFacts, GroupRule, HANDOVER_SCHEMA, Handover, HandoverError, Provenance, SignalFacts,
    SlotFacts, TemplateRules,
};
pub use vote::{Assignment, assign};
