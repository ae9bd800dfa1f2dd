//! Reading: entries and counts, by what people ask for. Works while the daemon runs, and never keeps
//! it from writing.

use std::collections::BTreeMap;
use std::ops::ControlFlow;
use std::path::{Path, PathBuf};

use rusqlite::{Connection, OpenFlags, ToSql, params};
use units::Utc;

use super::entries::{Entries, Entry, Names, Raw};
use super::file::{self, ViewHead};
use super::write::{DAY_US, day_text};
use super::{ViewError, rebuild};

/// Rows that room is made for before they are there.
const RESERVED_MOST: i64 = 1 << 16;

/// Which entries are wanted; the default is all.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Wanted {
    /// From this instant on, and before that one.
    pub from: Option<Utc>,
    pub to: Option<Utc>,
    /// The first sequence.
    pub from_seq: u64,
    /// Names as in [`record::kind`]; any of them, or all if there are none.
    pub kinds: Vec<String>,
    pub subject: Option<String>,
    /// At most so many, from the first on.
    pub limit: Option<u64>,
    /// Only so many of the last; then `limit` does not count.
    pub last: Option<u64>,
    /// Term and cause too.
    pub whole: bool,
}

/// The view, open to be read.
#[derive(Debug)]
pub struct ViewReader {
    pub(crate) db: Connection,
    pub(crate) path: PathBuf,
    head: ViewHead,
}

impl ViewReader {
    /// Opens the view in the state folder. Nothing in it can be changed through this.
    pub fn open(dir: &Path) -> Result<Self, ViewError> {
        let path = file::path(dir);
        if !path.exists() {
            return Err(ViewError::Missing { path });
        }
        let db = file::connect(&path, OpenFlags::SQLITE_OPEN_READ_ONLY)?;
        db.pragma_update(None, "query_only", "ON")
            .and_then(|()| db.pragma_update(None, "trusted_schema", "OFF"))
            .map_err(|e| ViewError::sql(&path, "setting it up", e))?;
        let head = file::known(&db, &path)?;
        Ok(Self { db, path, head })
    }

    /// Where it had come to when it was opened.
    pub fn head(&self) -> &ViewHead {
        &self.head
    }

