//! The run store: one SQLite file a run.
//!
//! A run file holds everything that reading commands need: what was searched
//! (settings, grammars, digests of the inputs), the traces themselves
//! (compressed), every scored template, a record of each batch, and at the end
//! the ranking with its explanations. It is written in one transaction a
//! batch, so whatever happens, the file holds the first batches of the run and
//! nothing half.
//!
//! | table | one row for | columns |
//! |---|---|---|
//! | `run` | a fact about the run | `key`, `value` (JSON) |
//! | `trace` | a trace | `position`, `name`, `length`, `label`, `held_out` |
//! | `channel` | a recorded channel or flag | `position`, `name`, `kind`, `unit`, `samples` (deflated little-endian doubles, trace after trace) |
//! | `batch` | a batch of the search | `number`, `grammar`, `size`, `listed`, `distinct_here`, `scored`, `seconds` |
//! | `template` | a scored template | `id`, `text`, `size`, `grammar`, `batch`, `score` (JSON) |
//! | `ranking` | a ranked template | `rank`, `id`, `entry` (JSON), `explanation` (JSON) |
//!
//! The file says what it is (`application_id`) and which version of the schema
//! it follows (`user_version`); a file of another version is refused.

mod blob;
mod error;
mod read;
mod schema;
mod write;

pub use error::StoreError;
pub use read::{RunReader, StoredTemplate};
pub use schema::{APPLICATION_ID, SCHEMA_VERSION};
pub use write::{BatchRow, RunWriter, TemplateRow};
