//! The journal's own thread: everything that waits is committed at once, then answered.
//!
//! ```text
//!            any error of the connection                 opened, verified,
//!            (kept: what was not acknowledged)           re-appended: Acked, Back
//!  KEEPING ------------------------------> LOST ------------------------------> KEEPING
//!      ^     Lost; a full disk costs        | ^ |                                   
//!      |     the reserve                    +-+ | re-appended, but no room for
//!      |                            every 2 s:  | a new reserve: Acked
//!      +--------- SHORT <--------------not yet--+
//!   room again: Back    (rows are kept, permits are not given)
//! ```
//!
//! Tasks and reading go on in slices while nothing waits to be committed.

use std::collections::VecDeque;
use std::sync::mpsc::{self, Receiver, RecvTimeoutError, Sender, TryRecvError};
use std::thread::JoinHandle;
use std::time::Duration;

use record::Row;

use crate::lost::{self, Kept, Ticker};
use crate::planned::Planned;
use crate::task::{Running, Slice};
use crate::{Acked, Batch, Done, Journal, JournalError, Reply, Stamp, Task, reserve};

/// Rows a slice of reading may take between two looks for batches.
const SLICE_ROWS: usize = 512;
/// How long the thread sleeps at most while a task waits for somebody else.
const WAIT: Duration = Duration::from_millis(20);

pub(crate) enum Message {
    Submit(Batch),
    Read {
        from_seq: u64,
        left: usize,
        to: Sender<Vec<Row>>,
    },
    Task(Stamp, Task),
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

