//! Rows that have been packed, and the packing of more.

use record::Row;
use rusqlite::params;

use crate::JournalError;
use crate::chain::{self, GENESIS};
use crate::file::Evidence;
use crate::{forms, pack};

/// Rows in a pack. Twice as many save little more space; a quarter of it is read as a whole in the
/// time of one commit.
pub(crate) const ROWS: u64 = 4096;
/// Rows that are never packed: what people and the next start look at.
const LIVE_LEAST: u64 = 2 * ROWS;

/// Where a pack stands in the chain.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) struct Place {
    pub(crate) first_seq: u64,
    pub(crate) last_seq: u64,
    pub(crate) first_utc_us: i64,
    pub(crate) last_utc_us: i64,
    pub(crate) before: [u8; 32],
    pub(crate) after: [u8; 32],
}

impl Evidence {
    /// The packs that end at `from_seq` or later, in order. A file of an older form has none.
    pub(crate) fn packs(&self, from_seq: u64) -> rusqlite::Result<Vec<Place>> {
        if self.form < forms::WITH_PACKS {
            return Ok(Vec::new());
        }
        let mut statement = self.db.prepare_cached(
            "SELECT first_seq, last_seq, first_utc_us, last_utc_us, before, after FROM packs \
             WHERE last_seq >= ?1 ORDER BY first_seq",
        )?;
        let places = statement.query_map([from_seq.cast_signed()], |r| {
            Ok(Place {
                first_seq: chain::bits(r, 0)?,
                last_seq: chain::bits(r, 1)?,
                first_utc_us: r.get(2)?,
                last_utc_us: r.get(3)?,
                before: chain::array(r, 4)?,
                after: chain::array(r, 5)?,
            })
        })?;
        places.collect()
    }

    /// The last sequence in a pack, or 0.
    pub(crate) fn packed_to(&self) -> rusqlite::Result<u64> {
        if self.form < forms::WITH_PACKS {
            return Ok(0);
        }
        let mut statement = self.db.prepare_cached("SELECT max(last_seq) FROM packs")?;
        let last: Option<i64> = statement.query_row([], |r| r.get(0))?;
        Ok(last.map_or(0, i64::cast_unsigned))
    }

    /// The rows of a pack, each verified.
    pub(crate) fn unpack(&self, place: &Place) -> Result<Vec<Row>, JournalError> {
        let mut statement = self
            .db
            .prepare_cached("SELECT body FROM packs WHERE first_seq = ?1")
            .map_err(|e| self.sql("reading a pack", e))?;
        let first_seq = place.first_seq;
        let decoded = statement.query_row([first_seq.cast_signed()], |r| {
            let body = r.get_ref(0)?.as_blob()?;
            Ok(pack::decode(first_seq, &place.before, &place.after, body))
        });
        let first_bad = |seq: u64, why: String| JournalError::FirstBad { seq, why };
        let rows = decoded
            .map_err(|e| first_bad(first_seq, format!("its pack cannot be read: {e}")))?
            .map_err(|bad| first_bad(bad.seq, bad.why))?;
        if rows.last().is_none_or(|r| r.seq != place.last_seq) {
            return Err(first_bad(place.last_seq, "its pack does not hold it".to_owned()));
        }
        Ok(rows)
    }

    /// Packs the oldest rows if there are enough; whether it did.
    pub(crate) fn pack_oldest(&mut self) -> Result<bool, JournalError> {
        let sql = |e| self.sql("packing old rows", e);
        let ends: (Option<i64>, Option<i64>) = self
            .db
            .query_row("SELECT min(seq), max(seq) FROM evidence", [], |r| {
                Ok((r.get(0)?, r.get(1)?))
            })
            .map_err(sql)?;
        let (Some(first), Some(last)) = ends else { return Ok(false) };
        if (last - first + 1).cast_unsigned() < ROWS + LIVE_LEAST {
            return Ok(false);
        }
        let first_seq = first.cast_unsigned();
        let before = match self.packs(first_seq.saturating_sub(1)).map_err(sql)?.last() {
            Some(place) => place.after,
            None => GENESIS,
        };
        let rows = self.live_rows(first_seq, ROWS as usize).map_err(sql)?;
        let (Some(begin), Some(end)) = (rows.first(), rows.last()) else { return Ok(false) };
        let body = pack::encode(&before, &rows);
        // What does not come back as it was, or is not the chain's next part, stays as it is.
        let again = pack::decode(first_seq, &before, &end.hash, &body);
        if again.as_ref() != Ok(&rows) {
            let why = again.map_or_else(|b| b.why, |_| "its pack reads otherwise".to_owned());
            return Err(JournalError::FirstBad { seq: first_seq, why });
        }
        let utc = |order: fn(i64, i64) -> i64| {
            rows.iter().map(|r| r.utc.as_micros()).fold(begin.utc.as_micros(), order)
        };
        let (end_seq, from, to) = (end.seq.cast_signed(), utc(i64::min), utc(i64::max));
        let transaction = self.db.unchecked_transaction().map_err(sql)?;
        let placed = params![first, end_seq, from, to, before, end.hash, body];
        transaction
            .execute("INSERT INTO packs VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7)", placed)
            .map_err(sql)?;
        transaction.execute("DELETE FROM evidence WHERE seq <= ?1", [end_seq]).map_err(sql)?;
        transaction.commit().map_err(sql)?;
        Ok(true)
    }
}
