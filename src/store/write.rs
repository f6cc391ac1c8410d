//! Writing a run: create or reopen, one transaction a batch, the end.

use std::path::{Path, PathBuf};

use rusqlite::{Connection, OpenFlags, params};
use serde_json::Value;

use super::blob;
use super::error::StoreError;
use super::schema::{APPLICATION_ID, SCHEMA_VERSION, TABLES};
use crate::support::SignalId;
use crate::template::{Kind, Signal};
use crate::traces::TraceSet;

/// A run file open for writing. One process at a time can hold it.
#[derive(Debug)]
pub struct RunWriter {
    path: PathBuf,
    connection: Connection,
}

/// What is written of one batch.
#[derive(Debug, Clone, PartialEq)]
pub struct BatchRow {
    /// Its number, from 0.
    pub number: usize,
    /// The grammar it came from.
    pub grammar: String,
    /// The size of its templates.
    pub size: u32,
    /// Templates listed by the grammar.
    pub listed: usize,
    /// Templates left after equivalence and after folding those that are the
    /// same on this data.
    pub distinct_here: usize,
    /// Templates scored.
    pub scored: usize,
    /// Time it took, in seconds.
    pub seconds: f64,
}

/// What is written of one scored template.
#[derive(Debug, Clone, PartialEq)]
pub struct TemplateRow {
    /// Its short id.
    pub id: String,
    /// Its canonical text.
    pub text: String,
    /// Its size.
    pub size: u32,
    /// The grammar that proposed it.
    pub grammar: String,
    /// Its score, as the scoring module writes it.
    pub score: Value,
}

impl RunWriter {
    /// Makes a new run file with its traces. `facts` are the rows of the
    /// table `run`; `held_out[i]` says whether trace i is kept from the search.
    ///
    /// # Errors
    /// When the file exists, or cannot be written.
    pub fn create(
        path: &Path,
        facts: &[(&str, Value)],
        traces: &TraceSet,
        held_out: &[bool],
    ) -> Result<Self, StoreError> {
        let flags = OpenFlags::SQLITE_OPEN_READ_WRITE | OpenFlags::SQLITE_OPEN_CREATE;
        let mut writer = RunWriter {
            path: path.to_owned(),
            connection: Connection::open_with_flags(path, flags)
                .map_err(|error| StoreError::from_sqlite(path, &error))?,
        };
        writer.claim()?;
        writer.in_transaction(|connection| {
            connection.execute_batch(TABLES)?;
            connection.pragma_update(None, "application_id", APPLICATION_ID)?;
            connection.pragma_update(None, "user_version", SCHEMA_VERSION)?;
            for (key, value) in facts {
                put_fact(connection, key, value)?;
            }
            put_traces(connection, traces, held_out)
        })?;
        Ok(writer)
    }

    /// Opens a run that exists, to go on with it.
    ///
    /// # Errors
    /// When it is no run of this version, or another process writes it.
    pub fn reopen(path: &Path) -> Result<Self, StoreError> {
        super::read::check_is_run(path)?;
        let connection = Connection::open_with_flags(path, OpenFlags::SQLITE_OPEN_READ_WRITE)
            .map_err(|error| StoreError::from_sqlite(path, &error))?;
        let writer = RunWriter {
            path: path.to_owned(),
            connection,
        };
        writer.claim()?;
        Ok(writer)
    }

    /// Takes the run for this process: readers may read, no other may write.
    fn claim(&self) -> Result<(), StoreError> {
        let claim = || -> rusqlite::Result<()> {
            self.connection
                .busy_timeout(std::time::Duration::from_secs(2))?;
            self.connection.pragma_update(None, "journal_mode", "wal")?;
            self.connection
                .pragma_update(None, "synchronous", "normal")?;
            self.connection.pragma_update(None, "foreign_keys", true)?;
            self.connection.execute_batch("BEGIN IMMEDIATE; COMMIT;")
        };
        claim().map_err(|error| self.error(&error))
    }

    fn error(&self, error: &rusqlite::Error) -> StoreError {
        StoreError::from_sqlite(&self.path, error)
    }

