//! Retention: segments that nobody needs any more are deleted, and the record says so. The chain
//! still verifies without them. A legal hold keeps what it names (common practice; the site's
//! regulator says for how long).

use std::fs::{self, File};

use record::Note;
use rusqlite::{OptionalExtension, params};

use crate::seal::SEGMENTS;
use crate::task::Desk;
use crate::{Journal, JournalError};

/// Both ends belong to it.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) struct Days {
    pub(crate) from: i32,
    pub(crate) to: i32,
}

/// Deletes what is due: first the rows that say so, then the files. A crash between leaves files
/// that the next run deletes; never a file that is gone without a row.
pub(crate) fn delete_before(desk: &mut Desk<'_>, day: i32) -> Result<String, JournalError> {
    let due = due(desk.journal, day)?;
    if !due.is_empty() {
        let notes: Vec<Note> = due.iter().map(|s| s.deleted(day)).collect();
        let first = desk.journal.rows() + 1;
        desk.keep(&notes, &mut |db| {
            for (segment, seq) in due.iter().zip(first..) {
                let marked = "UPDATE segments SET deleted_seq = ?2 WHERE file = ?1";
                db.execute(marked, params![segment.file, seq.cast_signed()])?;
            }
            Ok(())
        })?;
    }
    let gone = remove_deleted(desk.journal)?;
    Ok(format!("{} segments recorded as deleted, {gone} files removed", due.len()))
}

struct Segment {
    day: i32,
    file: String,
    digest: [u8; 32],
}

impl Segment {
    fn deleted(&self, before: i32) -> Note {
        let Self { day, file, digest } = self;
        let why = format!("kept for as long as the site file says: {} days ago", before - day);
        Note::SegmentDeleted { day: *day, file: file.clone(), digest: *digest, why }
    }
}

fn due(journal: &Journal, day: i32) -> Result<Vec<Segment>, JournalError> {
    let sql = |e| journal.evidence.sql("looking for segments to delete", e);
    let mut statement = journal
        .evidence
        .db
        .prepare_cached(
            "SELECT day, file, digest FROM segments WHERE deleted_seq IS NULL AND day < ?1 AND NOT \
             EXISTS (SELECT 1 FROM holds WHERE lifted_seq IS NULL AND segments.day BETWEEN \
             from_day AND to_day) ORDER BY sealed_seq",
        )
        .map_err(sql)?;
    let rows = statement.query_map([day], |r| {
        Ok(Segment { day: r.get(0)?, file: r.get(1)?, digest: crate::chain::array(r, 2)? })
    });
    rows.and_then(Iterator::collect).map_err(sql)
}

fn remove_deleted(journal: &Journal) -> Result<usize, JournalError> {
    let sql = |e| journal.evidence.sql("looking for deleted segments", e);
    let text = "SELECT file FROM segments WHERE deleted_seq IS NOT NULL";
    let mut statement = journal.evidence.db.prepare_cached(text).map_err(sql)?;
    let files: Vec<String> =
        statement.query_map([], |r| r.get(0)).and_then(Iterator::collect).map_err(sql)?;
    let dir = journal.dir().join(SEGMENTS);
    let mut gone = 0;
    for file in files {
        match fs::remove_file(dir.join(&file)) {
            Ok(()) => gone += 1,
            Err(e) if e.kind() == std::io::ErrorKind::NotFound => {}
            Err(source) => {
                let path = dir.join(file);
                return Err(JournalError::Io { path, doing: "removing a segment", source });
            }
        }
    }
    if gone > 0 {
        let synced = File::open(&dir).and_then(|d| d.sync_all());
        synced.map_err(|source| JournalError::Io { path: dir, doing: "syncing it", source })?;
    }
    Ok(gone)
}

pub(crate) fn hold(
    desk: &mut Desk<'_>,
    days: Days,
    by: &str,
    reason: &str,
) -> Result<String, JournalError> {
    let Days { from: from_day, to: to_day } = days;
    let (by, reason) = (by.to_owned(), reason.to_owned());
    let seq = (desk.journal.rows() + 1).cast_signed();
    desk.keep(&[Note::LegalHold { from_day, to_day, by, reason }], &mut |db| {
        let entry = params![seq, from_day, to_day];
        db.execute("INSERT INTO holds VALUES (?1, ?2, ?3, NULL)", entry).map(drop)
    })?;
    Ok(format!("the segments of {} days are kept", to_day - from_day + 1))
}

pub(crate) fn lift(
    desk: &mut Desk<'_>,
    days: Days,
    by: &str,
    reason: &str,
) -> Result<String, JournalError> {
    let Days { from: from_day, to: to_day } = days;
    let standing =
        "SELECT seq FROM holds WHERE lifted_seq IS NULL AND from_day = ?1 AND to_day = ?2";
    let db = &desk.journal.evidence.db;
    let held: Option<i64> = db
        .query_row(standing, [from_day, to_day], |r| r.get(0))
        .optional()
        .map_err(|e| desk.journal.evidence.sql("looking for the hold", e))?;
    let Some(held) = held else {
        return Ok("no hold on exactly these days stands; nothing was changed".to_owned());
    };
    let (by, reason) = (by.to_owned(), reason.to_owned());
    let seq = (desk.journal.rows() + 1).cast_signed();
    desk.keep(&[Note::HoldLifted { from_day, to_day, by, reason }], &mut |db| {
        db.execute("UPDATE holds SET lifted_seq = ?2 WHERE seq = ?1", [held, seq]).map(drop)
    })?;
    Ok("the hold is lifted".to_owned())
}
