//! Traces: reading them, putting them on one time grid, deriving signals.
//!
//! A [`TraceSet`] is what everything below works on: for every trace its name,
//! perhaps a label, and for every signal (recorded or derived) one sample an
//! instant of the uniform grid. Flags are 0 and 1; a sample that is not known
//! (a moving window not yet full, an empty cell at the start of a record) is
//! NaN, and nothing else is ever NaN or infinite.
//!
//! Samples lie trace after trace in one vector a signal, so that one trace's
//! samples are a slice, and traces may differ in length.
//!
//! [`load`] is the door: `table` reads one CSV file as text, `layout` finds the
//! traces in it, `grid` puts them on a uniform grid, and what was mended on the
//! way is told as [`Finding`]s. What cannot be mended by a stated rule is
//! refused with file, line and column.

mod derive;
mod error;
mod finding;
mod grid;
mod header;
mod layout;
mod load;
mod set;
mod table;

pub use derive::DeriveError;
pub use error::{Place, TraceError};
pub use finding::Finding;
pub use layout::Layout;
pub use load::{LoadOptions, Loaded, check_labels, load};
pub use set::{Channel, Grid, Labels, MOST_NARROW, Ranks, Record, TraceSet};
