//! Small foundations that every other module stands on: seeded random
//! streams, finite numbers, typed ids and digests.
//!
//! Nothing here knows about traces or templates. Randomness in the whole
//! program comes from [`Stream`] only, so that a run depends on its seed and
//! on nothing else.

mod digest;
mod finite;
mod ids;
mod random;

pub use digest::{digest_bytes, short_id};
pub use finite::{Finite, NotFinite};
pub use ids::{SignalId, SlotId, TraceId};
pub use random::Stream;
