//! Reading rows by their place, packed or not.

use record::Row;
use rusqlite::params;

use crate::JournalError;
use crate::chain::{self, COLUMNS};
use crate::file::Evidence;
use crate::journal::DAY_US;

impl Evidence {
    /// At most `limit` rows from `from_seq` on that are not packed.
    pub(crate) fn live_rows(&self, from_seq: u64, limit: usize) -> rusqlite::Result<Vec<Row>> {
        let text = format!("SELECT {COLUMNS} FROM evidence WHERE seq >= ?1 ORDER BY seq LIMIT ?2");
        let mut statement = self.db.prepare_cached(&text)?;
        let limit = i64::try_from(limit).unwrap_or(i64::MAX);
        statement.query_map(params![from_seq.cast_signed(), limit], chain::row)?.collect()
    }

    /// One row; that it is not there is an error that names it.
    pub(crate) fn row(&self, seq: u64) -> Result<Row, JournalError> {
        let sql = |e| self.sql("reading a row", e);
        let place = self.packs(seq).map_err(sql)?.first().copied().filter(|p| p.first_seq <= seq);
        let rows = match place {
            Some(place) => self.unpack(&place)?,
            None => self.live_rows(seq, 1).map_err(sql)?,
        };
        let row = rows.into_iter().find(|r| r.seq == seq);
        row.ok_or_else(|| JournalError::FirstBad { seq, why: "it is not there".to_owned() })
    }

    /// The number of the last row of inputs that was ever written, sealed or not.
    pub(crate) fn last_input(&self) -> Result<i64, JournalError> {
        let text = "SELECT coalesce(max(seq), 0) FROM sqlite_sequence WHERE name = 'inputs'";
        let last = self.db.query_row(text, [], |r| r.get(0));
        last.map_err(|e| self.sql("reading the number of the last inputs", e))
    }

    /// Every row of a day, by its UTC, in order of sequence.
    pub(crate) fn each_of_day(
        &self,
        day: i32,
        visit: &mut dyn FnMut(&Row),
    ) -> Result<(), JournalError> {
        let sql = |e| self.sql("reading the rows of a day", e);
        let from = i64::from(day) * DAY_US;
        let within = from..from + DAY_US;
        for place in self.packs(0).map_err(sql)? {
            if place.first_utc_us < within.end && place.last_utc_us >= within.start {
                let rows = self.unpack(&place)?;
                rows.iter().filter(|r| within.contains(&r.utc.as_micros())).for_each(&mut *visit);
            }
        }
        let text = format!(
            "SELECT {COLUMNS} FROM evidence WHERE utc_us >= ?1 AND utc_us < ?2 ORDER BY seq"
        );
        let mut statement = self.db.prepare_cached(&text).map_err(sql)?;
        let rows = statement.query_map([within.start, within.end], chain::row).map_err(sql)?;
        for row in rows {
            visit(&row.map_err(sql)?);
        }
        Ok(())
    }

    /// The last row of a kind; packs are looked through from the newest on.
    pub(crate) fn last_of_kind(&self, kind: u16) -> Result<Option<Row>, JournalError> {
        let sql = |e| self.sql("looking for the last row of a kind", e);
        let text =
            format!("SELECT {COLUMNS} FROM evidence WHERE kind = ?1 ORDER BY seq DESC LIMIT 1");
        let mut statement = self.db.prepare_cached(&text).map_err(sql)?;
        let mut live = statement.query_map([kind], chain::row).map_err(sql)?;
        if let Some(row) = live.next() {
            return row.map(Some).map_err(sql);
        }
        for place in self.packs(0).map_err(sql)?.iter().rev() {
            if let Some(row) = self.unpack(place)?.into_iter().rfind(|r| r.kind == kind) {
                return Ok(Some(row));
            }
        }
        Ok(None)
    }
}
