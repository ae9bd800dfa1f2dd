//! What the journal does for itself, when it is told to: in slices, between which commits go first.

use std::path::PathBuf;

use record::{Draft, Note, Row, Summary};
use units::{Mono, Utc};

use crate::anchor;
use crate::backup::Backing;
use crate::chain::{Head, Walk};
use crate::planned::Planned;
use crate::retain::{self, Days};
use crate::seal::Sealing;
use crate::{Journal, JournalError};

/// When, and in which life of the daemon, a task's rows are written.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Stamp {
    pub term: u64,
    pub utc: Utc,
    pub boot: Mono,
}

/// Days count from 1970-01-01, UTC.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Task {
    /// Copies the WAL into the file.
    Checkpoint,
    /// Seals what each day before this one saw, and packs rows that are old enough.
    Seal { before_day: i32 },
    /// Writes down where the chain ends; signed, if there is a secret key (Ed25519, RFC 8032).
    Anchor { key: Option<[u8; 32]> },
    /// Copies the file and the segments into a folder, and verifies the copy; then older copies go,
    /// but for so many.
    Backup { to: PathBuf, keep: u32 },
    /// Deletes sealed segments of days before this one that no legal hold keeps.
    Retain { before_day: i32 },
    /// Keeps the segments of these days (the last one too) until the hold is lifted.
    Hold { from_day: i32, to_day: i32, by: String, reason: String },
    /// Lifts the hold on exactly these days.
    Lift { from_day: i32, to_day: i32, by: String, reason: String },
    /// Verifies every row that there is when it begins, and so what the opening believed.
    Verify,
    /// Counts what a day came to, and writes it down.
    Summary { day: i32 },
}

/// What became of a task.
#[derive(Clone, PartialEq, Debug)]
pub struct Done {
    pub task: Task,
    /// The rows that it wrote, committed.
    pub rows: Vec<Row>,
    /// In plain words: what was done, or why not. A task that failed has changed nothing that the
    /// next one would not put right.
    pub outcome: Result<String, String>,
}

impl Task {
    /// What it is called where people read.
    pub fn name(&self) -> &'static str {
        match self {
            Self::Checkpoint => "checkpoint",
            Self::Seal { .. } => "seal",
            Self::Anchor { .. } => "anchor",
            Self::Backup { .. } => "backup",
            Self::Retain { .. } => "retention",
            Self::Hold { .. } => "legal hold",
            Self::Lift { .. } => "lifting a legal hold",
            Self::Verify => "verification",
            Self::Summary { .. } => "summary of a day",
        }
    }
}

/// A task under way.
pub(crate) struct Running {
    pub(crate) task: Task,
    stamp: Stamp,
    work: Work,
    rows: Vec<Row>,
}

enum Work {
    Once,
    Seal(Sealing),
    Backup(Backing),
    Verify { walk: Walk, until: Head },
}

/// After a slice.
pub(crate) enum Slice {
    More,
    /// Somebody else is at it: no hurry.
    Wait,
    Done(String),
}

impl Running {
    pub(crate) fn begin(task: Task, stamp: Stamp, journal: &Journal) -> Self {
        let work = match &task {
            Task::Seal { before_day } => Work::Seal(Sealing::new(*before_day)),
            Task::Backup { to, keep } => Work::Backup(Backing::new(to.clone(), *keep)),
            Task::Verify => {
                let until = journal.head();
                Work::Verify { walk: Walk::up_to(until.seq + 1), until }
            }
            _ => Work::Once,
        };
        Self { task, stamp, work, rows: Vec::new() }
    }

    /// One slice: as long as a commit, more or less.
    pub(crate) fn slice(&mut self, journal: &mut Journal) -> Result<Slice, JournalError> {
        let mut desk = Desk { journal, stamp: &self.stamp, rows: &mut self.rows };
        match &mut self.work {
            Work::Once => once(&self.task, &mut desk).map(Slice::Done),
            Work::Seal(sealing) => sealing.slice(&mut desk),
            Work::Backup(backing) => backing.slice(&mut desk),
            Work::Verify { walk, until } => verify(walk, *until, desk.journal),
        }
    }

    pub(crate) fn done(self, outcome: Result<String, String>) -> Done {
        Done { task: self.task, rows: self.rows, outcome }
    }
}

/// Where a task does its work.
pub(crate) struct Desk<'a> {
    pub(crate) journal: &'a mut Journal,
    stamp: &'a Stamp,
    rows: &'a mut Vec<Row>,
}

impl Desk<'_> {
    /// Commits these notes, and what else must be true with them.
    pub(crate) fn keep(
        &mut self,
        notes: &[Note],
        also: &mut dyn FnMut(&rusqlite::Connection) -> rusqlite::Result<()>,
    ) -> Result<(), JournalError> {
        let drafts: Vec<Draft> = notes.iter().map(record::encode_note).collect();
        let rows = self.journal.keep(Planned::task(self.stamp, drafts), also)?;
        self.rows.extend(rows);
        Ok(())
    }
}

fn once(task: &Task, desk: &mut Desk<'_>) -> Result<String, JournalError> {
    match task {
        Task::Checkpoint if desk.journal.frozen => Ok("waits for the backup".to_owned()),
        Task::Checkpoint => {
            desk.journal.checkpoint()?;
            Ok("the WAL is copied into the file".to_owned())
        }
        Task::Anchor { key } => anchor::write(desk, key.as_ref()),
        Task::Retain { before_day } => retain::delete_before(desk, *before_day),
        Task::Hold { from_day, to_day, by, reason } => {
            retain::hold(desk, Days { from: *from_day, to: *to_day }, by, reason)
        }
        Task::Lift { from_day, to_day, by, reason } => {
            retain::lift(desk, Days { from: *from_day, to: *to_day }, by, reason)
        }
        Task::Summary { day } => summary(desk, *day),
        Task::Seal { .. } | Task::Backup { .. } | Task::Verify => {
            unreachable!("these have work of their own")
        }
    }
}

fn summary(desk: &mut Desk<'_>, day: i32) -> Result<String, JournalError> {
    let mut summary = Summary::of(day);
    desk.journal.evidence.each_of_day(day, &mut |row| summary.push(row))?;
    let words = format!("{:.0} m3 released, {} rows", summary.released_m3, summary.rows);
    desk.keep(&[Note::Summary(summary)], &mut |_| Ok(()))?;
    Ok(words)
}

/// Rows that a slice of the background verification takes.
const VERIFY_ROWS: usize = 512;

fn verify(walk: &mut Walk, until: Head, journal: &Journal) -> Result<Slice, JournalError> {
    if until.seq > walk.head().seq && walk.portion(&journal.evidence, VERIFY_ROWS, &mut |_| {})? {
        return Ok(Slice::More);
    }
    if walk.head() != until {
        let why = "the chain does not come to what the start believed".to_owned();
        return Err(JournalError::FirstBad { seq: until.seq, why });
    }
    Ok(Slice::Done(format!("rows 1 to {} verified", until.seq)))
}
