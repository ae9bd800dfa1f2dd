//! The journal on its own thread's side: one connection, commits, checkpoints.

use std::path::{Path, PathBuf};

use record::{Intent, Row};
use rusqlite::{Connection, params};

use crate::chain::{Head, Walk};
use crate::file::Evidence;
use crate::planned::Planned;
use crate::{Acked, Committed, JournalError, Opening, segment};

/// Work between two checkpoints: a row, and a commit, count as one each. About two megabytes of WAL.
const CHECKPOINT_AFTER: u64 = 1000;
pub(crate) const DAY_US: i64 = 86_400_000_000;

/// An open, verified evidence file, ready to take rows.
#[derive(Debug)]
pub struct Journal {
    pub(crate) evidence: Evidence,
    head: Head,
    dir: PathBuf,
    /// The number of the last row of inputs that was ever written.
    last_input: i64,
    since_checkpoint: u64,
    /// The file must stay as it is: it is being copied, and new rows wait in the WAL.
    pub(crate) frozen: bool,
    /// Rows of our own that are being written.
    attempting: Option<Planned>,
}

/// Where a transaction leaves the file.
#[derive(Clone, Copy)]
pub(crate) struct End {
    head: Head,
    last_input: i64,
}

impl Journal {
    /// Opens the evidence file in the state folder `dir` (made if it is not there; the folder must
    /// be), verifies the whole chain and gives each row to `visit` in order. [`Opening`] does the
    /// same from a later row on.
    ///
    /// Refuses a file that another process holds, a newer form, a setting that does not hold, and a
    /// chain with a wrong row, which the error names.
    pub fn open(dir: &Path, visit: &mut dyn FnMut(Row)) -> Result<Self, JournalError> {
        Opening::begin(dir)?.walk(0, visit)
    }

    pub(crate) fn walked(
        evidence: Evidence,
        dir: PathBuf,
        from: Head,
        visit: &mut dyn FnMut(Row),
    ) -> Result<Self, JournalError> {
        let head = Walk::after(from).finish(&evidence, visit)?;
        let (since_checkpoint, frozen, attempting) = (0, false, None);
        let last_input = evidence.last_input()?;
        Ok(Self { evidence, head, dir, last_input, since_checkpoint, frozen, attempting })
    }

    /// The term of the life that now begins: one more than the last row's.
    pub fn next_term(&self) -> u64 {
        self.head.term + 1
    }

    /// How many rows there are, which is the sequence of the last.
    pub fn rows(&self) -> u64 {
        self.head.seq
    }

    /// The hash of the last row, in hex.
    pub fn head_hex(&self) -> String {
        self.head.hex()
    }

    /// The older form from which the file has just been lifted.
    pub fn lifted_from(&self) -> Option<u32> {
        let was = self.evidence.lifted_from;
        (was < self.evidence.form).then(|| u32::try_from(was).expect("forms count from 1"))
    }

    pub(crate) fn dir(&self) -> &Path {
        &self.dir
    }

    pub(crate) fn head(&self) -> Head {
        self.head
    }

    pub(crate) fn last_input(&self) -> i64 {
        self.last_input
    }

    /// Commits all the batches as one transaction, reads each intent's row back and compares it
    /// with its permit. On an error nothing of this connection may be believed any more: drop it,
    /// and find out from the file what became of the rows.
    pub(crate) fn commit(
        &mut self,
        batches: &[Planned],
        intents: Vec<Vec<(usize, Intent)>>,
    ) -> Result<Vec<Acked>, JournalError> {
        let (rows, end) = self.write(batches, &mut |_| Ok(()))?;
        let parts = rows.into_iter().zip(intents);
        let acked: Result<_, _> = parts.map(|(rows, i)| self.acknowledge(rows, i)).collect();
        let acked = acked?;
        self.advance(end);
        Ok(acked)
    }

    /// Rows of our own, and what else belongs into their transaction.
    pub(crate) fn keep(
        &mut self,
        planned: Planned,
        also: &mut dyn FnMut(&Connection) -> rusqlite::Result<()>,
    ) -> Result<Vec<Row>, JournalError> {
        let planned = self.attempting.insert(planned).clone();
        let (rows, end) = self.write(std::slice::from_ref(&planned), also)?;
        self.attempting = None;
        self.advance(end);
        Ok(rows.into_iter().flatten().collect())
    }

    /// What [`Self::keep`] was at when it failed.
    pub(crate) fn attempting(&mut self) -> Option<Planned> {
        self.attempting.take()
    }

