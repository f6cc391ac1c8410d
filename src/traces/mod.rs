//! Traces: reading them, putting them on one time grid, deriving signals.
//!
//! A [`TraceSet`] is what everything below works on: for every trace its name,
//! perhaps a label, and for every signal (recorded or derived) one sample an
//! instant of the uniform grid. Flags are 0 and 1; a sample that is not known
//! (a moving window not yet full, a gap that was not mended) is NaN, and
//! nothing else is ever NaN or infinite.
//!
//! Samples lie trace after trace in one vector a signal, so that one trace's
//! samples are a slice, and traces may differ in length.

mod derive;
mod set;

pub use derive::DeriveError;
pub use set::{Channel, Grid, Labels, Record, TraceSet};
