//! What can go wrong with the view. It has an enum of its own, so that no failure of it can be taken
//! for one of the evidence.

use std::path::{Path, PathBuf};

use rusqlite::ErrorCode;

use crate::JournalError;

#[derive(Debug, thiserror::Error)]
pub enum ViewError {
    #[error(
        "{} is not there; the daemon makes it, or while none runs: tidereeve journal rebuild SITE",
        path.display()
    )]
    Missing { path: PathBuf },
    #[error(
        "{} has format {found}, and this version reads {known}; use the version that wrote it or a \
         later one, or move the file away: nothing is in it that is not in the evidence",
        path.display()
    )]
    Newer { path: PathBuf, found: i64, known: i64 },
    #[error(
        "{} has the older format {found}, and this version reads {known}; the daemon makes it anew, \
         or while none runs: tidereeve journal rebuild SITE", path.display()
    )]
    Older { path: PathBuf, found: i64, known: i64 },
    #[error("{} is a database, but no view of ours; move it out of the way", path.display())]
    NotAView { path: PathBuf },
    #[error(
        "{} is damaged: {why}; the daemon makes it anew, or while none runs: tidereeve journal \
         rebuild SITE", path.display()
    )]
    Damaged { path: PathBuf, why: String },
    #[error("{} is held by another program that writes to it; end that program", path.display())]
    Held { path: PathBuf },
    #[error(
        "{}: only {free} bytes are free beside it, and it leaves {kept} to the evidence",
        path.display()
    )]
    NoRoom { path: PathBuf, free: u64, kept: u64 },
    #[error("row {found} was to be taken where row {wanted} is the next")]
    Gap { wanted: u64, found: u64 },
    #[error("the journal gave no rows")]
    NoRows,
    #[error("{}: {doing}", path.display())]
    Sql { path: PathBuf, doing: &'static str, source: rusqlite::Error },
    #[error("{}: {doing}", path.display())]
    Io { path: PathBuf, doing: &'static str, source: std::io::Error },
    #[error("the evidence cannot be read")]
    Evidence(#[source] JournalError),
    #[error("{}: writing it", path.display())]
    Csv { path: PathBuf, source: csv::Error },
    #[error("{}: writing it", path.display())]
    Parquet { path: PathBuf, source: parquet::errors::ParquetError },
    #[error("--{field} {value:?}: {remedy}")]
    Refused { field: &'static str, value: String, remedy: String },
}

impl ViewError {
    pub(crate) fn sql(path: &Path, doing: &'static str, source: rusqlite::Error) -> Self {
        let path = path.to_owned();
        match source.sqlite_error_code() {
            Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked) => Self::Held { path },
            Some(ErrorCode::DatabaseCorrupt | ErrorCode::NotADatabase) => {
                Self::Damaged { path, why: source.to_string() }
            }
            _ => Self::Sql { path, doing, source },
        }
    }

    pub(crate) fn io(path: &Path, doing: &'static str, source: std::io::Error) -> Self {
        Self::Io { path: path.to_owned(), doing, source }
    }

    /// The file is as good as it was: what failed can be tried again later.
    pub(crate) fn passes(&self) -> bool {
        let full = match self {
            Self::Sql { source, .. } => source.sqlite_error_code() == Some(ErrorCode::DiskFull),
            Self::Io { source, .. } => source.kind() == std::io::ErrorKind::StorageFull,
            _ => false,
        };
        full || matches!(self, Self::Held { .. } | Self::NoRoom { .. } | Self::NoRows)
    }

    /// A person must look: the file is not ours to replace.
    pub(crate) fn stands(&self) -> bool {
        matches!(self, Self::Newer { .. } | Self::NotAView { .. })
    }
}