    /// Gives each entry that is wanted to `visit`, in order, until it breaks off. All of them are
    /// of one moment.
    pub fn each_entry(
        &self,
        wanted: &Wanted,
        visit: &mut dyn FnMut(&Entry<'_>) -> ControlFlow<()>,
    ) -> Result<(), ViewError> {
        self.at_one_moment(|| {
            let names = Names::read(&self.db).map_err(|e| self.sql("reading entries", e))?;
            self.each_raw(wanted, &mut |&Raw { seq, utc, about, words, rest }| {
                let (kind, subject) = names.of(about);
                visit(&Entry { seq, utc, kind, subject, words, rest })
            })
        })
    }

    /// The entries that are wanted, in memory.
    pub fn entries(&self, wanted: &Wanted) -> Result<Entries, ViewError> {
        self.at_one_moment(|| {
            let sql = |e| self.sql("reading entries", e);
            let search = self.search(wanted).map_err(sql)?.filter(|s| s.is_of_all_abouts());
            let rows = search.map_or(0, |s| s.last - s.first + 1).clamp(0, RESERVED_MOST);
            let mut all = Entries::with(Names::read(&self.db).map_err(sql)?, rows as usize);
            self.each_raw(wanted, &mut |raw| {
                all.push(raw);
                ControlFlow::Continue(())
            })?;
            Ok(all)
        })
    }

    fn each_raw(
        &self,
        wanted: &Wanted,
        visit: &mut dyn FnMut(&Raw<'_>) -> ControlFlow<()>,
    ) -> Result<(), ViewError> {
        let sql = |e| self.sql("reading entries", e);
        let Some(mut search) = self.search(wanted).map_err(sql)? else { return Ok(()) };
        let (mut begin, mut end, mut left) = (i64::MIN, i64::MAX, u64::MAX);
        if wanted.last.is_none() {
            // A row is read anyway: it is quicker to look at its instant here than in SQL.
            begin = search.from.take().unwrap_or(begin);
            end = search.to.take().unwrap_or(end);
            left = wanted.limit.unwrap_or(left);
        }
        // Rows that follow each other without a gap are quicker counted than asked for their number.
        let counted = search.is_of_all_abouts() && wanted.last.is_none();
        let seq_at = if wanted.whole { 5 } else { 3 };
        let mut statement = self.db.prepare_cached(&search.text(wanted, counted)).map_err(sql)?;
        let mut rows = statement.query(search.values().as_slice()).map_err(sql)?;
        let mut next = search.first;
        while left > 0 {
            let Some(row) = rows.next().map_err(sql)? else { break };
            let seq = if counted { next } else { row.get(seq_at).map_err(sql)? };
            next = seq + 1;
            let raw = Raw::of(seq.cast_unsigned(), row, wanted.whole).map_err(sql)?;
            if (begin..end).contains(&raw.utc.as_micros()) {
                left -= 1;
                if visit(&raw).is_break() {
                    return Ok(());
                }
            }
        }
        if counted && left > 0 && next != search.last + 1 {
            return Err(file::damaged(&self.path, "rows are missing in it"));
        }
        Ok(())
    }

    /// Where it has come to by the moment that is being read.
    pub(crate) fn head_now(&self) -> Result<ViewHead, ViewError> {
        file::known(&self.db, &self.path)
    }

    /// Everything that rows are about, by name.
    pub fn subjects(&self) -> Result<Vec<String>, ViewError> {
        let sql = |e| self.sql("reading subjects", e);
        let mut statement =
            self.db.prepare("SELECT DISTINCT subject FROM abouts ORDER BY subject").map_err(sql)?;
        statement.query_map([], |r| r.get(0)).and_then(Iterator::collect).map_err(sql)
    }

    /// What is read in here is of one moment, whatever is written meanwhile.
    pub(crate) fn at_one_moment<T>(
        &self,
        read: impl FnOnce() -> Result<T, ViewError>,
    ) -> Result<T, ViewError> {
        let sql = |e| self.sql("reading at one moment", e);
        let moment = self.db.unchecked_transaction().map_err(sql)?;
        let found = read()?;
        moment.finish().map_err(sql)?;
        Ok(found)
    }

    /// How many entries of each kind are wanted, by name. Whole days are not looked through: they
    /// have been counted as they came. `limit` and `last` do not count here.
    pub fn counts(&self, wanted: &Wanted) -> Result<BTreeMap<String, u64>, ViewError> {
        self.at_one_moment(|| {
            let counts = if wanted.subject.is_none() && wanted.from_seq <= 1 {
                self.counts_by_day(wanted)
            } else {
                self.counted(wanted)
            };
            counts.map_err(|e| self.sql("counting", e))
        })
    }

    fn counts_by_day(&self, wanted: &Wanted) -> rusqlite::Result<BTreeMap<String, u64>> {
        let mut counts = BTreeMap::new();
        let begin = wanted.from.map_or(i64::MIN, Utc::as_micros);
        let end = wanted.to.map_or(i64::MAX, Utc::as_micros);
        // The first whole day, and the first day after the last whole one.
        let first = begin.div_euclid(DAY_US) + i64::from(begin.rem_euclid(DAY_US) > 0);
        let after = end.div_euclid(DAY_US);
        if first >= after {
            return self.counted(wanted);
        }
        let mut whole = self.db.prepare_cached(
            "SELECT kind, sum(n) FROM counts_by_day WHERE day >= ?1 AND day < ?2 GROUP BY kind",
        )?;
        let from_day = wanted.from.map_or(String::new(), |_| day_text(first));
        let to_day = wanted.to.map_or("a".to_owned(), |_| day_text(after));
        let mut rows = whole.query(params![from_day, to_day])?;
        while let Some(row) = rows.next()? {
            add(&mut counts, wanted, row)?;
        }
        let at = |day: i64| Utc::from_micros(day * DAY_US);
        for (from, to) in [
            (wanted.from, wanted.from.map(|_| at(first))),
            (wanted.to.map(|_| at(after)), wanted.to),
        ] {
            if from < to {
                let edge = Wanted { from, to, ..wanted.clone() };
                for (kind, n) in self.counted(&edge)? {
                    *counts.entry(kind).or_default() += n;
                }
            }
        }
        Ok(counts)
    }

    /// By looking at each entry.
    fn counted(&self, wanted: &Wanted) -> rusqlite::Result<BTreeMap<String, u64>> {
        let mut counts = BTreeMap::new();
        let wanted = Wanted { limit: None, last: None, ..wanted.clone() };
        let Some(search) = self.search(&wanted)? else { return Ok(counts) };
        let text = format!(
            "SELECT kind, sum(n) FROM (SELECT about AS number, count(*) AS n {} GROUP BY about) \
             JOIN abouts USING (number) GROUP BY kind",
            search.source()
        );
        let mut statement = self.db.prepare_cached(&text)?;
        let mut rows = statement.query(search.values().as_slice())?;
        while let Some(row) = rows.next()? {
            add(&mut counts, &wanted, row)?;
        }
        Ok(counts)
    }

    /// Between which rows the wanted ones lie; `None` if there can be none.
    fn search<'a>(&self, wanted: &'a Wanted) -> rusqlite::Result<Option<Search<'a>>> {
        let mut search = Search {
            first: wanted.from_seq.max(1).cast_signed(),
            last: self.db.query_row("SELECT head_seq FROM meta", [], |r| r.get(0))?,
            from: wanted.from.map(Utc::as_micros),
            to: wanted.to.map(Utc::as_micros),
            kinds: &wanted.kinds,
            subject: wanted.subject.as_deref(),
        };
        if search.from.is_some() || search.to.is_some() {
            let day = |us: i64| day_text(us.div_euclid(DAY_US));
            let from = search.from.map_or(String::new(), day);
            let to = search.to.map_or("a".to_owned(), day);
            let mut statement = self.db.prepare_cached(
                "SELECT min(first_seq), max(last_seq) FROM days WHERE day >= ?1 AND day <= ?2",
            )?;
            let ends: (Option<i64>, Option<i64>) =
                statement.query_row(params![from, to], |r| Ok((r.get(0)?, r.get(1)?)))?;
            let (Some(first), Some(last)) = ends else { return Ok(None) };
            (search.first, search.last) = (search.first.max(first), search.last.min(last));
        }
        Ok((search.first <= search.last).then_some(search))
    }

