//! The journal on its own thread's side: one connection, commits, checkpoints.

use std::path::{Path, PathBuf};

use record::{Intent, Row};
use rusqlite::{Connection, params};

use crate::chain::{self, Head};
use crate::file::Evidence;
use crate::planned::Planned;
use crate::{Acked, Committed, JournalError};

/// Rows between two checkpoints: about a megabyte of WAL.
const CHECKPOINT_ROWS: u64 = 1000;

/// An open, verified evidence file, ready to take rows.
#[derive(Debug)]
pub struct Journal {
    evidence: Evidence,
    head: Head,
    dir: PathBuf,
    since_checkpoint: u64,
}

impl Journal {
    /// Opens the evidence file in the state folder `dir` (made if it is not there; the folder must
    /// be), verifies the whole chain and gives each row to `visit` in order.
    ///
    /// Refuses a file that another process holds, a newer form, a setting that does not hold, and a
    /// chain with a wrong row, which the error names.
    pub fn open(dir: &Path, visit: &mut dyn FnMut(Row)) -> Result<Self, JournalError> {
        let evidence = Evidence::open(dir)?;
        let head = chain::walk(&evidence, visit)?;
        Ok(Self { evidence, head, dir: dir.to_owned(), since_checkpoint: 0 })
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
        blake3::Hash::from_bytes(self.head.hash).to_hex().to_string()
    }

    pub(crate) fn dir(&self) -> &Path {
        &self.dir
    }

    pub(crate) fn head(&self) -> Head {
        self.head
    }

    /// Commits all the batches as one transaction, reads each intent's row back and compares it
    /// with its permit. On an error nothing of this connection may be believed any more: drop it,
    /// and find out from the file what became of the rows.
    pub(crate) fn commit(
        &mut self,
        batches: &[Planned],
        intents: Vec<Vec<(usize, Intent)>>,
    ) -> Result<Vec<Acked>, JournalError> {
        let (rows, head) = self.write(batches)?;
        let parts = rows.into_iter().zip(intents);
        let acked: Result<_, _> = parts.map(|(rows, i)| self.acknowledge(rows, i)).collect();
        let acked = acked?;
        self.advance(head);
        Ok(acked)
    }

    /// One transaction; gives the rows of each batch and where the chain now ends.
    pub(crate) fn write(&self, batches: &[Planned]) -> Result<(Vec<Vec<Row>>, Head), JournalError> {
        let mut head = self.head;
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
            all.push(rows);
        }
        transaction.commit().map_err(|e| self.evidence.sql("committing", e))?;
        Ok((all, head))
    }

    pub(crate) fn advance(&mut self, head: Head) {
        self.since_checkpoint += head.seq - self.head.seq;
        self.head = head;
    }

    /// After a commit and its answers: a checkpoint if it is time for one.
    pub(crate) fn keep_short(&mut self) -> Result<(), JournalError> {
        if self.since_checkpoint >= CHECKPOINT_ROWS {
            self.evidence.checkpoint()?;
            self.since_checkpoint = 0;
        }
        Ok(())
    }

    /// At most `limit` rows from `from_seq` on.
    pub(crate) fn read(&self, from_seq: u64, limit: usize) -> Result<Vec<Row>, JournalError> {
        let text = format!(
            "SELECT {} FROM evidence WHERE seq >= ?1 ORDER BY seq LIMIT ?2",
            chain::COLUMNS
        );
        let sql = |e| self.evidence.sql("reading rows", e);
        let mut statement = self.evidence.db.prepare_cached(&text).map_err(sql)?;
        let limit = i64::try_from(limit).unwrap_or(i64::MAX);
        let rows = statement.query_map(params![from_seq.cast_signed(), limit], chain::row);
        rows.and_then(Iterator::collect).map_err(sql)
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
            let kept = self.read(seq, 1)?;
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

fn insert(db: &Connection, row: &Row) -> rusqlite::Result<()> {
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