    /// One transaction; gives the rows of each batch and where the chain now ends.
    pub(crate) fn write(
        &self,
        batches: &[Planned],
        also: &mut dyn FnMut(&Connection) -> rusqlite::Result<()>,
    ) -> Result<(Vec<Vec<Row>>, End), JournalError> {
        let (mut head, mut last_input) = (self.head, self.last_input);
        let mut all = Vec::with_capacity(batches.len());
        let transaction = self.evidence.db.unchecked_transaction();
        let transaction = transaction.map_err(|e| self.evidence.sql("beginning", e))?;
        for batch in batches {
            let mut rows = Vec::with_capacity(batch.drafts.len());
            for draft in &batch.drafts {
                let mut row = batch.row(draft);
                head.chain(&mut row);
                insert(&self.evidence.db, &row)
                    .map_err(|e| self.evidence.sql("writing a row", e))?;
                rows.push(row);
            }
            let input = insert_seen(&self.evidence.db, batch)
                .map_err(|e| self.evidence.sql("writing what was seen", e))?;
            last_input = input.unwrap_or(last_input);
            all.push(rows);
        }
        also(&self.evidence.db).map_err(|e| self.evidence.sql("writing its own tables", e))?;
        transaction.commit().map_err(|e| self.evidence.sql("committing", e))?;
        Ok((all, End { head, last_input }))
    }

    pub(crate) fn advance(&mut self, end: End) {
        self.since_checkpoint += 1 + end.head.seq - self.head.seq;
        (self.head, self.last_input) = (end.head, end.last_input);
    }

    /// After a commit and its answers: a checkpoint if it is time for one.
    pub(crate) fn keep_short(&mut self) -> Result<(), JournalError> {
        if self.since_checkpoint >= CHECKPOINT_AFTER && !self.frozen {
            self.checkpoint()?;
        }
        Ok(())
    }

    pub(crate) fn checkpoint(&mut self) -> Result<(), JournalError> {
        self.evidence.checkpoint()?;
        self.since_checkpoint = 0;
        Ok(())
    }

    /// At most `limit` rows from `from_seq` on; fewer where a pack ends.
    pub(crate) fn read(&self, from_seq: u64, limit: usize) -> Result<Vec<Row>, JournalError> {
        let sql = |e| self.evidence.sql("reading rows", e);
        match self.evidence.packs(from_seq).map_err(sql)?.first() {
            Some(place) => {
                let rows = self.evidence.unpack(place)?.into_iter();
                Ok(rows.skip_while(|r| r.seq < from_seq).take(limit).collect())
            }
            None => self.evidence.live_rows(from_seq, limit).map_err(sql),
        }
    }

    /// Copies the WAL into the file and lets go of it.
    pub fn close(mut self) -> Result<(), JournalError> {
        self.evidence.checkpoint()?;
        self.evidence.close()
    }

    /// Reads each intent's row back and compares it with its permit.
    fn acknowledge(
        &self,
        rows: Vec<Row>,
        intents: Vec<(usize, Intent)>,
    ) -> Result<Acked, JournalError> {
        let mut committed = Vec::with_capacity(intents.len());
        for (place, intent) in intents {
            let seq = rows[place].seq;
            let kept = self.evidence.live_rows(seq, 1);
            let kept = kept.map_err(|e| self.evidence.sql("reading an intent back", e))?;
            let gone = || JournalError::FirstBad {
                seq,
                why: "it is not there right after its commit".to_owned(),
            };
            let row = kept.first().filter(|r| **r == rows[place]).ok_or_else(gone)?;
            committed.push(Committed::new(intent, row)?);
        }
        Ok(Acked { rows, committed })
    }
}

pub(crate) fn insert(db: &Connection, row: &Row) -> rusqlite::Result<()> {
    let mut statement = db.prepare_cached(
        "INSERT INTO evidence (seq, term, utc_us, boot_ns, kind, version, subject, cause, body, \
         hash) VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10)",
    )?;
    statement.execute(params![
        row.seq.cast_signed(),
        row.term.cast_signed(),
        row.utc.as_micros(),
        row.boot.as_nanos().cast_signed(),
        row.kind,
        row.version,
        row.subject,
        row.cause,
        row.body,
        row.hash,
    ])?;
    Ok(())
}

/// The number of the row, if there was something to write.
fn insert_seen(db: &Connection, batch: &Planned) -> rusqlite::Result<Option<i64>> {
    if batch.seen.is_empty() {
        return Ok(None);
    }
    let day = batch.utc().as_micros().div_euclid(DAY_US);
    let events = segment::put_events(&batch.seen.events);
    let minutes = segment::put_minutes(&batch.seen.minutes);
    let mut statement =
        db.prepare_cached("INSERT INTO inputs (day, events, minutes) VALUES (?1, ?2, ?3)")?;
    statement.insert(params![day, events, minutes]).map(Some)
}
