//! The tables of a run file.

/// Says that an SQLite file is a strandline run (`strl` in ASCII).
pub const APPLICATION_ID: i64 = 0x7374_726c;

/// The version of the tables below.
pub const SCHEMA_VERSION: i64 = 1;

/// Makes the tables of a new run.
pub(super) const TABLES: &str = "
CREATE TABLE run (key TEXT PRIMARY KEY, value TEXT NOT NULL) WITHOUT ROWID;
CREATE TABLE trace (
    position INTEGER PRIMARY KEY, name TEXT NOT NULL UNIQUE, length INTEGER NOT NULL,
    label TEXT, held_out INTEGER NOT NULL);
CREATE TABLE channel (
    position INTEGER PRIMARY KEY, name TEXT NOT NULL, kind TEXT NOT NULL, unit TEXT,
    samples BLOB NOT NULL);
CREATE TABLE batch (
    number INTEGER PRIMARY KEY, grammar TEXT NOT NULL, size INTEGER NOT NULL,
    listed INTEGER NOT NULL, distinct_here INTEGER NOT NULL, scored INTEGER NOT NULL,
    seconds REAL NOT NULL);
CREATE TABLE template (
    id TEXT NOT NULL, text TEXT PRIMARY KEY, size INTEGER NOT NULL, grammar TEXT NOT NULL,
    batch INTEGER NOT NULL REFERENCES batch(number), score TEXT NOT NULL) WITHOUT ROWID;
CREATE INDEX template_id ON template(id);
CREATE TABLE ranking (
    rank INTEGER PRIMARY KEY, id TEXT NOT NULL UNIQUE, entry TEXT NOT NULL,
    explanation TEXT NOT NULL);
";
