//! The file: opened with every setting asked for and read back, or not at all.

use std::fs::File;
use std::path::{Path, PathBuf};
use std::time::Duration;

use rusqlite::config::DbConfig;
use rusqlite::types::Value;
use rusqlite::{Connection, ErrorCode, OpenFlags};

use crate::JournalError;

/// The name of the evidence file in the state folder.
pub const FILE_NAME: &str = "evidence.sqlite";
/// The form of the file that this version writes, in SQLite's `user_version`.
pub(crate) const FORM: i64 = 1;
/// A holder that has just been killed may need a moment to be gone.
const HELD_WAIT: Duration = Duration::from_millis(200);

const SCHEMA: &str = "BEGIN IMMEDIATE;
CREATE TABLE evidence (
    seq INTEGER PRIMARY KEY,
    term INTEGER NOT NULL,
    utc_us INTEGER NOT NULL,
    boot_ns INTEGER NOT NULL,
    kind INTEGER NOT NULL,
    version INTEGER NOT NULL,
    subject TEXT NOT NULL,
    cause TEXT NOT NULL,
    body BLOB NOT NULL,
    hash BLOB NOT NULL
) STRICT;
PRAGMA user_version = 1;
COMMIT;";

/// (setting, its value in SQL, what it must read back as). The locking mode comes before the
/// journal mode: only then is the WAL's index in our memory and not in a mapped file, whose loss
/// (a full disk, say) would end the process by a signal.
const SETTINGS: [(&str, &str, &str); 6] = [
    ("locking_mode", "EXCLUSIVE", "exclusive"),
    ("journal_mode", "WAL", "wal"),
    ("synchronous", "FULL", "2"),
    // An automatic checkpoint hides a failed sync from its caller; ours does not.
    ("wal_autocheckpoint", "0", "0"),
    ("mmap_size", "0", "0"),
    ("trusted_schema", "OFF", "0"),
];

/// An open evidence file.
#[derive(Debug)]
pub(crate) struct Evidence {
    pub(crate) db: Connection,
    pub(crate) path: PathBuf,
}

impl Evidence {
    /// To write: made if it is not there.
    pub(crate) fn open(dir: &Path) -> Result<Self, JournalError> {
        let flags = OpenFlags::SQLITE_OPEN_READ_WRITE
            | OpenFlags::SQLITE_OPEN_CREATE
            | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let mut evidence = Self::connect(dir.join(FILE_NAME), flags)?;
        evidence.settle()?;
        match evidence.form()? {
            0 => evidence.create()?,
            FORM => {}
            found => return Err(evidence.newer(found)),
        }
        // SQLite does not report a failed sync of the folder, so it is done once more by hand.
        File::open(dir)
            .and_then(|d| d.sync_all())
            .map_err(|source| evidence.io("syncing the state folder", source))?;
        Ok(evidence)
    }

