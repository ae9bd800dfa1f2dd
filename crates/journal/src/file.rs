//! The file: opened with every setting asked for and read back, or not at all.

use std::fs::File;
use std::os::unix::fs::FileExt;
use std::path::{Path, PathBuf};
use std::time::Duration;

use rusqlite::config::DbConfig;
use rusqlite::types::Value;
use rusqlite::{Connection, ErrorCode, OpenFlags};

use crate::JournalError;
use crate::forms::{self, FORM};

/// The name of the evidence file in the state folder.
pub const FILE_NAME: &str = "evidence.sqlite";
/// A holder that has just been killed may need a moment to be gone.
const HELD_WAIT: Duration = Duration::from_millis(200);

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
    /// The file itself, to copy it from. It may be closed only after the connection: closing any
    /// handle of a file lets go of all of the process's locks on it (POSIX).
    pub(crate) source: Option<File>,
    /// Of the file as it is; the newest, unless it is open to be read only.
    pub(crate) form: i64,
    /// The form that it had when it was opened to write.
    pub(crate) lifted_from: i64,
}

impl Evidence {
    /// To write: made if it is not there.
    pub(crate) fn open(dir: &Path) -> Result<Self, JournalError> {
        let flags = OpenFlags::SQLITE_OPEN_READ_WRITE
            | OpenFlags::SQLITE_OPEN_CREATE
            | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let mut evidence = Self::connect(dir.join(FILE_NAME), flags)?;
        evidence.settle()?;
        evidence.renew_wal()?;
        evidence.lift()?;
        let source = File::open(&evidence.path);
        evidence.source = Some(source.map_err(|e| evidence.io("opening it to copy it", e))?);
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
        evidence.readable()
    }

    /// A copy that nobody writes to: nothing beside it is read or made.
    pub(crate) fn open_copy(path: &Path) -> Result<Self, JournalError> {
        if !path.exists() {
            return Err(JournalError::Missing { path: path.to_owned() });
        }
        let escaped = path.display().to_string();
        let escaped = escaped.replace('%', "%25").replace('?', "%3f").replace('#', "%23");
        let uri = PathBuf::from(format!("file:{escaped}?immutable=1"));
        let flags = OpenFlags::SQLITE_OPEN_READ_ONLY
            | OpenFlags::SQLITE_OPEN_URI
            | OpenFlags::SQLITE_OPEN_NO_MUTEX;
        let mut copy = Self::connect(uri, flags)?;
        copy.path = path.to_owned();
        copy.set("trusted_schema", "OFF", "0")?;
        copy.set("mmap_size", "0", "0")?;
        copy.readable()
    }

    /// Refuses what is no journal, or of a newer form.
    fn readable(mut self) -> Result<Self, JournalError> {
        match self.user_version()? {
            0 => Err(JournalError::NotAJournal { path: self.path }),
            found if (1..=FORM).contains(&found) => {
                self.form = found;
                Ok(self)
            }
            found => Err(self.newer(found)),
        }
    }

    fn connect(path: PathBuf, flags: OpenFlags) -> Result<Self, JournalError> {
        let db = match Connection::open_with_flags(&path, flags) {
            Ok(db) => db,
            Err(source) => return Err(JournalError::Sql { path, doing: "opening", source }),
        };
        let evidence = Self { db, path, source: None, form: FORM, lifted_from: FORM };
        let waits = evidence.db.busy_timeout(HELD_WAIT);
        waits.map_err(|e| evidence.sql("setting how long to wait for it", e))?;
        // A connection that failed is dropped; it must not copy its WAL into the file on the way out.
        evidence.fold_in_at_close(false)?;
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
        // To the end: SQLite answers first and commits after it, so that an error of a change of
        // the journal's mode comes with the step after the answer, and reading back does not tell.
        let to_the_end = || -> rusqlite::Result<()> {
            let mut statement = self.db.prepare(&format!("PRAGMA {setting} = {value}"))?;
            let mut rows = statement.query([])?;
            while rows.next()?.is_some() {}
            Ok(())
        };
        to_the_end().map_err(|e| self.sql("setting it up", e))?;
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

    /// Writes the WAL over itself and syncs it. After a failed sync the kernel takes pages for clean
    /// that are on no disk, and gives them to whoever reads next (Rebello et al., 2020): rows found
    /// there would be believed, and gone with the next power cut. It takes no new room, so that a
    /// full disk is no reason not to open.
    fn renew_wal(&self) -> Result<(), JournalError> {
        // Whoever can read holds the lock, and nobody else writes.
        self.user_version()?;
        let wal = PathBuf::from(format!("{}-wal", self.path.display()));
        let file = match File::options().read(true).write(true).open(&wal) {
            Ok(file) => file,
            Err(e) if e.kind() == std::io::ErrorKind::NotFound => return Ok(()),
            Err(e) => return Err(self.io("opening its WAL", e)),
        };
        let mut buffer = vec![0; 1 << 16];
        let mut at = 0;
        let renewed = loop {
            match file.read_at(&mut buffer, at) {
                Ok(0) => break file.sync_all(),
                Ok(n) => match file.write_all_at(&buffer[..n], at) {
                    Ok(()) => at += n as u64,
                    Err(e) => break Err(e),
                },
                Err(e) => break Err(e),
            }
        };
        renewed.map_err(|e| self.io("writing its WAL over itself", e))
    }

    fn user_version(&self) -> Result<i64, JournalError> {
        let form = self.db.pragma_query_value(None, "user_version", |row| row.get(0));
        form.map_err(|e| self.sql("reading its form", e))
    }

    /// Makes the tables, or takes an older form to the newest.
    fn lift(&mut self) -> Result<(), JournalError> {
        let form = self.user_version()?;
        if !(0..=FORM).contains(&form) {
            return Err(self.newer(form));
        }
        let tables: i64 = self
            .db
            .query_row("SELECT count(*) FROM sqlite_schema", [], |row| row.get(0))
            .map_err(|e| self.sql("looking for tables", e))?;
        if form == 0 && tables > 0 {
            return Err(JournalError::NotAJournal { path: self.path.clone() });
        }
        self.lifted_from = if form == 0 { FORM } else { form };
        forms::lift(&self.db, form).map_err(|e| self.sql("lifting it to the newest form", e))
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

    /// The file itself, where it is open to write.
    pub(crate) fn source(&self) -> Result<&File, JournalError> {
        self.source.as_ref().ok_or_else(|| JournalError::Missing { path: self.path.clone() })
    }

    pub(crate) fn io(&self, doing: &'static str, source: std::io::Error) -> JournalError {
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

    fn fold_in_at_close(&self, yes: bool) -> Result<(), JournalError> {
        let set = self.db.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, !yes);
        set.map(drop).map_err(|e| self.sql("saying what becomes of its WAL", e))
    }

    /// After a checkpoint: the WAL goes with it.
    pub(crate) fn close(self) -> Result<(), JournalError> {
        self.fold_in_at_close(true)?;
        let Self { db, path, source: _until_here, .. } = self;
        db.close().map_err(|(_, source)| JournalError::Sql { path, doing: "closing", source })
    }
}
