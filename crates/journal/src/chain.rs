//! The chain: each row's hash is taken over the one before it and the row's own bytes.

use std::sync::LazyLock;

use blake3::hazmat::{ContextKey, HasherExt, hash_derive_key_context};
use record::{Row, canonical_bytes};
use rusqlite::types::FromSql;
use units::{Mono, Utc};

use crate::JournalError;
use crate::file::Evidence;
use crate::packs::Place;

/// What stands before the first row.
pub(crate) const GENESIS: [u8; 32] = [0; 32];
/// Sets these hashes apart from every other use of BLAKE3. Part of the form: never changes.
const CONTEXT: &str = "tidereeve evidence row, form 1";
static KEY: LazyLock<ContextKey> = LazyLock::new(|| hash_derive_key_context(CONTEXT));

/// BLAKE3 in its key-derivation mode over `previous` and the row's canonical bytes.
pub(crate) fn hash(previous: &[u8; 32], row: &Row) -> [u8; 32] {
    let mut hasher = blake3::Hasher::new_from_context_key(&KEY);
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

    pub(crate) fn after(row: &Row) -> Self {
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
            return Err(missing(wanted, row.seq));
        }
        if row.hash != hash(&self.hash, row) {
            return Err("its hash is not that of the row before it and its own fields".to_owned());
        }
        self.rise(row)
    }

    /// Takes a row whose hash has been found right already.
    fn rise(&mut self, row: &Row) -> Result<(), String> {
        if row.term < self.term {
            return Err(format!("its term {} is before term {}", row.term, self.term));
        }
        *self = Self::after(row);
        Ok(())
    }

    pub(crate) fn hex(&self) -> String {
        blake3::Hash::from_bytes(self.hash).to_hex().to_string()
    }
}

fn missing(wanted: u64, next: u64) -> String {
    format!("row {wanted} is missing; the next is {next}")
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

pub(crate) fn bits(r: &rusqlite::Row<'_>, column: usize) -> rusqlite::Result<u64> {
    r.get::<_, i64>(column).map(i64::cast_unsigned)
}

pub(crate) fn array(r: &rusqlite::Row<'_>, column: usize) -> rusqlite::Result<[u8; 32]> {
    let value = r.get_ref(column)?;
    FromSql::column_result(value).map_err(|e| {
        rusqlite::Error::FromSqlConversionFailure(column, value.data_type(), Box::new(e))
    })
}

/// A walk along the chain from a row that is believed, in portions as large as the caller likes.
/// Stops at the first row that is wrong.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Walk {
    head: Head,
    /// Ends before this sequence; to the last row if there is none.
    before_seq: Option<u64>,
}

impl Walk {
    /// From the first row to the last.
    pub(crate) const WHOLE: Self = Self { head: Head::NONE, before_seq: None };

    /// From the row after `head` to the last.
    pub(crate) const fn after(head: Head) -> Self {
        Self { head, before_seq: None }
    }

    /// From the first row to the one before `seq`.
    pub(crate) const fn up_to(seq: u64) -> Self {
        Self { head: Head::NONE, before_seq: Some(seq) }
    }

    pub(crate) const fn head(&self) -> Head {
        self.head
    }

    /// The next pack, or at most `most` rows; `false` at the end.
    pub(crate) fn portion(
        &mut self,
        evidence: &Evidence,
        most: usize,
        visit: &mut dyn FnMut(Row),
    ) -> Result<bool, JournalError> {
        let begin = self.head.seq;
        let places = evidence.packs(begin + 1).map_err(|e| self.unreadable(evidence, e))?;
        let on = match places.first() {
            Some(place) => self.packed(evidence, place, visit)?,
            None => self.live(evidence, most, visit)?,
        };
        Ok(on && self.head.seq > begin)
    }

    fn packed(
        &mut self,
        evidence: &Evidence,
        place: &Place,
        visit: &mut dyn FnMut(Row),
    ) -> Result<bool, JournalError> {
        let (begin, wanted) = (self.head, self.head.seq + 1);
        if place.first_seq > wanted {
            return Err(self.bad(missing(wanted, place.first_seq)));
        }
        if place.first_seq == wanted && place.before != begin.hash {
            return Err(self.bad("its pack goes on from another hash".to_owned()));
        }
        for row in evidence.unpack(place)? {
            if row.seq <= begin.seq {
                if row.seq == begin.seq && row.hash != begin.hash {
                    return Err(self.bad("the row before it is another in its pack".to_owned()));
                }
                continue;
            }
            if self.before_seq.is_some_and(|b| row.seq >= b) {
                return Ok(false);
            }
            self.head.rise(&row).map_err(|why| self.bad(why))?;
            visit(row);
        }
        Ok(true)
    }

    fn live(
        &mut self,
        evidence: &Evidence,
        most: usize,
        visit: &mut dyn FnMut(Row),
    ) -> Result<bool, JournalError> {
        self.nothing_before(evidence)?;
        let text = format!("SELECT {COLUMNS} FROM evidence WHERE seq > ?1 ORDER BY seq LIMIT ?2");
        let mut statement =
            evidence.db.prepare_cached(&text).map_err(|e| self.unreadable(evidence, e))?;
        let limit = i64::try_from(most).unwrap_or(i64::MAX);
        let mut rows = statement
            .query((self.head.seq.cast_signed(), limit))
            .map_err(|e| self.unreadable(evidence, e))?;
        loop {
            let next = rows.next().and_then(|r| r.map(row).transpose());
            let Some(row) = next.map_err(|e| self.unreadable(evidence, e))? else {
                return Ok(true);
            };
            if self.before_seq.is_some_and(|b| row.seq >= b) {
                return Ok(false);
            }
            self.head.follow(&row).map_err(|why| self.bad(why))?;
            visit(row);
        }
    }

    /// All that is left.
    pub(crate) fn finish(
        mut self,
        evidence: &Evidence,
        visit: &mut dyn FnMut(Row),
    ) -> Result<Head, JournalError> {
        while self.portion(evidence, LIVE_PORTION, visit)? {}
        Ok(self.head)
    }

    /// A row may stand only once: none is live that is in a pack, or before the first.
    fn nothing_before(&self, evidence: &Evidence) -> Result<(), JournalError> {
        let packed = evidence.packed_to().map_err(|e| self.unreadable(evidence, e))?;
        let first: Option<i64> = evidence
            .db
            .query_row("SELECT min(seq) FROM evidence", [], |r| r.get(0))
            .map_err(|e| self.unreadable(evidence, e))?;
        match first {
            Some(first) if first <= packed.cast_signed() => {
                Err(self.bad(format!("a row numbered {first} stands outside its place")))
            }
            _ => Ok(()),
        }
    }

    fn bad(&self, why: String) -> JournalError {
        JournalError::FirstBad { seq: self.head.seq + 1, why }
    }

    fn unreadable(&self, evidence: &Evidence, e: rusqlite::Error) -> JournalError {
        match evidence.sql("reading it", e) {
            JournalError::Sql { source, .. } => self.bad(format!("it cannot be read: {source}")),
            other => other,
        }
    }
}

/// Rows taken at a time where nobody waits.
const LIVE_PORTION: usize = 4096;
