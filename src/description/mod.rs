//! Descriptions: what sets a group of traces apart, as a short formula with
//! numbers and in words.
//!
//! A **literal** is one specification of a template (a grid point and a
//! height) that must hold, or must not. A **rule** is a conjunction of at most
//! three literals. Thresholds are placed in the gap between the traces on both
//! sides, at the number with the fewest digits that is well inside it. Every
//! rule is checked again on every trace by the evaluator that follows the
//! definition (`verify`), which knows nothing of how the rule was found.

mod literal;
mod number;
mod panel;
mod representatives;
mod rule;
mod trial;
mod verify;

pub use literal::{Literal, LiteralSearch};
pub use number::{nice_number, nice_steps};
pub use panel::{Ballot, ballot, elect};
pub use representatives::{Representatives, representatives};
pub use rule::{Quality, Rule, rule, rule_among, rule_text};
pub use trial::rules_on_trial;
pub use verify::{Check, verify};
