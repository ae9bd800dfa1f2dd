//! Taking the record away in open forms: an SQLite copy, CSV, Parquet. Each is of one moment, and
//! there as a whole or not at all.

mod columns;
mod comma;
mod parquet;

use std::fs::{self, File};
use std::path::{Path, PathBuf};

use rusqlite::Connection;
use rusqlite::backup::{Backup, StepResult};

use crate::durable;
use crate::view::{ViewError, ViewHead, ViewReader, beside, create};

pub use comma::{csv_line, guarded};

/// Tables and views that can be exported, `entries` first.
pub const EXPORTED: [&str; 16] = [
    "entries",
    "decisions",
    "objections",
    "intents",
    "outcomes",
    "confirmations",
    "discrepancies",
    "rests",
    "releases",
    "missed_windows",
    "forecast_spills",
    "plans",
    "acts",
    "counts_by_day",
    "days",
    "meta",
];

/// Pages that a step of the copy takes: a megabyte.
const STEP_PAGES: i32 = 128;

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum ExportForm {
    /// The whole view.
    Sqlite,
    /// One table: RFC 4180, UTF-8, with [`guarded`] texts.
    Csv,
    /// One table: Apache Parquet, for data tools.
    Parquet,
}

/// What to write, and where to.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Export<'a> {
    pub form: ExportForm,
    /// One of [`EXPORTED`]; an SQLite copy has them all.
    pub table: &'a str,
    pub to: &'a Path,
    /// A file that is there already may go.
    pub replace: bool,
}

/// What was written.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Exported {
    pub rows: u64,
    pub bytes: u64,
    /// The last row of the record that was in the view at that moment.
    pub head: ViewHead,
}

/// Exports the view in the state folder, also while the daemon runs. `progress` is told (done, of):
/// rows, or pages of an SQLite copy.
///
/// Written beside its place, synced, then named; after an error nothing of it is left.
pub fn export(
    dir: &Path,
    export: &Export<'_>,
    progress: &mut dyn FnMut(u64, u64),
) -> Result<Exported, ViewError> {
    check(export)?;
    let reader = ViewReader::open(dir)?;
    let to =
        std::path::absolute(export.to).map_err(|e| ViewError::io(export.to, "placing it", e))?;
    let part = Part::begin(&to)?;
    let (rows, head) = reader.at_one_moment(|| {
        let head = reader.head_now()?;
        let rows = match export.form {
            ExportForm::Sqlite => sqlite(&reader, &part.path, progress)?,
            ExportForm::Csv => comma::write(&reader, export.table, &part.path, progress)?,
            ExportForm::Parquet => {
                parquet::write(&reader, export.table, &head, &part.path, progress)?
            }
        };
        Ok((rows, head))
    })?;
    let bytes = part.finish(&to)?;
    Ok(Exported { rows, bytes, head })
}

fn check(export: &Export<'_>) -> Result<(), ViewError> {
    if !EXPORTED.contains(&export.table) {
        let (value, remedy) =
            (export.table.to_owned(), format!("give one of {}", EXPORTED.join(", ")));
        return Err(ViewError::Refused { field: "table", value, remedy });
    }
    if export.to.exists() && !export.replace {
        let value = export.to.display().to_string();
        let remedy = "it is there already; give another name, or --replace".to_owned();
        return Err(ViewError::Refused { field: "to", value, remedy });
    }
    Ok(())
}

/// A file on its way; gone if nothing comes of it.
struct Part {
    path: PathBuf,
    done: bool,
}

impl Part {
    fn begin(to: &Path) -> Result<Self, ViewError> {
        let path = beside(to, ".part");
        // Of an export that was killed.
        let _not_there = fs::remove_file(&path);
        create(&path)?;
        Ok(Self { path, done: false })
    }

    fn finish(mut self, to: &Path) -> Result<u64, ViewError> {
        let io = |e| ViewError::io(to, "putting it in its place", e);
        let file = File::open(&self.path).map_err(io)?;
        file.sync_all().map_err(io)?;
        let bytes = file.metadata().map_err(io)?.len();
        durable::rename(&self.path, to).map_err(io)?;
        self.done = true;
        Ok(bytes)
    }
}

impl Drop for Part {
    fn drop(&mut self) {
        if !self.done {
            for end in ["", "-journal", "-wal", "-shm"] {
                let _not_there = fs::remove_file(beside(&self.path, end));
            }
        }
    }
}

/// SQLite's online backup. What is written to the view meanwhile is not of this moment.
fn sqlite(
    reader: &ViewReader,
    to: &Path,
    progress: &mut dyn FnMut(u64, u64),
) -> Result<u64, ViewError> {
    let sql = |e| ViewError::sql(to, "copying the view", e);
    let mut copy = Connection::open(to).map_err(sql)?;
    let backup = Backup::new(&reader.db, &mut copy).map_err(sql)?;
    loop {
        let step = backup.step(STEP_PAGES).map_err(sql)?;
        let p = backup.progress();
        let (of, left) = (p.pagecount.unsigned_abs(), p.remaining.unsigned_abs());
        progress(u64::from(of - left.min(of)), u64::from(of));
        match step {
            StepResult::Done => break,
            StepResult::More => {}
            _ => return Err(ViewError::Held { path: reader.path.clone() }),
        }
    }
    drop(backup);
    // The copy is one file, for people who may not write beside it.
    copy.pragma_update_and_check(None, "journal_mode", "DELETE", |_| Ok(())).map_err(sql)?;
    let rows: i64 = copy.query_row("SELECT head_seq FROM meta", [], |r| r.get(0)).map_err(sql)?;
    copy.close().map_err(|(_, e)| sql(e))?;
    Ok(rows.cast_unsigned())
}