    /// To read, while no daemon runs. Nothing in the file changes, nor is its WAL folded in.
    pub(crate) fn open_to_read(dir: &Path) -> Result<Self, JournalError> {
        let path = dir.join(FILE_NAME);
        if !path.exists() {
            return Err(JournalError::Missing { path });
        }
        let flags = OpenFlags::SQLITE_OPEN_READ_WRITE | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let mut evidence = Self::connect(path, flags)?;
        evidence.set("locking_mode", "EXCLUSIVE", "exclusive")?;
        evidence.set("query_only", "ON", "1")?;
        evidence.set("trusted_schema", "OFF", "0")?;
        evidence.set("mmap_size", "0", "0")?;
        let kept = evidence.db.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, true);
        kept.map_err(|e| evidence.sql("keeping the WAL as it is", e))?;
        match evidence.form()? {
            FORM => Ok(evidence),
            0 => Err(JournalError::NotAJournal { path: evidence.path }),
            found => Err(evidence.newer(found)),
        }
    }

    fn connect(path: PathBuf, flags: OpenFlags) -> Result<Self, JournalError> {
        let db = match Connection::open_with_flags(&path, flags) {
            Ok(db) => db,
            Err(source) => return Err(JournalError::Sql { path, doing: "opening", source }),
        };
        let evidence = Self { db, path };
        let waits = evidence.db.busy_timeout(HELD_WAIT);
        waits.map_err(|e| evidence.sql("setting how long to wait for it", e))?;
        Ok(evidence)
    }

    fn settle(&mut self) -> Result<(), JournalError> {
        for (setting, value, wanted) in SETTINGS {
            self.set(setting, value, wanted)?;
        }
        Ok(())
    }

    /// Sets, then asks. A setting that answers nothing when asked is not in this build of SQLite,
    /// which counts as different.
    fn set(
        &mut self,
        setting: &'static str,
        value: &str,
        wanted: &str,
    ) -> Result<(), JournalError> {
        let ignore = |_: &rusqlite::Row<'_>| Ok(());
        let set = self.db.pragma_update_and_check(None, setting, Word(value), ignore);
        match set {
            // Some settings answer with a row and some do not.
            Ok(()) | Err(rusqlite::Error::QueryReturnedNoRows) => {}
            Err(e) => return Err(self.sql("setting it up", e)),
        }
        let found = self
            .db
            .pragma_query_value(None, setting, |row| row.get::<_, Value>(0))
            .map_err(|e| self.sql("reading a setting back", e))?;
        let found = match found {
            Value::Integer(n) => n.to_string(),
            Value::Text(t) => t,
            other => format!("{other:?}"),
        };
        if found.eq_ignore_ascii_case(wanted) {
            return Ok(());
        }
        let (path, wanted) = (self.path.clone(), wanted.to_owned());
        Err(JournalError::Setting { path, setting, wanted, found })
    }

    fn form(&self) -> Result<i64, JournalError> {
        let form = self.db.pragma_query_value(None, "user_version", |row| row.get(0));
        form.map_err(|e| self.sql("reading its form", e))
    }

    fn create(&mut self) -> Result<(), JournalError> {
        let tables: i64 = self
            .db
            .query_row("SELECT count(*) FROM sqlite_schema", [], |row| row.get(0))
            .map_err(|e| self.sql("looking for tables", e))?;
        if tables > 0 {
            return Err(JournalError::NotAJournal { path: self.path.clone() });
        }
        self.db.execute_batch(SCHEMA).map_err(|e| self.sql("making the table", e))
    }

    fn newer(&self, found: i64) -> JournalError {
        JournalError::Newer { path: self.path.clone(), found, known: FORM }
    }

    pub(crate) fn sql(&self, doing: &'static str, source: rusqlite::Error) -> JournalError {
        let path = self.path.clone();
        match source.sqlite_error_code() {
            Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked) => {
                JournalError::Held { path }
            }
            _ => JournalError::Sql { path, doing, source },
        }
    }

    fn io(&self, doing: &'static str, source: std::io::Error) -> JournalError {
        JournalError::Io { path: self.path.clone(), doing, source }
    }

    /// Copies the WAL into the file. Anything short of all of it is an error.
    pub(crate) fn checkpoint(&mut self) -> Result<(), JournalError> {
        let (busy, of, copied): (i64, i64, i64) = self
            .db
            .query_row("PRAGMA wal_checkpoint(PASSIVE)", [], |row| {
                Ok((row.get(0)?, row.get(1)?, row.get(2)?))
            })
            .map_err(|e| self.sql("copying the WAL into it", e))?;
        if busy != 0 || of != copied {
            return Err(JournalError::Checkpoint { path: self.path.clone(), copied, of });
        }
        Ok(())
    }

    pub(crate) fn close(self) -> Result<(), JournalError> {
        let Self { db, path } = self;
        db.close().map_err(|(_, source)| JournalError::Sql { path, doing: "closing", source })
    }
}

/// A value of a setting as SQL text; they are all constants of ours.
struct Word<'a>(&'a str);

impl rusqlite::ToSql for Word<'_> {
    fn to_sql(&self) -> rusqlite::Result<rusqlite::types::ToSqlOutput<'_>> {
        Ok(match self.0.parse::<i64>() {
            Ok(n) => n.into(),
            Err(_) => self.0.into(),
        })
    }
}
