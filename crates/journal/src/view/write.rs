//! Writing: rows of the record, a transaction at a time, in the order of the record.

use std::borrow::Cow;
use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::time::Duration;

use record::{Field, Fields, Row, kind};
use rusqlite::types::{ToSqlOutput, ValueRef};
use rusqlite::{Connection, OpenFlags, ToSql, params, params_from_iter};
use units::Utc;

use super::file::{self, ViewHead};
use super::{ViewError, hex};

pub(crate) const DAY_US: i64 = 86_400_000_000;

/// An open view, ready to take the next rows.
///
/// Its syncs are those of `synchronous = NORMAL`: a power cut may cost the last transactions, which
/// are then taken from the evidence again. What is in the evidence is not at stake here.
#[derive(Debug)]
pub struct View {
    db: Connection,
    path: PathBuf,
    head: ViewHead,
    abouts: Abouts,
}

impl View {
    /// Opens the view in the state folder. [`rebuild_view`](crate::rebuild_view) makes one.
    ///
    /// # Errors
    /// [`ViewError::Missing`], [`ViewError::Older`] and [`ViewError::Damaged`] are mended by a
    /// rebuild; [`ViewError::Newer`] and [`ViewError::NotAView`] by a person.
    pub fn open(dir: &Path) -> Result<Self, ViewError> {
        let path = file::path(dir);
        if !path.exists() {
            return Err(ViewError::Missing { path });
        }
        // With ordinary locking the WAL's index is a mapped file, and to write into one without room
        // ends a process by a signal.
        file::room(&path)?;
        file::whole(&path)?;
        let db = file::connect(&path, OpenFlags::SQLITE_OPEN_READ_WRITE)?;
        // Named before anything is changed: a stranger's file stays as it is.
        file::known(&db, &path)?;
        settle(&db, &path, "WAL", "NORMAL")?;
        let head = file::known(&db, &path)?;
        let mut view = Self { db, path, head, abouts: Abouts::new() };
        view.know_abouts()?;
        Ok(view)
    }

    /// An empty one at `path`, on its way: nobody reads it and nobody keeps it if this fails.
    pub(crate) fn begin(path: &Path) -> Result<Self, ViewError> {
        file::remove(path)?;
        file::create(path)?;
        let db = file::connect(path, OpenFlags::SQLITE_OPEN_READ_WRITE)?;
        // A month of rows is read in half as many calls as with the usual 4096.
        db.pragma_update(None, "page_size", 8192)
            .map_err(|e| ViewError::sql(path, "setting it up", e))?;
        settle(&db, path, "OFF", "OFF")?;
        file::make_tables(&db, path)?;
        let (path, head) = (path.to_owned(), ViewHead::default());
        Ok(Self { db, path, head, abouts: Abouts::new() })
    }

    /// The indexes are made last: that is quicker.
    pub(crate) fn finish(self) -> Result<(), ViewError> {
        file::make_indexes(&self.db, &self.path)?;
        let Self { db, path, .. } = self;
        db.close().map_err(|(_, e)| ViewError::sql(&path, "closing it", e))
    }

    /// The last row that is in it.
    pub fn head(&self) -> &ViewHead {
        &self.head
    }

    /// Takes rows in the order of the record, as one transaction; those that are in it already are
    /// passed over.
    ///
    /// # Errors
    /// [`ViewError::Gap`] if the next row is not among them; nothing is taken then.
    pub fn take(&mut self, rows: &[Row]) -> Result<(), ViewError> {
        let have = rows.iter().take_while(|r| r.seq <= self.head.seq).count();
        let rows = &rows[have..];
        let Some(last) = rows.last() else { return Ok(()) };
        for (row, wanted) in rows.iter().zip(self.head.seq + 1..) {
            if row.seq != wanted {
                return Err(ViewError::Gap { wanted, found: row.seq });
            }
        }
        file::room(&self.path)?;
        let head = ViewHead { seq: last.seq, hash: hex(&last.hash) };
        if let Err(e) = self.write(rows, &head) {
            // Those that were new have gone with the transaction.
            self.know_abouts()?;
            return Err(ViewError::sql(&self.path, "taking rows", e));
        }
        self.head = head;
        Ok(())
    }

    fn know_abouts(&mut self) -> Result<(), ViewError> {
        let known = abouts(&self.db);
        self.abouts = known.map_err(|e| ViewError::sql(&self.path, "reading what is in it", e))?;
        Ok(())
    }

    fn write(&mut self, rows: &[Row], head: &ViewHead) -> rusqlite::Result<()> {
        let transaction = self.db.unchecked_transaction()?;
        let mut days = Days::default();
        for row in rows {
            let about = about(&self.db, &mut self.abouts, row)?;
            insert(&self.db, row, about)?;
            days.count(row);
        }
        days.write(&self.db)?;
        let mut meta = self.db.prepare_cached("UPDATE meta SET head_seq = ?1, head_hash = ?2")?;
        meta.execute(params![head.seq.cast_signed(), head.hash])?;
        transaction.commit()
    }

