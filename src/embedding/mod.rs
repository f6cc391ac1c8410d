//! Boundaries and embeddings.
//!
//! One slot of a template is its **height**; the others are **axes**, each on
//! a grid. For each trace and each grid point the height is solved exactly:
//! the tightest value that the trace satisfies. The list of a trace's heights
//! is its embedding, and each entry is a specification: the template at that
//! grid point and height.

mod table;

pub use table::{Axis, Embedding};
