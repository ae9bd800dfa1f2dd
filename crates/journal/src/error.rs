//! What can go wrong with the journal, each with the file it is about and what to do.

use std::path::PathBuf;

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
    #[error("a permit does not agree with its row {seq} after the commit")]
    Permit { seq: u64, source: record::RecordError },
    #[error("{rows} rows could not be written before the end; they are in no file")]
    NotKept { rows: usize },
    #[error("the journal's thread is gone")]
    Gone,
}
