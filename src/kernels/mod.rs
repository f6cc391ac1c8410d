//! Evaluation: verdicts and exact boundaries.
//!
//! `naive` is the meaning of a specification, straight from its definition, and
//! judges everything else.
//!
//! **Exact heights in one pass.** With one slot free, a formula holds at an
//! instant exactly when the slot's value is at least a certain **demand** there,
//! counted in the direction in which the formula gets easier. Demands are whole
//! numbers: 0 where every value will do, the largest number where none does
//! ([`NEVER`]), between them ranks of the signal's values (for a threshold) or
//! steps (for a time). Conjunction is the larger demand, disjunction the
//! smaller; `throughout` is a sliding maximum, `sometime` a sliding minimum.
//! Nothing is searched for, so heights are exact.
//!
//! **One trace through all passes.** A batch of templates becomes one list of
//! operations ([`Plan`]: shared sub-formulas once, threshold axes as one row of
//! places instead of a row a point). A [`Worker`] takes a trace through all of
//! them while it lies in the nearest cache, then the next. `passes` are plain
//! loops over slices of codes (`code`: 16 bits where a signal has few enough
//! values, else 32); `dispatch` has each compiled for the instruction sets
//! there are and picks once. `start` folds what stands outermost, `runs` are
//! time heights.
//!
//! Kernels know indices, not names: `embedding::resolve` gives them a
//! [`Resolved`] formula.

mod code;
mod compile;
mod dispatch;
mod ladder;
pub mod naive;
mod passes;
mod plan;
mod resolved;
mod runs;
mod start;
mod worker;

pub use code::Code;
pub use dispatch::Level;
pub use plan::{Plan, Role};
pub use resolved::{Limit, Reading, Resolved, Shape, Span, Step};
pub use worker::Worker;

/// The demand that no value meets.
pub const NEVER: u32 = u32::MAX;
