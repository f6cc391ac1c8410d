//! Reading a run. Readers may work while a search writes.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use rusqlite::{Connection, OpenFlags, OptionalExtension, Row};
use serde_json::Value;

use super::blob;
use super::error::StoreError;
use super::schema::{APPLICATION_ID, SCHEMA_VERSION};
use crate::template::Signal;
use crate::traces::{Channel, Grid, Labels, TraceSet};

/// A run file open for reading.
#[derive(Debug)]
pub struct RunReader {
    path: PathBuf,
    connection: Connection,
}

/// A scored template as stored.
#[derive(Debug, Clone, PartialEq)]
pub struct StoredTemplate {
    /// Its short id.
    pub id: String,
    /// Its canonical text.
    pub text: String,
    /// The grammar that proposed it.
    pub grammar: String,
    /// Its score, as the scoring module wrote it.
    pub score: Value,
}

/// Checks that a file is a run of this version.
pub(super) fn check_is_run(path: &Path) -> Result<(), StoreError> {
    RunReader::open(path).map(drop)
}

impl RunReader {
    /// Opens a run.
    ///
    /// # Errors
    /// When there is none, it is no run, or it is of another version.
    pub fn open(path: &Path) -> Result<Self, StoreError> {
        if !path.exists() {
            return Err(StoreError::Missing(path.to_owned()));
        }
        if path.is_dir() {
            return Err(StoreError::NotARun(path.to_owned()));
        }
        let connection = Connection::open_with_flags(path, OpenFlags::SQLITE_OPEN_READ_WRITE)
            .or_else(|_| Connection::open_with_flags(path, OpenFlags::SQLITE_OPEN_READ_ONLY))
            .map_err(|error| StoreError::from_sqlite(path, &error))?;
        let reader = RunReader {
            path: path.to_owned(),
            connection,
        };
        let application: i64 = reader.pragma("application_id")?;
        if application != APPLICATION_ID {
            return Err(StoreError::NotARun(path.to_owned()));
        }
        let found = reader.pragma("user_version")?;
        if found != SCHEMA_VERSION {
            return Err(StoreError::Version {
                path: path.to_owned(),
                found,
                expected: SCHEMA_VERSION,
            });
        }
        Ok(reader)
    }

    /// The file.
    pub fn path(&self) -> &Path {
        &self.path
    }

    fn pragma(&self, name: &str) -> Result<i64, StoreError> {
        self.connection
            .pragma_query_value(None, name, |row| row.get(0))
            .map_err(|error| self.error(&error))
    }

    fn error(&self, error: &rusqlite::Error) -> StoreError {
        StoreError::from_sqlite(&self.path, error)
    }

    fn damaged(&self, what: impl Into<String>) -> StoreError {
        StoreError::Damaged {
            path: self.path.clone(),
            what: what.into(),
        }
    }

    fn rows<T>(
        &self,
        query: &str,
        read: impl Fn(&Row<'_>) -> rusqlite::Result<T>,
    ) -> Result<Vec<T>, StoreError> {
        let collect = || -> rusqlite::Result<Vec<T>> {
            let mut statement = self.connection.prepare(query)?;
            statement.query_map([], |row| read(row))?.collect()
        };
        collect().map_err(|error| self.error(&error))
    }

    fn json(&self, text: &str) -> Result<Value, StoreError> {
        serde_json::from_str(text).map_err(|error| self.damaged(error.to_string()))
    }

    /// A fact about the run.
    ///
    /// # Errors
    /// When the run is damaged.
    pub fn fact(&self, key: &str) -> Result<Option<Value>, StoreError> {
        let text: Option<String> = self
            .connection
            .query_row("SELECT value FROM run WHERE key = ?1", [key], |row| {
                row.get(0)
            })
            .optional()
            .map_err(|error| self.error(&error))?;
        text.map(|text| self.json(&text)).transpose()
    }

    /// The scored templates, by text.
    ///
    /// # Errors
    /// When the run is damaged.
    pub fn templates(&self) -> Result<BTreeMap<String, StoredTemplate>, StoreError> {
        let rows = self.rows("SELECT id, text, grammar, score FROM template", |row| {
            Ok((
                row.get::<_, String>(0)?,
                row.get::<_, String>(1)?,
                row.get::<_, String>(2)?,
                row.get::<_, String>(3)?,
            ))
        })?;
        rows.into_iter()
            .map(|(id, text, grammar, score)| {
                let score = self.json(&score)?;
                let key = text.clone();
                Ok((
                    key,
                    StoredTemplate {
                        id,
                        text,
                        grammar,
                        score,
                    },
                ))
            })
            .collect()
    }

    /// The ranking: entry and explanation of each template, best first.
    ///
    /// # Errors
    /// When the search has not got to its end, or the run is damaged.
    pub fn ranking(&self) -> Result<Vec<(Value, Value)>, StoreError> {
        if self.fact("finished")? != Some(Value::Bool(true)) {
            return Err(StoreError::Unfinished(self.path.clone()));
        }
        self.rows(
            "SELECT entry, explanation FROM ranking ORDER BY rank",
            |row| Ok((row.get::<_, String>(0)?, row.get::<_, String>(1)?)),
        )?
        .into_iter()
        .map(|(entry, explanation)| Ok((self.json(&entry)?, self.json(&explanation)?)))
        .collect()
    }

    /// The traces, with labels where all have one, and which are held out.
    ///
    /// # Errors
    /// When the run is damaged.
    pub fn traces(&self, grid: Grid) -> Result<(TraceSet, Vec<bool>), StoreError> {
        let rows = self.rows(
            "SELECT name, length, label, held_out FROM trace ORDER BY position",
            |row| {
                Ok((
                    row.get::<_, String>(0)?,
                    row.get::<_, i64>(1)? as usize,
                    row.get::<_, Option<String>>(2)?,
                    row.get::<_, bool>(3)?,
                ))
            },
        )?;
        let names = rows.iter().map(|row| row.0.clone()).collect();
        let lengths: Vec<usize> = rows.iter().map(|row| row.1).collect();
        let labels: Option<Vec<String>> = rows.iter().map(|row| row.2.clone()).collect();
        let held_out = rows.iter().map(|row| row.3).collect();
        let channels = self.channels(lengths.iter().sum())?;
        let labels = labels.map(Labels::from_names);
        Ok((
            TraceSet::new(names, &lengths, labels, grid, channels),
            held_out,
        ))
    }

    fn channels(&self, count: usize) -> Result<Vec<Channel>, StoreError> {
        let rows = self.rows(
            "SELECT name, kind, unit, samples FROM channel ORDER BY position",
            |row| {
                Ok((
                    row.get::<_, String>(0)?,
                    row.get::<_, String>(1)?,
                    row.get::<_, Option<String>>(2)?,
                    row.get::<_, Vec<u8>>(3)?,
                ))
            },
        )?;
        rows.into_iter()
            .map(|(name, kind, unit, bytes)| {
                let samples = blob::unpack(&bytes, count)
                    .ok_or_else(|| self.damaged(format!("the samples of `{name}`")))?;
                let signal = if kind == "flag" {
                    Signal::flag(&name)
                } else {
                    Signal::channel(&name)
                };
                Ok(Channel {
                    signal,
                    unit: unit.map(Into::into),
                    samples,
                })
            })
            .collect()
    }
}
