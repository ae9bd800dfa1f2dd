//! What the rows so far add up to, and when that is written down again, so that the next start need
//! not read them.

use record::{Fold, Note, Row};
use units::Utc;

use super::duties::day;

/// A start that walks so many rows is as quick as one that walks none.
const ROWS_MOST: u64 = 10_000;

pub struct SoFar {
    fold: Fold,
    /// The last row in it.
    seq: u64,
    /// The last row of the last snapshot.
    kept_seq: u64,
    /// The day of the last snapshot of this life.
    kept_day: Option<i32>,
}

impl SoFar {
    /// After a start that walked the rows from `kept_seq` to `seq`.
    pub fn new(fold: Fold, kept_seq: u64, seq: u64) -> Self {
        Self { fold, seq, kept_seq, kept_day: None }
    }

    pub fn push(&mut self, row: &Row) {
        self.fold.push(row);
        self.seq = row.seq;
    }

    /// A snapshot, if it is time for one: once a day, and whenever a start would walk too far.
    pub fn due(&mut self, now: Utc, daily: bool) -> Option<Note> {
        let new_day = daily && self.kept_day != Some(day(now));
        if !new_day && self.seq - self.kept_seq < ROWS_MOST {
            return None;
        }
        (self.kept_seq, self.kept_day) = (self.seq, Some(day(now)));
        Some(Note::Snapshot { of_seq: self.seq, bytes: self.fold.snapshot() })
    }
}
