//! What can go wrong with the journal, each with the file it is about and what to do.

use std::path::PathBuf;

use rusqlite::ErrorCode;

#[derive(Debug, thiserror::Error)]
pub enum JournalError {
    #[error(
        "{} is in use by another process; ask the running daemon, or stop it first", path.display()
    )]
    Held { path: PathBuf },
    #[error("{} is not there; nothing has been recorded in this state folder yet", path.display())]
    Missing { path: PathBuf },
    #[error(
        "{} has form {found}, and this version reads up to {known}; use the version that wrote it, \
         or a later one", path.display()
    )]
    Newer { path: PathBuf, found: i64, known: i64 },
    #[error("{} is a database, but no journal of ours; move it out of the way", path.display())]
    NotAJournal { path: PathBuf },
    #[error(
        "{}: `{setting}` is {found:?} where {wanted:?} was asked for; the file system cannot keep \
         the promise, so nothing is recorded on it (use a local disk)", path.display()
    )]
    Setting { path: PathBuf, setting: &'static str, wanted: String, found: String },
    #[error(
        "row {seq} is the first that is wrong: {why}; keep the file as evidence and start from a \
         backup or an empty state folder"
    )]
    FirstBad { seq: u64, why: String },
    #[error("{}: {doing}", path.display())]
    Sql { path: PathBuf, doing: &'static str, source: rusqlite::Error },
    #[error("{}: {doing}", path.display())]
    Io { path: PathBuf, doing: &'static str, source: std::io::Error },
    #[error("{}: the checkpoint copied {copied} of {of} pages", path.display())]
    Checkpoint { path: PathBuf, copied: i64, of: i64 },
    #[error("{} is there already; give a state folder without a record", path.display())]
    NotEmpty { path: PathBuf },
    #[error("segment {}: {why}; put it back from a backup", path.display())]
    Segment { path: PathBuf, why: String },
    #[error("row {no} of the inputs that wait to be sealed does not read; keep the file")]
    Inputs { no: i64 },
    #[error("the anchor at row {seq} does not hold: {why}")]
    Anchor { seq: u64, why: String },
    #[error("a permit does not agree with its row {seq} after the commit")]
    Permit { seq: u64, source: record::RecordError },
    #[error("{rows} rows could not be written before the end; they are in no file")]
    NotKept { rows: usize },
    #[error("the journal's thread is gone")]
    Gone,
}

impl JournalError {
    /// Room on the disk would mend it.
    pub(crate) fn is_full_disk(&self) -> bool {
        match self {
            Self::Sql { source, .. } => source.sqlite_error_code() == Some(ErrorCode::DiskFull),
            Self::Io { source, .. } => source.kind() == std::io::ErrorKind::StorageFull,
            _ => false,
        }
    }

    /// Nothing that this connection says may be believed any more.
    pub(crate) fn is_of_the_connection(&self) -> bool {
        matches!(self, Self::Sql { .. } | Self::Held { .. } | Self::Checkpoint { .. })
    }
}
