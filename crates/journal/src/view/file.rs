//! The file: where it lies, what it says of itself, and its tables.

use std::fs;
use std::io;
use std::os::unix::fs::{OpenOptionsExt, PermissionsExt};
use std::path::{Path, PathBuf};
use std::time::Duration;

use rusqlite::{Connection, OpenFlags, OptionalExtension};

use super::ViewError;

/// The name of the view in the state folder.
pub const VIEW_NAME: &str = "view.sqlite";
/// The form of the tables, in `user_version` and in `meta`.
pub const VIEW_FORMAT: i64 = 1;
/// "TdVw": tells a view from any other database, in `application_id`.
const APPLICATION: i64 = 0x5464_5677;
/// Members of the operators' group read it; nobody else does.
const MODE: u32 = 0o640;
/// A writer that is no business of ours may need a moment.
const HELD_WAIT: Duration = Duration::from_secs(2);
/// Bytes that the view leaves free on its disk: they are for the evidence.
const KEPT_FREE: u64 = 64 << 20;

const TABLES: &str = include_str!("tables.sql");
const INDEXES: &str = include_str!("indexes.sql");

/// Where the view has come to.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct ViewHead {
    /// 0 before the first row.
    pub seq: u64,
    /// Hexadecimal; empty before the first row.
    pub hash: String,
}

pub(crate) fn path(dir: &Path) -> PathBuf {
    dir.join(VIEW_NAME)
}

/// A name beside `path`, with this at its end.
pub(crate) fn beside(path: &Path, end: &str) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(end);
    PathBuf::from(name)
}

/// Takes the view away. What SQLite keeps beside the file goes after it, so that a crash between
/// leaves nothing that could be taken for the new one's.
pub(crate) fn remove(path: &Path) -> Result<(), ViewError> {
    for end in ["", "-wal", "-shm", "-journal"] {
        let one = beside(path, end);
        match fs::remove_file(&one) {
            Err(e) if e.kind() != io::ErrorKind::NotFound => {
                return Err(ViewError::io(&one, "removing it", e));
            }
            _ => {}
        }
    }
    Ok(())
}

/// An empty file that nobody outside the group may read, whatever the umask is.
pub(crate) fn create(path: &Path) -> Result<(), ViewError> {
    let made = fs::OpenOptions::new().write(true).create_new(true).mode(MODE).open(path);
    made.and_then(|f| f.set_permissions(fs::Permissions::from_mode(MODE)))
        .map_err(|e| ViewError::io(path, "making it", e))
}

pub(crate) fn connect(path: &Path, flags: OpenFlags) -> Result<Connection, ViewError> {
    let sql = |e| ViewError::sql(path, "opening it", e);
    let db = Connection::open_with_flags(path, flags | OpenFlags::SQLITE_OPEN_NO_MUTEX);
    let db = db.map_err(sql)?;
    db.busy_timeout(HELD_WAIT).map_err(sql)?;
    db.set_prepared_statement_cache_capacity(64);
    Ok(db)
}

/// Room on the disk, less what is the evidence's.
pub(crate) fn room(path: &Path) -> Result<(), ViewError> {
    let folder = path.parent().unwrap_or(Path::new("."));
    let stat = rustix::fs::statvfs(folder);
    let stat = stat.map_err(|e| ViewError::io(folder, "asking for free space", e.into()))?;
    let free = stat.f_bavail.saturating_mul(stat.f_frsize);
    if free < KEPT_FREE {
        return Err(ViewError::NoRoom { path: path.to_owned(), free, kept: KEPT_FREE });
    }
    Ok(())
}

pub(crate) fn make_tables(db: &Connection, path: &Path) -> Result<(), ViewError> {
    let words = format!(
        "PRAGMA application_id = {APPLICATION}; PRAGMA user_version = {VIEW_FORMAT}; {TABLES} \
         INSERT INTO meta VALUES ({VIEW_FORMAT}, 0, '');"
    );
    db.execute_batch(&words).map_err(|e| ViewError::sql(path, "making its tables", e))
}

pub(crate) fn make_indexes(db: &Connection, path: &Path) -> Result<(), ViewError> {
    db.execute_batch(INDEXES).map_err(|e| ViewError::sql(path, "making its indexes", e))
}

/// Refuses what is no view of ours or of another format; else says where it has come to.
pub(crate) fn known(db: &Connection, path: &Path) -> Result<ViewHead, ViewError> {
    let sql = |e| ViewError::sql(path, "reading what it is", e);
    let ask = |name: &str| db.pragma_query_value(None, name, |r| r.get::<_, i64>(0)).map_err(sql);
    let (application, found) = (ask("application_id")?, ask("user_version")?);
    let (known, path) = (VIEW_FORMAT, path.to_owned());
    if application != APPLICATION {
        let tables: i64 = db
            .query_row("SELECT count(*) FROM sqlite_schema", [], |r| r.get(0))
            .map_err(|e| ViewError::sql(&path, "reading what it is", e))?;
        return Err(if tables == 0 {
            ViewError::Damaged { path, why: "it is empty".to_owned() }
        } else {
            ViewError::NotAView { path }
        });
    }
    if found > known {
        return Err(ViewError::Newer { path, found, known });
    }
    if found < known {
        return Err(ViewError::Older { path, found, known });
    }
    let head = db
        .query_row("SELECT head_seq, head_hash FROM meta", [], |r| {
            Ok(ViewHead { seq: r.get::<_, i64>(0)?.cast_unsigned(), hash: r.get(1)? })
        })
        .optional()
        .map_err(sql_of(&path))?;
    let head = head.ok_or_else(|| damaged(&path, "`meta` is empty"))?;
    let last: Option<i64> =
        db.query_row("SELECT max(seq) FROM entry_rows", [], |r| r.get(0)).map_err(sql_of(&path))?;
    if last.unwrap_or(0).cast_unsigned() != head.seq {
        return Err(damaged(&path, "`meta` and `entry_rows` end at different rows"));
    }
    Ok(head)
}

fn sql_of(path: &Path) -> impl Fn(rusqlite::Error) -> ViewError {
    move |e| ViewError::sql(path, "reading where it ends", e)
}

pub(crate) fn damaged(path: &Path, why: &str) -> ViewError {
    ViewError::Damaged { path: path.to_owned(), why: why.to_owned() }
}

/// Without a WAL beside it the file must be as long as it says: a shorter one was cut off.
pub(crate) fn whole(path: &Path) -> Result<(), ViewError> {
    if beside(path, "-wal").exists() {
        return Ok(());
    }
    let bytes = fs::metadata(path).map_err(|e| ViewError::io(path, "measuring it", e))?.len();
    let db = connect(path, OpenFlags::SQLITE_OPEN_READ_ONLY)?;
    let ask = |name: &str| {
        let found = db.pragma_query_value(None, name, |r| r.get::<_, i64>(0));
        found.map(i64::cast_unsigned).map_err(|e| ViewError::sql(path, "measuring it", e))
    };
    if ask("page_count")?.saturating_mul(ask("page_size")?) != bytes {
        return Err(damaged(path, "it is not as long as it says"));
    }
    Ok(())
}
