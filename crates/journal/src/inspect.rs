//! Looking at the evidence while no daemon runs. Nothing in it changes.

use std::ops::ControlFlow;
use std::path::Path;

use record::Row;
use rusqlite::params;
use units::Utc;

use crate::JournalError;
use crate::chain;
use crate::file::Evidence;

/// What a whole verification found.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Verified {
    pub rows: u64,
    /// The hash of the last row. Two copies of one record have the same; a copy that ends earlier
    /// verifies too, so compare this with one that was kept elsewhere.
    pub head_hex: String,
}

/// Verifies the chain from the first row to the last. `progress` is told (rows done, rows in all)
/// every thousand rows and at the end. The error [`JournalError::FirstBad`] names the first row that
/// is wrong.
pub fn verify(dir: &Path, progress: &mut dyn FnMut(u64, u64)) -> Result<Verified, JournalError> {
    let evidence = Evidence::open_to_read(dir)?;
    // A damaged file may not even count; the walk then says which row is the first.
    let last: Option<i64> =
        evidence.db.query_row("SELECT max(seq) FROM evidence", [], |r| r.get(0)).unwrap_or(None);
    let total = last.map_or(0, i64::cast_unsigned);
    let head = chain::walk(&evidence, &mut |row| {
        if row.seq % 1000 == 0 {
            progress(row.seq, total);
        }
    })?;
    progress(head.seq, total.max(head.seq));
    let head_hex = blake3::Hash::from_bytes(head.hash).to_hex().to_string();
    Ok(Verified { rows: head.seq, head_hex })
}

/// Which rows are wanted; the default is all.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Filter {
    /// The first sequence.
    pub from_seq: u64,
    /// From this instant on, and before that one.
    pub from: Option<Utc>,
    pub to: Option<Utc>,
    /// One of [`record::kind`].
    pub kind: Option<u16>,
    pub subject: Option<String>,
    /// At most so many.
    pub limit: Option<u64>,
}

/// Gives each row that passes the filter to `visit`, in order of sequence, until it breaks off. It
/// does not verify the chain: [`verify`] does.
pub fn each_row(
    dir: &Path,
    filter: &Filter,
    visit: &mut dyn FnMut(Row) -> ControlFlow<()>,
) -> Result<(), JournalError> {
    let evidence = Evidence::open_to_read(dir)?;
    let sql = |e| evidence.sql("reading rows", e);
    let text = format!(
        "SELECT {} FROM evidence WHERE seq >= ?1 AND (?2 IS NULL OR utc_us >= ?2) AND \
         (?3 IS NULL OR utc_us < ?3) AND (?4 IS NULL OR kind = ?4) AND \
         (?5 IS NULL OR subject = ?5) ORDER BY seq LIMIT ?6",
        chain::COLUMNS
    );
    let mut statement = evidence.db.prepare(&text).map_err(sql)?;
    let limit = filter.limit.map_or(-1, |n| i64::try_from(n).unwrap_or(i64::MAX));
    let micros = |t: Option<Utc>| t.map(Utc::as_micros);
    let from_seq = i64::try_from(filter.from_seq).unwrap_or(i64::MAX);
    let (from, to, subject) = (micros(filter.from), micros(filter.to), filter.subject.as_deref());
    let wanted = params![from_seq, from, to, filter.kind, subject, limit];
    let rows = statement.query_map(wanted, chain::row).map_err(sql)?;
    for row in rows {
        if visit(row.map_err(sql)?).is_break() {
            break;
        }
    }
    Ok(())
}

/// The rows that pass the filter, in order of sequence.
pub fn rows(dir: &Path, filter: &Filter) -> Result<Vec<Row>, JournalError> {
    let mut all = Vec::new();
    each_row(dir, filter, &mut |row| {
        all.push(row);
        ControlFlow::Continue(())
    })?;
    Ok(all)
}
