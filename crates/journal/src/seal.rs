//! Sealing: what a day saw leaves the evidence file for a segment, whose digest enters the chain.
//!
//! ```text
//! read in slices -> segment written beside, synced, renamed, folder synced
//!   -> one transaction: SEALED row, entry in `segments`, inputs deleted
//! ```
//! A crash before the transaction leaves a file that nobody refers to; the next seal writes the same
//! bytes over it. The inputs are deleted only with the row that vouches for their copy.

use std::fs::{self, File};
use std::io::Write;
use std::path::Path;

use record::Note;
use rusqlite::{OptionalExtension, params};

use crate::segment::{Made, Making};
use crate::task::{Desk, Slice};
use crate::{Journal, JournalError, durable};

/// The folder of segments in the state folder.
pub const SEGMENTS: &str = "segments";
/// Rows of inputs that one slice takes.
const SLICE_ROWS: i64 = 256;

pub(crate) struct Sealing {
    before_day: i32,
    run: Option<Run>,
    sealed: u64,
    packed: u64,
}

/// Inputs of one day that follow each other.
struct Run {
    day: i64,
    first_no: i64,
    next_no: i64,
    last_no: i64,
    making: Making,
}

impl Sealing {
    pub(crate) fn new(before_day: i32) -> Self {
        Self { before_day, run: None, sealed: 0, packed: 0 }
    }

    pub(crate) fn slice(&mut self, desk: &mut Desk<'_>) -> Result<Slice, JournalError> {
        match self.run.take() {
            Some(mut run) => {
                if run.read(desk.journal)? {
                    self.run = Some(run);
                } else {
                    run.finish(desk)?;
                    self.sealed += 1;
                }
            }
            None => {
                self.run = oldest(desk.journal, self.before_day)?;
                // Packing is the second half of the same duty: old rows, then nothing is left.
                if self.run.is_none() {
                    if !desk.journal.evidence.pack_oldest()? {
                        let (sealed, packed) = (self.sealed, self.packed);
                        return Ok(Slice::Done(format!(
                            "{sealed} days sealed, {packed} packs made"
                        )));
                    }
                    self.packed += 1;
                }
            }
        }
        Ok(Slice::More)
    }
}

/// The oldest run of inputs of one day, if that day is over.
fn oldest(journal: &Journal, before_day: i32) -> Result<Option<Run>, JournalError> {
    let evidence = &journal.evidence;
    let sql = |e| evidence.sql("looking for inputs to seal", e);
    let first: Option<(i64, i64)> = evidence
        .db
        .query_row("SELECT no, day FROM inputs ORDER BY no LIMIT 1", [], |r| {
            Ok((r.get(0)?, r.get(1)?))
        })
        .optional()
        .map_err(sql)?;
    let Some((first_no, day)) = first.filter(|(_, day)| *day < i64::from(before_day)) else {
        return Ok(None);
    };
    let other = "SELECT min(no) FROM inputs WHERE day <> ?1";
    let other: Option<i64> = evidence.db.query_row(other, [day], |r| r.get(0)).map_err(sql)?;
    let last_no = match other {
        Some(no) => no - 1,
        None => {
            evidence.db.query_row("SELECT max(no) FROM inputs", [], |r| r.get(0)).map_err(sql)?
        }
    };
    let making = Making::new(day).map_err(|e| evidence.io("beginning a segment", e))?;
    Ok(Some(Run { day, first_no, next_no: first_no, last_no, making }))
}

impl Run {
    /// Takes some rows; whether there are more.
    fn read(&mut self, journal: &Journal) -> Result<bool, JournalError> {
        let evidence = &journal.evidence;
        let sql = |e| evidence.sql("reading inputs to seal", e);
        let mut statement = evidence
            .db
            .prepare_cached(
                "SELECT no, events, minutes FROM inputs WHERE no BETWEEN ?1 AND ?2 ORDER BY no \
                 LIMIT ?3",
            )
            .map_err(sql)?;
        let mut rows =
            statement.query(params![self.next_no, self.last_no, SLICE_ROWS]).map_err(sql)?;
        let mut any = false;
        while let Some(row) = rows.next().map_err(sql)? {
            let no: i64 = row.get(0).map_err(sql)?;
            let blob = |c: usize| row.get_ref(c).and_then(|v| Ok(v.as_blob()?)).map_err(sql);
            let (events, minutes) = (blob(1)?, blob(2)?);
            let pushed = self.making.push(events, minutes);
            pushed.map_err(|e| evidence.io("packing a segment", e))?;
            (self.next_no, any) = (no + 1, true);
        }
        Ok(any && self.next_no <= self.last_no)
    }

    fn finish(self, desk: &mut Desk<'_>) -> Result<(), JournalError> {
        let Self { day, first_no, last_no, making, .. } = self;
        let dir = desk.journal.dir().join(SEGMENTS);
        let name = name(day, first_no);
        let made = making.finish().and_then(|made| write(&dir, &name, &made).map(|()| made));
        let made = made.map_err(|source| JournalError::Io {
            path: dir.join(&name),
            doing: "writing a segment",
            source,
        })?;
        let digest = *blake3::hash(&made.bytes).as_bytes();
        let day = i32::try_from(day).unwrap_or(i32::MAX);
        let sealed = Note::Sealed {
            day,
            file: name.clone(),
            digest,
            events: made.events,
            minutes: made.minutes,
            bytes: made.bytes.len() as u64,
        };
        let seq = desk.journal.rows() + 1;
        desk.keep(&[sealed], &mut |db| {
            let entry = params![name, day, digest, seq.cast_signed()];
            db.execute("INSERT INTO segments VALUES (?1, ?2, ?3, ?4, NULL)", entry)?;
            db.execute("DELETE FROM inputs WHERE no BETWEEN ?1 AND ?2", [first_no, last_no])?;
            Ok(())
        })
    }
}

/// `2027-05-01-1234.segment`: the day, and the first row of inputs, which is never used twice.
fn name(day: i64, first_no: i64) -> String {
    let date = units::Utc::from_micros(day * 86_400_000_000).to_string();
    let date = date.get(..10).unwrap_or("unknown-day");
    format!("{date}-{first_no}.segment")
}

/// All of it under its name, or nothing.
fn write(dir: &Path, name: &str, made: &Made) -> std::io::Result<()> {
    durable::folder(dir)?;
    let part = dir.join(format!("{name}.part"));
    let written = File::create(&part).and_then(|mut file| {
        file.write_all(&made.bytes)?;
        file.sync_all()?;
        durable::rename(&part, &dir.join(name))
    });
    written.inspect_err(|_| {
        let _not_there = fs::remove_file(&part);
    })
}
