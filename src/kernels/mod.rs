//! Evaluation: verdicts and exact boundaries.

pub mod boundary;
pub mod naive;
mod resolved;
mod window;

pub use resolved::{Limit, Reading, Resolved, Shape, Span, Step};
pub use window::{sliding_max, sliding_min};
