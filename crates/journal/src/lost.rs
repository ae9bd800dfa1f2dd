//! With the journal lost: what was not acknowledged is kept in order, until the file can be opened,
//! verified and written again.

use std::error::Error;
use std::fmt::Write;
use std::path::PathBuf;
use std::sync::mpsc::{self, RecvTimeoutError, Sender};
use std::time::Duration;

use record::Row;

use crate::chain::Head;
use crate::planned::{Planned, Whose};
use crate::thread::Message;
use crate::{Journal, JournalError, Opening};

/// Time between two attempts. A person who frees a full disk waits no longer than this.
const RETRY_EVERY: Duration = Duration::from_secs(2);
/// Rows kept in memory at most; at a row a second, more than a day.
const KEPT_ROWS_MOST: usize = 100_000;

/// What waits for the journal to come back.
pub(crate) struct Kept {
    dir: PathBuf,
    /// Where the chain ended when the last acknowledgement was given.
    acknowledged: Head,
    acknowledged_input: i64,
    /// The one transaction that failed: on disk as a whole, or not at all.
    attempted: Vec<Planned>,
    /// Found on disk after all, to be acknowledged.
    found: Vec<(Whose, Vec<Row>)>,
    since: Vec<Planned>,
    rows: usize,
    /// Ends with the loss.
    _ticker: Ticker,
}

impl Kept {
    pub(crate) fn after(
        journal: &mut Journal,
        mut attempted: Vec<Planned>,
        ticker: Ticker,
    ) -> Self {
        attempted.extend(journal.attempting());
        Self {
            dir: journal.dir().to_owned(),
            acknowledged: journal.head(),
            acknowledged_input: journal.last_input(),
            rows: attempted.iter().map(Planned::weight).sum(),
            attempted,
            found: Vec::new(),
            since: Vec::new(),
            _ticker: ticker,
        }
    }

    /// Keeps more; their permits are gone already. The error says what found no room.
    pub(crate) fn add(&mut self, planned: Vec<Planned>) -> Result<(), String> {
        let more: usize = planned.iter().map(Planned::weight).sum();
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
        let mut tail = Vec::new();
        let opening = Opening::begin(&self.dir)?;
        let mut journal = opening.walk_after(self.acknowledged, &mut |row| tail.push(row))?;
        let written = !tail.is_empty() || journal.last_input() > self.acknowledged_input;
        self.settle_attempted(tail, written)?;
        self.acknowledged = journal.head();
        self.acknowledged_input = journal.last_input();
        let mut group = std::mem::take(&mut self.since);
        group.iter_mut().for_each(Planned::without_intents);
        match journal.write(&group, &mut |_| Ok(())) {
            Ok((rows, end)) => {
                journal.advance(end);
                let new = group.iter().map(|p| p.whose).zip(rows);
                Ok((journal, merged(self.found.drain(..).chain(new))))
            }
            Err(e) => {
                self.attempted = group;
                Err(e)
            }
        }
    }

    /// `tail` are the rows on disk that nobody was told of; a transaction may also have been written
    /// that had none.
    fn settle_attempted(&mut self, tail: Vec<Row>, written: bool) -> Result<(), JournalError> {
        let wanted: usize = self.attempted.iter().map(|p| p.drafts.len()).sum();
        if !written {
            let again = self.attempted.drain(..).filter(|p| p.whose != Whose::Task);
            self.since.splice(0..0, again);
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
            self.found.push((planned.whose, rows));
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

/// The rows of each batch; what follows a batch goes with it, and for a task nobody waits.
fn merged(parts: impl Iterator<Item = (Whose, Vec<Row>)>) -> Vec<Vec<Row>> {
    let mut all: Vec<Vec<Row>> = Vec::new();
    for (whose, rows) in parts {
        match (whose, all.last_mut()) {
            (Whose::Task, _) => {}
            (Whose::Before, Some(last)) => last.extend(rows),
            _ => all.push(rows),
        }
    }
    all
}

/// An error and what lies under it, in one line.
pub(crate) fn in_words(error: &dyn Error) -> String {
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
