//! Boundaries and embeddings.
//!
//! One slot of a template is its **height**; the others are **axes**, each on
//! a grid. For each trace and each grid point the height is solved exactly:
//! the tightest value that the trace satisfies. The list of a trace's heights
//! is its embedding, and each entry is a specification: the template at that
//! grid point and height.

mod embed;
mod grid;
mod likeness;
mod measure;
mod resolve;
mod table;

pub use embed::{
    DEFAULT_POINTS, EmbedError, Request, axes, default_height, embed, embed_batch, embed_with,
    request, verdicts,
};
pub use grid::{threshold_points, time_points};
pub use likeness::{column_digests, mean_scaled_heights};
pub use measure::{MeasureOptions, MeasureRow, MeasureTable, measure};
pub use resolve::{ResolveError, resolve, resolve_derived};
pub use table::{Axis, Embedding};
