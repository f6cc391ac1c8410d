//! Evaluation: verdicts and exact boundaries.
//!
//! `naive` is the meaning of a specification, straight from its definition, and
//! judges everything else. `boundary` computes exact heights in one pass, from
//! a [`Plan`] in which every sub-formula knows the axes that it reads;
//! `window`, `until` and `runs` are the passes. Kernels know indices, not names:
//! `embedding::resolve` gives them a [`Resolved`] formula.

mod boundary;
pub mod naive;
mod plan;
mod resolved;
mod runs;
mod until;
mod window;

pub use boundary::{Evaluation, Fill, NEVER};
pub use plan::{Plan, PlanAxis};
pub use resolved::{Limit, Reading, Resolved, Shape, Span, Step};
pub use window::{sliding_max, sliding_min};