    /// Asks for a task; what became of it comes as [`Reply::Done`]. Tasks go one after the other.
    pub fn task(&self, stamp: Stamp, task: Task) -> Result<(), JournalError> {
        self.to.send(Message::Task(stamp, task)).map_err(|_| JournalError::Gone)
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
            let keeper = Keeper::new(self, answer, ticks);
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
    /// KEEPING; or SHORT, while a ticker asks for room for the reserve.
    Open(Box<Journal>, Option<Ticker>),
    Lost(Kept),
}

struct Keeper {
    state: State,
    answer: Box<dyn FnMut(Reply) + Send>,
    reads: VecDeque<(u64, usize, Sender<Vec<Row>>)>,
    tasks: VecDeque<(Stamp, Task)>,
    running: Option<Running>,
    /// The running task waits for somebody else.
    waits: bool,
    ticks: Sender<Message>,
    /// Rows that were kept in memory since the journal was lost.
    kept: usize,
}

impl Keeper {
    fn new(
        journal: Journal,
        mut answer: Box<dyn FnMut(Reply) + Send>,
        ticks: Sender<Message>,
    ) -> Self {
        let short = reserve::fill(journal.dir()).err().map(|e| {
            answer(Reply::Lost { why: format!("there is no room for the reserve: {e}") });
            Ticker::start(ticks.clone())
        });
        let state = State::Open(Box::new(journal), short);
        let (reads, tasks, running) = (VecDeque::new(), VecDeque::new(), None);
        Self { state, answer, reads, tasks, running, waits: false, ticks, kept: 0 }
    }

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
                    State::Open(journal, _) => journal.close(),
                    State::Lost(kept) => Err(kept.given_up()),
                };
            }
            self.read_slice();
            self.task_slice();
        }
    }

    /// Waits for a message, unless there is something to go on with, then takes all that are there.
    fn gather(&mut self, from: &Receiver<Message>) -> (Vec<Batch>, bool, bool) {
        let (mut batches, mut retry) = (Vec::new(), false);
        let mut next = self.next(from);
        loop {
            match next {
                Ok(Message::Submit(batch)) => batches.push(batch),
                Ok(Message::Read { from_seq, left, to }) => {
                    self.reads.push_back((from_seq, left, to));
                }
                Ok(Message::Task(stamp, task)) => self.tasks.push_back((stamp, task)),
                Ok(Message::Retry) => retry = true,
                Ok(Message::Close) | Err(TryRecvError::Disconnected) => {
                    return (batches, retry, true);
                }
                Err(TryRecvError::Empty) => return (batches, retry, false),
            }
            next = from.try_recv();
        }
    }

    fn next(&self, from: &Receiver<Message>) -> Result<Message, TryRecvError> {
        let at_once = !self.reads.is_empty() || (self.running.is_some() && !self.waits);
        if at_once || (self.running.is_none() && !self.tasks.is_empty()) {
            return from.try_recv();
        }
        if self.waits {
            return from.recv_timeout(WAIT).map_err(|e| match e {
                RecvTimeoutError::Timeout => TryRecvError::Empty,
                RecvTimeoutError::Disconnected => TryRecvError::Disconnected,
            });
        }
        from.recv().map_err(|_| TryRecvError::Disconnected)
    }

    fn keep(&mut self, batches: Vec<Batch>) {
        let parts = batches.into_iter().map(Planned::of);
        let (mut planned, mut intents): (Vec<_>, Vec<_>) = parts.unzip();
        let journal = match &mut self.state {
            State::Lost(kept) => {
                self.kept += planned.len();
                if let Err(why) = kept.add(planned) {
                    (self.answer)(Reply::Lost { why });
                }
                return;
            }
            State::Open(journal, short) => {
                if short.is_some() {
                    planned.iter_mut().for_each(Planned::without_intents);
                    intents.iter_mut().for_each(Vec::clear);
                }
                journal
            }
        };
        match journal.commit(&planned, intents) {
            Ok(acked) => {
                let short = journal.keep_short();
                for one in acked {
                    (self.answer)(Reply::Acked(one));
                }
                if let Err(e) = short {
                    self.lose(&e, Vec::new());
                }
            }
            Err(e) => self.lose(&e, planned),
        }
    }

    /// Drops the connection: after a failed sync a second one may succeed over lost data.
    fn lose(&mut self, why: &JournalError, attempted: Vec<Planned>) {
        let State::Open(journal, _) = &mut self.state else { return };
        let dir = journal.dir().to_owned();
        self.kept += attempted.len();
        let ticker = Ticker::start(self.ticks.clone());
        self.state = State::Lost(Kept::after(journal, attempted, ticker));
        (self.answer)(Reply::Lost { why: lost::in_words(why) });
        if let Some(running) = self.running.take() {
            let done = running.done(Err("the journal is lost".to_owned()));
            (self.answer)(Reply::Done(done));
        }
        if why.is_full_disk() {
            reserve::spend(&dir);
            self.recover();
        }
    }

    fn recover(&mut self) {
        if let State::Lost(kept) = &mut self.state {
            let Ok((journal, rows)) = kept.recover() else { return };
            let ticker = Ticker::start(self.ticks.clone());
            self.state = State::Open(Box::new(journal), Some(ticker));
            for rows in rows {
                (self.answer)(Reply::Acked(Acked { rows, committed: Vec::new() }));
            }
        }
        let State::Open(journal, short) = &mut self.state else { return };
        if short.is_some() && reserve::fill(journal.dir()).is_ok() {
            *short = None;
            let rows_kept = std::mem::take(&mut self.kept);
            (self.answer)(Reply::Back { rows_kept });
        }
    }

    fn journal(&mut self) -> Option<&mut Journal> {
        match &mut self.state {
            State::Open(journal, _) => Some(journal),
            State::Lost(_) => None,
        }
    }

    /// One slice of the oldest read.
    fn read_slice(&mut self) {
        let Some((from_seq, left, to)) = self.reads.pop_front() else { return };
        let Some(journal) = self.journal() else { return };
        let rows = match journal.read(from_seq, left.min(SLICE_ROWS)) {
            Ok(rows) => rows,
            Err(e) => return self.lose(&e, Vec::new()),
        };
        let (Some(last), got) = (rows.last().map(|r| r.seq), rows.len()) else { return };
        if to.send(rows).is_ok() && left > got {
            self.reads.push_front((last + 1, left - got, to));
        }
    }

    /// One slice of the oldest task.
    fn task_slice(&mut self) {
        if self.running.is_none() {
            let Some((stamp, task)) = self.tasks.pop_front() else { return };
            self.running = self.journal().map(|j| Running::begin(task.clone(), stamp, j));
            if self.running.is_none() {
                let outcome = Err("the journal is lost".to_owned());
                (self.answer)(Reply::Done(Done { task, rows: Vec::new(), outcome }));
            }
        }
        let State::Open(journal, _) = &mut self.state else { return };
        let Some(running) = &mut self.running else { return };
        let slice = running.slice(journal);
        self.waits = matches!(slice, Ok(Slice::Wait));
        let outcome = match slice {
            Ok(Slice::More | Slice::Wait) => return,
            Ok(Slice::Done(words)) => Ok(words),
            Err(e) if e.is_of_the_connection() => return self.lose(&e, Vec::new()),
            Err(e) => Err(lost::in_words(&e)),
        };
        if let Some(running) = self.running.take() {
            (self.answer)(Reply::Done(running.done(outcome)));
        }
    }
}