    fn in_transaction(
        &mut self,
        work: impl FnOnce(&Connection) -> rusqlite::Result<()>,
    ) -> Result<(), StoreError> {
        let path = self.path.clone();
        let result = self.connection.transaction().and_then(|transaction| {
            work(&transaction)?;
            transaction.commit()
        });
        result.map_err(|error| StoreError::from_sqlite(&path, &error))
    }

    /// Writes a batch and its scored templates, all or nothing. A batch that
    /// is there already is left as it is.
    ///
    /// # Errors
    /// When the file cannot be written; what was stored before stays.
    pub fn batch(&mut self, batch: &BatchRow, templates: &[TemplateRow]) -> Result<(), StoreError> {
        self.in_transaction(|connection| {
            connection.execute(
                "INSERT OR IGNORE INTO batch VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7)",
                params![
                    batch.number as i64,
                    batch.grammar,
                    batch.size,
                    batch.listed as i64,
                    batch.distinct_here as i64,
                    batch.scored as i64,
                    batch.seconds
                ],
            )?;
            let mut insert = connection
                .prepare("INSERT OR IGNORE INTO template VALUES (?1, ?2, ?3, ?4, ?5, ?6)")?;
            for row in templates {
                insert.execute(params![
                    row.id,
                    row.text,
                    row.size,
                    row.grammar,
                    batch.number as i64,
                    row.score.to_string()
                ])?;
            }
            Ok(())
        })
    }

    /// Writes the end of a search: the ranking (entry and explanation of each
    /// ranked template, best first) and facts such as the verdict.
    ///
    /// # Errors
    /// When the file cannot be written; what was stored before stays.
    pub fn finish(
        &mut self,
        ranking: &[(String, Value, Value)],
        facts: &[(&str, Value)],
    ) -> Result<(), StoreError> {
        self.in_transaction(|connection| {
            connection.execute("DELETE FROM ranking", [])?;
            for (position, (id, entry, explanation)) in ranking.iter().enumerate() {
                connection.execute(
                    "INSERT INTO ranking VALUES (?1, ?2, ?3, ?4)",
                    params![
                        position as i64 + 1,
                        id,
                        entry.to_string(),
                        explanation.to_string()
                    ],
                )?;
            }
            for (key, value) in facts {
                put_fact(connection, key, value)?;
            }
            Ok(())
        })
    }

    /// Writes facts about the run.
    ///
    /// # Errors
    /// When the file cannot be written.
    pub fn facts(&mut self, facts: &[(&str, Value)]) -> Result<(), StoreError> {
        self.in_transaction(|connection| {
            facts
                .iter()
                .try_for_each(|(key, value)| put_fact(connection, key, value))
        })
    }
}

fn put_fact(connection: &Connection, key: &str, value: &Value) -> rusqlite::Result<()> {
    connection
        .execute(
            "INSERT OR REPLACE INTO run VALUES (?1, ?2)",
            params![key, value.to_string()],
        )
        .map(drop)
}

fn put_traces(
    connection: &Connection,
    traces: &TraceSet,
    held_out: &[bool],
) -> rusqlite::Result<()> {
    for trace in traces.traces() {
        let label = traces
            .labels()
            .map(|labels| labels.names[labels.of_trace[trace.index()]].clone());
        connection.execute(
            "INSERT INTO trace VALUES (?1, ?2, ?3, ?4, ?5)",
            params![
                trace.0,
                traces.names()[trace.index()],
                traces.length(trace) as i64,
                label,
                held_out.get(trace.index()).copied().unwrap_or(false)
            ],
        )?;
    }
    for (position, channel) in traces.channels().iter().enumerate() {
        let Signal::Recorded { name, kind } = &channel.signal else {
            continue;
        };
        let kind = match kind {
            Kind::Numeric => "channel",
            Kind::Flag => "flag",
        };
        let samples = blob::pack(&channel.samples)
            .map_err(|error| rusqlite::Error::ToSqlConversionFailure(Box::new(error)))?;
        connection.execute(
            "INSERT INTO channel VALUES (?1, ?2, ?3, ?4, ?5)",
            params![
                SignalId::at(position).0,
                name.as_ref(),
                kind,
                channel.unit.as_deref(),
                samples
            ],
        )?;
    }
    Ok(())
}
