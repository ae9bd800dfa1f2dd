//! The journal's own thread: everything that waits is committed at once, then answered.
//!
//! ```text
//!            any error of the connection                 opened, verified,
//!            (kept: what was not acknowledged)           re-appended: Back, Acked
//!  KEEPING ------------------------------> LOST ------------------------------> KEEPING
//!            Lost                           | ^
//!                                           +-+ every 2 s: not yet
//! ```

use std::sync::mpsc::{self, Receiver, Sender, TryRecvError};
use std::thread::JoinHandle;

use record::Row;

use crate::lost::{self, Kept, Ticker};
use crate::planned::Planned;
use crate::{Acked, Batch, Journal, JournalError, Reply};

/// Rows a slice of reading may take between two looks for batches.
const SLICE_ROWS: usize = 512;

pub(crate) enum Message {
    Submit(Batch),
    Read {
        from_seq: u64,
        left: usize,
        to: Sender<Vec<Row>>,
    },
    /// From the ticker, while the journal is lost.
    Retry,
    Close,
}

/// The other end of the journal's thread. Dropping it closes the journal without waiting.
#[derive(Debug)]
pub struct Handle {
    to: Sender<Message>,
    thread: Option<JoinHandle<Result<(), JournalError>>>,
}

impl Handle {
    /// Hands a batch over and does not wait; the answer comes as a [`Reply`]. The error means that
    /// the thread is gone, and the batch's permits with it.
    pub fn submit(&self, batch: Batch) -> Result<(), JournalError> {
        self.to.send(Message::Submit(batch)).map_err(|_| JournalError::Gone)
    }

    /// Asks for at most `limit` rows from `from_seq` on. They come in slices of at most 512, with
    /// commits going first; the sender is dropped after the last slice, and without any if the
    /// journal is lost.
    pub fn read(
        &self,
        from_seq: u64,
        limit: usize,
        to: Sender<Vec<Row>>,
    ) -> Result<(), JournalError> {
        self.to.send(Message::Read { from_seq, left: limit, to }).map_err(|_| JournalError::Gone)
    }

    /// Commits what was submitted before, copies the WAL into the file, closes it and waits for the
    /// thread to end.
    pub fn close(mut self) -> Result<(), JournalError> {
        let _gone_is_told_below = self.to.send(Message::Close);
        let thread = self.thread.take().ok_or(JournalError::Gone)?;
        thread.join().map_err(|_| JournalError::Gone)?
    }
}

impl Drop for Handle {
    fn drop(&mut self) {
        let _nobody_is_left_to_tell = self.to.send(Message::Close);
    }
}

impl Journal {
    /// Moves the journal into its own thread, which answers to `reply`.
    pub fn start<T>(self, reply: Sender<T>) -> Handle
    where
        T: From<Reply> + Send + 'static,
    {
        let (to, from) = mpsc::channel();
        let ticks = to.clone();
        // Nobody who listens has gone before us but at the very end: then it does not matter.
        let answer = Box::new(move |r: Reply| drop(reply.send(r.into())));
        let run = move || {
            let _guard = AbortOnPanic;
            let keeper =
                Keeper { state: State::Keeping(Box::new(self)), answer, reads: Vec::new(), ticks };
            keeper.run(&from)
        };
        let thread = std::thread::Builder::new()
            .name("journal".to_owned())
            .spawn(run)
            .expect("the system gives one thread at the start");
        Handle { to, thread: Some(thread) }
    }
}

/// A panic here leaves the program without a record: leases and the supervisor take over.
struct AbortOnPanic;

impl Drop for AbortOnPanic {
    fn drop(&mut self) {
        if std::thread::panicking() {
            std::process::abort();
        }
    }
}

enum State {
    Keeping(Box<Journal>),
    Lost(Kept),
}

struct Keeper {
    state: State,
    answer: Box<dyn FnMut(Reply) + Send>,
    reads: Vec<(u64, usize, Sender<Vec<Row>>)>,
    ticks: Sender<Message>,
}

impl Keeper {
    fn run(mut self, from: &Receiver<Message>) -> Result<(), JournalError> {
        loop {
            let (batches, retry, close) = self.gather(from);
            if !batches.is_empty() {
                self.keep(batches);
            }
            if retry || close {
                self.recover();
            }
            if close {
                return match self.state {
                    State::Keeping(journal) => journal.close(),
                    State::Lost(kept) => Err(kept.given_up()),
                };
            }
            self.read_slice();
        }
    }

    /// Waits for a message, unless there is reading to go on with, then takes all that are there.
    fn gather(&mut self, from: &Receiver<Message>) -> (Vec<Batch>, bool, bool) {
        let (mut batches, mut retry) = (Vec::new(), false);
        let mut next = if self.reads.is_empty() {
            from.recv().map_err(|_| TryRecvError::Disconnected)
        } else {
            from.try_recv()
        };
        loop {
            match next {
                Ok(Message::Submit(batch)) => batches.push(batch),
                Ok(Message::Read { from_seq, left, to }) => self.reads.push((from_seq, left, to)),
                Ok(Message::Retry) => retry = true,
                Ok(Message::Close) | Err(TryRecvError::Disconnected) => {
                    return (batches, retry, true);
                }
                Err(TryRecvError::Empty) => return (batches, retry, false),
            }
            next = from.try_recv();
        }
    }

    fn keep(&mut self, batches: Vec<Batch>) {
        let parts = batches.into_iter().map(Planned::of);
        let (planned, intents): (Vec<_>, Vec<_>) = parts.unzip();
        match &mut self.state {
            State::Lost(kept) => {
                if let Err(why) = kept.add(planned) {
                    (self.answer)(Reply::Lost { why });
                }
            }
            State::Keeping(journal) => match journal.commit(&planned, intents) {
                Ok(acked) => {
                    for one in acked {
                        (self.answer)(Reply::Acked(one));
                    }
                    if let Err(e) = journal.keep_short() {
                        self.lose(&e, Vec::new());
                    }
                }
                Err(e) => self.lose(&e, planned),
            },
        }
    }

    /// Drops the connection: after a failed sync a second one may succeed over lost data.
    fn lose(&mut self, why: &JournalError, attempted: Vec<Planned>) {
        let State::Keeping(journal) = &self.state else { return };
        let ticker = Ticker::start(self.ticks.clone());
        self.state = State::Lost(Kept::after(journal, attempted, ticker));
        (self.answer)(Reply::Lost { why: lost::in_words(why) });
    }

    fn recover(&mut self) {
        let State::Lost(kept) = &mut self.state else { return };
        let Ok((journal, rows)) = kept.recover() else { return };
        self.state = State::Keeping(Box::new(journal));
        (self.answer)(Reply::Back);
        for rows in rows {
            (self.answer)(Reply::Acked(Acked { rows, committed: Vec::new() }));
        }
    }

    /// One slice of the oldest read.
    fn read_slice(&mut self) {
        if self.reads.is_empty() {
            return;
        }
        let (from_seq, left, to) = self.reads.remove(0);
        let State::Keeping(journal) = &self.state else { return };
        let rows = match journal.read(from_seq, left.min(SLICE_ROWS)) {
            Ok(rows) => rows,
            Err(e) => return self.lose(&e, Vec::new()),
        };
        let (Some(last), got) = (rows.last().map(|r| r.seq), rows.len()) else { return };
        if to.send(rows).is_ok() && got == SLICE_ROWS && left > got {
            self.reads.insert(0, (last + 1, left - got, to));
        }
    }
}
