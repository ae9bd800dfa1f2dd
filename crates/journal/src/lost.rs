//! With the journal lost: what was not acknowledged is kept in order, until the file can be opened,
//! verified and written again.

use std::error::Error;
use std::fmt::Write;
use std::path::PathBuf;
use std::sync::mpsc::{self, RecvTimeoutError, Sender};
use std::time::Duration;

use record::Row;

use crate::chain::Head;
use crate::planned::Planned;
use crate::thread::Message;
use crate::{Journal, JournalError};

/// Time between two attempts. A person who frees a full disk waits no longer than this.
const RETRY_EVERY: Duration = Duration::from_secs(2);
/// Rows kept in memory at most; at a row a second, more than a day.
const KEPT_ROWS_MOST: usize = 100_000;

/// What waits for the journal to come back.
pub(crate) struct Kept {
    dir: PathBuf,
    /// Where the chain ended when the last acknowledgement was given.
    acknowledged: Head,
    /// The one transaction that failed: on disk as a whole, or not at all.
    attempted: Vec<Planned>,
    /// Found on disk after all, to be acknowledged.
    found: Vec<(bool, Vec<Row>)>,
    since: Vec<Planned>,
    rows: usize,
    /// Ends with the loss.
    _ticker: Ticker,
}

impl Kept {
    pub(crate) fn after(journal: &Journal, attempted: Vec<Planned>, ticker: Ticker) -> Self {
        Self {
            dir: journal.dir().to_owned(),
            acknowledged: journal.head(),
            rows: attempted.iter().map(|p| p.drafts.len()).sum(),
            attempted,
            found: Vec::new(),
            since: Vec::new(),
            _ticker: ticker,
        }
    }

    /// Keeps more; their permits are gone already. The error says what found no room.
    pub(crate) fn add(&mut self, planned: Vec<Planned>) -> Result<(), String> {
        let more: usize = planned.iter().map(|p| p.drafts.len()).sum();
        if self.rows + more > KEPT_ROWS_MOST {
            return Err(format!(
                "the journal is still lost, and {more} rows find no room in memory: they will not \
                 be recorded"
            ));
        }
        self.rows += more;
        self.since.extend(planned);
        Ok(())
    }

    /// Opens and verifies the file anew, finds out what became of the transaction that failed, and
    /// writes the rest. Gives the rows of each batch, in order. On an error everything is kept.
    pub(crate) fn recover(&mut self) -> Result<(Journal, Vec<Vec<Row>>), JournalError> {
        let (from, mut at, mut tail) = (self.acknowledged.seq, None, Vec::new());
        let mut journal = Journal::open(&self.dir, &mut |row| {
            if row.seq == from {
                at = Some(row.hash);
            } else if row.seq > from {
                tail.push(row);
            }
        })?;
        if from > 0 && at != Some(self.acknowledged.hash) {
            let why = "it was acknowledged, and is gone or another".to_owned();
            return Err(JournalError::FirstBad { seq: from, why });
        }
        self.settle_attempted(tail)?;
        self.acknowledged = journal.head();
        let mut group = std::mem::take(&mut self.since);
        group.iter_mut().for_each(Planned::without_intents);
        match journal.write(&group) {
            Ok((rows, head)) => {
                journal.advance(head);
                let new = group.iter().map(|p| p.follows).zip(rows);
                Ok((journal, merged(self.found.drain(..).chain(new))))
            }
            Err(e) => {
                self.attempted = group;
                Err(e)
            }
        }
    }

    /// `tail` are the rows on disk that nobody was told of.
    fn settle_attempted(&mut self, tail: Vec<Row>) -> Result<(), JournalError> {
        let wanted: usize = self.attempted.iter().map(|p| p.drafts.len()).sum();
        if tail.is_empty() {
            self.since.splice(0..0, self.attempted.drain(..));
            return Ok(());
        }
        let planned = self.attempted.iter().flat_map(|p| p.drafts.iter().map(move |d| p.row(d)));
        let same =
            |row: &Row, planned: Row| Row { seq: row.seq, hash: row.hash, ..planned } == *row;
        if tail.len() != wanted || !tail.iter().zip(planned).all(|(row, p)| same(row, p)) {
            let why = "it was written by somebody else while the journal was lost".to_owned();
            return Err(JournalError::FirstBad { seq: self.acknowledged.seq + 1, why });
        }
        let mut tail = tail.into_iter();
        let mut never_left = Vec::new();
        for planned in self.attempted.drain(..) {
            let rows = tail.by_ref().take(planned.drafts.len()).collect();
            self.found.push((planned.follows, rows));
            never_left.extend(planned.never_left());
        }
        self.since.splice(0..0, never_left);
        Ok(())
    }

    /// At the end of the program.
    pub(crate) fn given_up(&self) -> JournalError {
        JournalError::NotKept { rows: self.rows }
    }
}

/// The rows of each batch; what follows a batch goes with it.
fn merged(parts: impl Iterator<Item = (bool, Vec<Row>)>) -> Vec<Vec<Row>> {
    let mut all: Vec<Vec<Row>> = Vec::new();
    for (follows, rows) in parts {
        match all.last_mut() {
            Some(last) if follows => last.extend(rows),
            _ => all.push(rows),
        }
    }
    all
}

/// An error and what lies under it, in one line.
pub(crate) fn in_words(error: &JournalError) -> String {
    let mut words = error.to_string();
    let mut under = error.source();
    while let Some(e) = under {
        write!(words, ": {e}").expect("a String takes all that is written to it");
        under = e.source();
    }
    words
}

/// Sends a `Retry` now and then, for as long as it lives.
#[derive(Debug)]
pub(crate) struct Ticker {
    _alive: Sender<()>,
}

impl Ticker {
    pub(crate) fn start(to: Sender<Message>) -> Self {
        let (alive, ended) = mpsc::channel::<()>();
        let tick = move || {
            while ended.recv_timeout(RETRY_EVERY) == Err(RecvTimeoutError::Timeout) {
                if to.send(Message::Retry).is_err() {
                    return;
                }
            }
        };
        let thread = std::thread::Builder::new().name("journal-retry".to_owned()).spawn(tick);
        drop(thread.expect("the system gives one small thread"));
        Self { _alive: alive }
    }
}