    /// Looks at every page. What it finds is mended by a rebuild.
    pub fn check(&self) -> Result<(), ViewError> {
        let found: String = self
            .db
            .query_row("PRAGMA quick_check(1)", [], |r| r.get(0))
            .map_err(|e| ViewError::sql(&self.path, "checking it", e))?;
        if found == "ok" { Ok(()) } else { Err(file::damaged(&self.path, &found)) }
    }

    /// Closes it as one file, so that people read it without the right to write beside it. While
    /// somebody reads, it stays in two; the next close makes it one.
    pub fn close(self) -> Result<(), ViewError> {
        let Self { db, path, .. } = self;
        let sql = |e| ViewError::sql(&path, "closing it", e);
        db.busy_timeout(Duration::ZERO).map_err(sql)?;
        let one = db.pragma_update_and_check(None, "journal_mode", "DELETE", |_| Ok(()));
        match one.map_err(sql) {
            Ok(()) | Err(ViewError::Held { .. }) => {}
            Err(e) => return Err(e),
        }
        db.close().map_err(|(_, e)| ViewError::sql(&path, "closing it", e))
    }
}

fn settle(db: &Connection, path: &Path, mode: &str, synchronous: &str) -> Result<(), ViewError> {
    let sql = |e| ViewError::sql(path, "setting it up", e);
    db.pragma_update_and_check(None, "journal_mode", mode, |_| Ok(())).map_err(sql)?;
    db.pragma_update(None, "synchronous", synchronous).map_err(sql)?;
    // A reader who stays for hours lets the WAL grow; afterwards it shrinks again.
    db.pragma_update_and_check(None, "journal_size_limit", 16 << 20, |_| Ok(())).map_err(sql)?;
    db.pragma_update(None, "trusted_schema", "OFF").map_err(sql)
}

/// What a kind is called in the view; a kind of another version by its number.
pub(crate) fn kind_name(number: u16) -> Cow<'static, str> {
    kind::name(number).map_or_else(|| Cow::Owned(format!("kind {number}")), Cow::Borrowed)
}

/// The day of an instant, as people write it.
pub(crate) fn day_text(day: i64) -> String {
    let text = Utc::from_micros(day.saturating_mul(DAY_US)).to_string();
    text.split_once('T').map_or(text.as_str(), |(day, _)| day).to_owned()
}

/// By kind, then by subject.
type Abouts = BTreeMap<String, BTreeMap<String, i64>>;

fn abouts(db: &Connection) -> rusqlite::Result<Abouts> {
    let mut statement = db.prepare_cached("SELECT kind, subject, number FROM abouts")?;
    let mut rows = statement.query([])?;
    let mut abouts = Abouts::new();
    while let Some(row) = rows.next()? {
        abouts.entry(row.get(0)?).or_default().insert(row.get(1)?, row.get(2)?);
    }
    Ok(abouts)
}

/// The number of the row's kind and subject; a new one if they have not come together before.
fn about(db: &Connection, abouts: &mut Abouts, row: &Row) -> rusqlite::Result<i64> {
    let kind = kind_name(row.kind);
    if let Some(number) = abouts.get(kind.as_ref()).and_then(|s| s.get(&row.subject)) {
        return Ok(*number);
    }
    let mut new = db.prepare_cached("INSERT INTO abouts (kind, subject) VALUES (?1, ?2)")?;
    let number = new.insert(params![kind.as_ref(), row.subject])?;
    abouts.entry(kind.into_owned()).or_default().insert(row.subject.clone(), number);
    Ok(number)
}

fn insert(db: &Connection, row: &Row, about: i64) -> rusqlite::Result<()> {
    let mut entry = db.prepare_cached(
        "INSERT INTO entry_rows (seq, utc_us, about, words, term, cause) \
         VALUES (?1, ?2, ?3, ?4, ?5, ?6)",
    )?;
    let (seq, term) = (row.seq.cast_signed(), row.term.cast_signed());
    let (utc, words) = (row.utc.as_micros(), record::describe(row));
    entry.execute(params![seq, utc, about, words, term, row.cause])?;
    // A row that does not read is in `entries` with words that say so, and nowhere else.
    let Ok(fields) = record::fields(row) else { return Ok(()) };
    if let Some((_, text, columns)) = FIELDS.iter().find(|(k, ..)| *k == row.kind) {
        insert_fields(db, seq, &fields, text, columns)?;
    }
    for (objection, no) in fields.objections.iter().zip(1_i64..) {
        let mut statement = db.prepare_cached("INSERT INTO objections VALUES (?1, ?2, ?3, ?4)")?;
        statement.execute(params![seq, no, objection.by, objection.name])?;
    }
    Ok(())
}

