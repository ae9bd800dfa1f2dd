//! The chain: each row's hash is taken over the one before it and the row's own bytes.

use record::{Row, canonical_bytes};
use rusqlite::types::FromSql;
use units::{Mono, Utc};

use crate::JournalError;
use crate::file::Evidence;

/// What stands before the first row.
pub(crate) const GENESIS: [u8; 32] = [0; 32];
/// Sets these hashes apart from every other use of BLAKE3. Part of the form: never changes.
const CONTEXT: &str = "tidereeve evidence row, form 1";

/// BLAKE3 in its key-derivation mode over `previous` and the row's canonical bytes.
pub(crate) fn hash(previous: &[u8; 32], row: &Row) -> [u8; 32] {
    let mut hasher = blake3::Hasher::new_derive_key(CONTEXT);
    hasher.update(previous);
    hasher.update(&canonical_bytes(row));
    *hasher.finalize().as_bytes()
}

/// Where the chain ends.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) struct Head {
    pub(crate) seq: u64,
    pub(crate) term: u64,
    pub(crate) hash: [u8; 32],
}

impl Head {
    pub(crate) const NONE: Self = Self { seq: 0, term: 0, hash: GENESIS };

    fn after(row: &Row) -> Self {
        Self { seq: row.seq, term: row.term, hash: row.hash }
    }

    /// Puts the next row in its place.
    pub(crate) fn chain(&mut self, row: &mut Row) {
        row.seq = self.seq + 1;
        row.hash = hash(&self.hash, row);
        *self = Self::after(row);
    }

    /// Checks that `row` is the next one.
    fn follow(&mut self, row: &Row) -> Result<(), String> {
        let wanted = self.seq + 1;
        if row.seq != wanted {
            return Err(format!("row {wanted} is missing; the next is {}", row.seq));
        }
        if row.hash != hash(&self.hash, row) {
            return Err("its hash is not that of the row before it and its own fields".to_owned());
        }
        if row.term < self.term {
            return Err(format!("its term {} is before term {}", row.term, self.term));
        }
        *self = Self::after(row);
        Ok(())
    }
}

pub(crate) const COLUMNS: &str =
    "seq, term, utc_us, boot_ns, kind, version, subject, cause, body, hash";

/// Reads one row of [`COLUMNS`]. Every field must have its type and range.
pub(crate) fn row(r: &rusqlite::Row<'_>) -> rusqlite::Result<Row> {
    Ok(Row {
        seq: bits(r, 0)?,
        term: bits(r, 1)?,
        utc: Utc::from_micros(r.get(2)?),
        boot: Mono::from_nanos(bits(r, 3)?),
        kind: r.get(4)?,
        version: r.get(5)?,
        subject: r.get(6)?,
        cause: r.get(7)?,
        body: r.get(8)?,
        hash: array(r, 9)?,
    })
}

fn bits(r: &rusqlite::Row<'_>, column: usize) -> rusqlite::Result<u64> {
    r.get::<_, i64>(column).map(i64::cast_unsigned)
}

fn array(r: &rusqlite::Row<'_>, column: usize) -> rusqlite::Result<[u8; 32]> {
    let value = r.get_ref(column)?;
    FromSql::column_result(value).map_err(|e| {
        rusqlite::Error::FromSqlConversionFailure(column, value.data_type(), Box::new(e))
    })
}

/// Walks the whole chain and gives each row, once it is found right, to `visit`. Stops at the first
/// row that is wrong.
pub(crate) fn walk(evidence: &Evidence, visit: &mut dyn FnMut(Row)) -> Result<Head, JournalError> {
    let mut head = Head::NONE;
    let bad = |head: &Head, why: String| JournalError::FirstBad { seq: head.seq + 1, why };
    let text = format!("SELECT {COLUMNS} FROM evidence ORDER BY seq");
    let mut statement = evidence.db.prepare(&text).map_err(|e| unreadable(evidence, &head, e))?;
    let mut rows = statement.query([]).map_err(|e| unreadable(evidence, &head, e))?;
    loop {
        let next = rows.next().and_then(|r| r.map(row).transpose());
        match next {
            Ok(None) => return Ok(head),
            Ok(Some(row)) => {
                head.follow(&row).map_err(|why| bad(&head, why))?;
                visit(row);
            }
            Err(e) => return Err(unreadable(evidence, &head, e)),
        }
    }
}

fn unreadable(evidence: &Evidence, head: &Head, e: rusqlite::Error) -> JournalError {
    match evidence.sql("reading it", e) {
        JournalError::Sql { source, .. } => JournalError::FirstBad {
            seq: head.seq + 1,
            why: format!("it cannot be read: {source}"),
        },
        other => other,
    }
}