    pub(crate) fn sql(&self, doing: &'static str, e: rusqlite::Error) -> ViewError {
        ViewError::sql(&self.path, doing, e)
    }
}

fn add(
    counts: &mut BTreeMap<String, u64>,
    wanted: &Wanted,
    row: &rusqlite::Row<'_>,
) -> rusqlite::Result<()> {
    let kind: String = row.get(0)?;
    if wanted.kinds.is_empty() || wanted.kinds.contains(&kind) {
        *counts.entry(kind).or_default() += row.get::<_, i64>(1)?.cast_unsigned();
    }
    Ok(())
}

/// The wanted entries lie between two rows, so that nothing before or after is looked at.
struct Search<'a> {
    first: i64,
    last: i64,
    from: Option<i64>,
    to: Option<i64>,
    kinds: &'a [String],
    subject: Option<&'a str>,
}

impl Search<'_> {
    fn is_of_all_abouts(&self) -> bool {
        self.kinds.is_empty() && self.subject.is_none()
    }

    /// The plus keeps SQLite from an index where the span of rows is the quicker way.
    fn source(&self) -> String {
        let mut text = "FROM entry_rows WHERE seq >= ? AND seq <= ?".to_owned();
        text.push_str(if self.from.is_some() { " AND +utc_us >= ?" } else { "" });
        text.push_str(if self.to.is_some() { " AND +utc_us < ?" } else { "" });
        if !self.is_of_all_abouts() {
            text.push_str(" AND about IN (SELECT number FROM abouts WHERE ");
            text.push_str(if self.subject.is_some() { "subject = ?" } else { "true" });
            if let Some(more) = self.kinds.len().checked_sub(1) {
                text.push_str(&format!(" AND kind IN (?{})", ", ?".repeat(more)));
            }
            text.push(')');
        }
        text
    }

    fn text(&self, wanted: &Wanted, counted: bool) -> String {
        let rest = if wanted.whole { ", term, cause" } else { "" };
        let seq = if counted { "" } else { ", seq" };
        let text = format!("SELECT utc_us, about, words{rest}{seq} {}", self.source());
        match wanted.last {
            Some(last) => {
                format!("SELECT * FROM ({text} ORDER BY seq DESC LIMIT {last}) ORDER BY seq")
            }
            None => format!("{text} ORDER BY seq"),
        }
    }

    fn values(&self) -> Vec<&dyn ToSql> {
        let mut values: Vec<&dyn ToSql> = vec![&self.first, &self.last];
        values.extend(self.from.as_ref().map(|v| v as &dyn ToSql));
        values.extend(self.to.as_ref().map(|v| v as &dyn ToSql));
        values.extend(self.subject.as_ref().map(|v| v as &dyn ToSql));
        values.extend(self.kinds.iter().map(|v| v as &dyn ToSql));
        values
    }
}

/// By how many rows the evidence is ahead of the view, while no daemon runs.
pub fn evidence_ahead(dir: &Path, head: &ViewHead) -> Result<u64, ViewError> {
    Ok(rebuild::last_seq(dir)?.saturating_sub(head.seq))
}
