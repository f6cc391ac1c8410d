//! What can go wrong with a run file, and what to do about it.

use std::path::PathBuf;

/// A run file that cannot be read or written.
#[derive(Debug, thiserror::Error)]
pub enum StoreError {
    /// There is no such file.
    #[error("{0}: there is no such run; make one with `strandline search TRACES -o {0}`")]
    Missing(PathBuf),
    /// The file exists and is not a run.
    #[error("{0}: this file is not a strandline run; it was left as it is")]
    NotARun(PathBuf),
    /// A run written by a version with another schema.
    #[error(
        "{path}: this run was written with schema {found} and this program reads schema \
         {expected}; use the version that wrote it, or search again into another file"
    )]
    Version {
        /// The file.
        path: PathBuf,
        /// Its schema version.
        found: i64,
        /// The version this program reads.
        expected: i64,
    },
    /// The run has other inputs than the ones given now.
    #[error(
        "{path}: this run was made from other inputs ({difference}); it was left as it is. \
         Give the same inputs to go on with it, or another file with -o"
    )]
    Inputs {
        /// The file.
        path: PathBuf,
        /// What differs.
        difference: String,
    },
    /// The search has not got to its end.
    #[error(
        "{0}: this run was cut short and has no ranking yet; give the same `search` command \
         again and it goes on"
    )]
    Unfinished(PathBuf),
    /// No template has such an id.
    #[error("{path}: no ranked template has the id `{id}`; `strandline ranking {path}` lists them")]
    UnknownId {
        /// The file.
        path: PathBuf,
        /// The id asked for.
        id: String,
    },
    /// Something stored cannot be understood.
    #[error("{path}: the run is damaged: {what}")]
    Damaged {
        /// The file.
        path: PathBuf,
        /// What cannot be understood.
        what: String,
    },
    /// The folder cannot be written to, the disk is full, or another process
    /// holds the run.
    #[error("{path}: {what}")]
    Write {
        /// The file.
        path: PathBuf,
        /// What the system said, and what to do.
        what: String,
    },
}

impl StoreError {
    /// The error for a failed database call.
    pub(super) fn from_sqlite(path: &std::path::Path, error: &rusqlite::Error) -> Self {
        use rusqlite::ErrorCode;
        let path = path.to_owned();
        match error.sqlite_error_code() {
            Some(ErrorCode::NotADatabase) => StoreError::NotARun(path),
            Some(ErrorCode::DatabaseCorrupt) => StoreError::Damaged {
                path,
                what: error.to_string(),
            },
            Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked) => StoreError::Write {
                path,
                what: "another process is writing this run; wait for it or stop it".to_owned(),
            },
            Some(ErrorCode::DiskFull) => StoreError::Write {
                path,
                what: "the disk is full; what was stored before is safe. Make room and give the \
                       same command again"
                    .to_owned(),
            },
            Some(ErrorCode::CannotOpen | ErrorCode::ReadOnly | ErrorCode::PermissionDenied) => {
                StoreError::Write {
                    path,
                    what: "the file cannot be written here: the folder is missing or read-only; \
                           choose another place with -o"
                        .to_owned(),
                }
            }
            _ => StoreError::Damaged {
                path,
                what: error.to_string(),
            },
        }
    }
}