/// (kind, statement, its values after the first, which is the row's number).
const FIELDS: [(u16, &str, &[&str]); 11] = [
    (
        kind::DECISION,
        "INSERT INTO decision_fields VALUES (?1, ?2, ?3, ?4)",
        &["action", "opening_percent", "plan"],
    ),
    (
        kind::INTENT,
        "INSERT INTO intent_fields VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7)",
        &["action", "opening_percent", "command", "lease_end_ns", "state_seq", "readings"],
    ),
    (
        kind::OUTCOME,
        "INSERT INTO outcome_fields VALUES (?1, ?2, ?3, ?4)",
        &["command", "outcome", "why"],
    ),
    (
        kind::CONFIRMED,
        "INSERT INTO confirmation_fields VALUES (?1, ?2, ?3)",
        &["command", "position_percent"],
    ),
    (
        kind::DISCREPANCY,
        "INSERT INTO discrepancy_fields VALUES (?1, ?2, ?3, ?4)",
        &["command", "wanted_percent", "found_percent"],
    ),
    (kind::REST, "INSERT INTO rest_fields VALUES (?1, ?2, ?3)", &["action", "cause"]),
    (
        kind::RELEASED,
        "INSERT INTO release_fields VALUES (?1, ?2, ?3, ?4, ?5, ?6)",
        &["tide", "begins_us", "ends_us", "volume_m3", "estimated"],
    ),
    (
        kind::WINDOW_MISSED,
        "INSERT INTO missed_fields VALUES (?1, ?2, ?3, ?4, ?5)",
        &["tide", "begins_us", "ends_us", "cause"],
    ),
    (
        kind::SPILL_FORECAST,
        "INSERT INTO spill_fields VALUES (?1, ?2, ?3, ?4, ?5)",
        &["begins_us", "ends_us", "volume_m3", "clauses"],
    ),
    (
        kind::PLAN_ADOPTED,
        "INSERT INTO plan_fields VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7)",
        &["plan", "parent", "release_m3", "spill_m3", "request_digest", "forecast_digest"],
    ),
    (
        kind::ACT,
        "INSERT INTO act_fields VALUES (?1, ?2, ?3, ?4, ?5, ?6)",
        &["ordered", "who", "reason", "peer", "refused"],
    ),
];

fn insert_fields(
    db: &Connection,
    seq: i64,
    fields: &Fields,
    text: &str,
    columns: &[&str],
) -> rusqlite::Result<()> {
    let first = Value(&Field::Whole(seq));
    let rest = columns.iter().map(|name| Value(fields.get(name)));
    let mut statement = db.prepare_cached(text)?;
    statement.execute(params_from_iter(std::iter::once(first).chain(rest)))?;
    Ok(())
}

struct Value<'a>(&'a Field);

impl ToSql for Value<'_> {
    fn to_sql(&self) -> rusqlite::Result<ToSqlOutput<'_>> {
        Ok(ToSqlOutput::Borrowed(match self.0 {
            Field::Text(text) => ValueRef::Text(text.as_bytes()),
            Field::Whole(n) => ValueRef::Integer(*n),
            // SQLite makes NULL of what is no number.
            Field::Number(v) => ValueRef::Real(*v),
            Field::Nothing => ValueRef::Null,
        }))
    }
}

/// What a transaction's rows add to `days` and `counts_by_day`.
#[derive(Default)]
struct Days {
    counts: BTreeMap<(i64, u16), i64>,
    spans: BTreeMap<i64, (i64, i64)>,
}

impl Days {
    fn count(&mut self, row: &Row) {
        let (day, seq) = (row.utc.as_micros().div_euclid(DAY_US), row.seq.cast_signed());
        *self.counts.entry((day, row.kind)).or_default() += 1;
        self.spans.entry(day).or_insert((seq, seq)).1 = seq;
    }

    fn write(&self, db: &Connection) -> rusqlite::Result<()> {
        let mut span = db.prepare_cached(
            "INSERT INTO days VALUES (?1, ?2, ?3) \
             ON CONFLICT (day) DO UPDATE SET last_seq = excluded.last_seq",
        )?;
        for (day, (first, last)) in &self.spans {
            span.execute(params![day_text(*day), first, last])?;
        }
        let mut count = db.prepare_cached(
            "INSERT INTO counts_by_day VALUES (?1, ?2, ?3) \
             ON CONFLICT (day, kind) DO UPDATE SET n = n + excluded.n",
        )?;
        for ((day, kind), n) in &self.counts {
            count.execute(params![day_text(*day), kind_name(*kind).as_ref(), n])?;
        }
        Ok(())
    }
}
