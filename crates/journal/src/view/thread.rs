//! The view's own thread. The loop hands rows over and never waits; whatever was missed is read from
//! the evidence. Nothing that happens here reaches the evidence or the plant.
//!
//! ```text
//!             opened, is of this record             rows, in order
//!   (start) --------------------------> CATCH UP --> KEEP --gap or missed--> CATCH UP
//!      |  missing, older, damaged,         |           |
//!      |  of another record                | damaged   | damaged
//!      +--------> REBUILD <----------------+-----------+      held, no room: wait, then (start)
//! ```

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{
    Receiver, RecvTimeoutError, Sender, SyncSender, TrySendError, channel, sync_channel,
};
use std::sync::{Arc, Mutex, PoisonError};
use std::thread::JoinHandle;
use std::time::Duration;

use record::Row;

use super::rebuild::{PORTION, Rebuild};
use super::{View, ViewError, file, hex};
use crate::lost::in_words;

/// Batches that may wait; those beyond are read from the evidence afterwards.
const BATCHES: usize = 256;
/// How often a wait looks whether it is time to stop.
const LOOK: Duration = Duration::from_millis(50);
/// Batches after which the file is checked even if no quiet time came.
const CHECK_AFTER_BATCHES: u32 = 5_000;

/// What the view's thread says.
#[derive(Debug)]
pub enum ViewSays {
    /// It wants rows, as [`Handle::read`](crate::Handle::read) gives them.
    Read { from_seq: u64, limit: usize, to: Sender<Vec<Row>> },
    /// The view is being made anew: rows done, rows in all.
    Rebuilding { done: u64, of: u64 },
    /// It is as far as the evidence, up to this row.
    Caught { seq: u64 },
    /// Something is wrong with the view, and only with it.
    Alarm(String),
}

/// How the thread spaces its work, in real time.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct ViewPace {
    /// The file is checked from end to end once, in the first quiet time of this length.
    pub check_after: Duration,
    /// Between two attempts at what cannot be done now.
    pub retry_after: Duration,
}

impl ViewPace {
    pub const USUAL: Self =
        Self { check_after: Duration::from_secs(10), retry_after: Duration::from_secs(60) };
}

/// How far the view is, and what is wrong with it, if something is.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ViewState {
    /// The last row that was committed.
    pub evidence_seq: u64,
    /// The last row that is in the view.
    pub view_seq: u64,
    pub trouble: Option<String>,
}

struct Shared {
    evidence_seq: AtomicU64,
    view_seq: AtomicU64,
    stopping: AtomicBool,
    trouble: Mutex<Option<String>>,
}

enum Message {
    Rows(Vec<Row>),
    Stop,
}

/// The loop's end of the view's thread.
pub struct ViewThread {
    to: SyncSender<Message>,
    shared: Arc<Shared>,
    thread: Option<JoinHandle<()>>,
}

impl ViewThread {
    /// Keeps the view in the state folder `dir`, whose record has `evidence_rows` rows now.
    ///
    /// # Errors
    /// That the system gives no thread.
    pub fn start<T: From<ViewSays> + Send + 'static>(
        dir: &Path,
        evidence_rows: u64,
        pace: ViewPace,
        say: Sender<T>,
    ) -> std::io::Result<Self> {
        let (to, from) = sync_channel(BATCHES);
        let shared = Arc::new(Shared {
            evidence_seq: AtomicU64::new(evidence_rows),
            view_seq: AtomicU64::new(0),
            stopping: AtomicBool::new(false),
            trouble: Mutex::new(None),
        });
        // Nobody is left to hear it only at the very end.
        let say = Box::new(move |what: ViewSays| drop(say.send(what.into())));
        let (dir, told) = (dir.to_owned(), shared.clone());
        let mut keeper = Keeper {
            dir,
            from,
            shared: told,
            pace,
            say,
            checked: false,
            batches: 0,
            anew: false,
            failures: 0,
        };
        let thread = std::thread::Builder::new().name("view".to_owned()).spawn(move || {
            if catch_unwind(AssertUnwindSafe(|| keeper.run())).is_err() {
                let why =
                    "a fault of ours ended its thread; it stays as it is until the next start";
                keeper.alarm(why.to_owned());
            }
        })?;
        Ok(Self { to, shared, thread: Some(thread) })
    }

    /// Hands committed rows over. Never waits: where the view is too slow, it reads them later.
    pub fn take(&self, rows: Vec<Row>) {
        let Some(last) = rows.iter().map(|r| r.seq).max() else { return };
        self.shared.evidence_seq.fetch_max(last, Ordering::AcqRel);
        match self.to.try_send(Message::Rows(rows)) {
            Ok(()) | Err(TrySendError::Full(_) | TrySendError::Disconnected(_)) => {}
        }
    }

    pub fn state(&self) -> ViewState {
        let trouble = self.shared.trouble.lock().unwrap_or_else(PoisonError::into_inner).clone();
        ViewState {
            evidence_seq: self.shared.evidence_seq.load(Ordering::Acquire),
            view_seq: self.shared.view_seq.load(Ordering::Acquire),
            trouble,
        }
    }

    /// Takes what was handed over before, closes the file and waits for the thread to end. What it
    /// would have to read from the journal is left to the next start.
    pub fn stop(mut self) {
        self.shared.stopping.store(true, Ordering::Release);
        let _it_has_gone_already = self.to.send(Message::Stop);
        if let Some(thread) = self.thread.take() {
            let _it_has_said_so_itself = thread.join();
        }
    }
}

struct Keeper {
    dir: PathBuf,
    from: Receiver<Message>,
    shared: Arc<Shared>,
    pace: ViewPace,
    say: Box<dyn FnMut(ViewSays) + Send>,
    checked: bool,
    batches: u32,
    /// What lies there is not to be used.
    anew: bool,
    /// Since the view was last as far as the evidence.
    failures: u32,
}

/// Why a stretch of keeping ended.
enum End {
    Stopped,
    Failed(ViewError),
}

impl From<ViewError> for End {
    fn from(e: ViewError) -> Self {
        Self::Failed(e)
    }
}

type Kept<T> = Result<T, End>;

impl Keeper {
    fn run(&mut self) {
        while let Err(End::Failed(e)) = self.stretch() {
            let words = in_words(&e);
            if e.stands() {
                return self.alarm(words);
            }
            if self.trouble().as_ref() != Some(&words) {
                self.alarm(words);
            }
            // What was damaged is made anew at once; what fails again, only after a while.
            self.anew |= !e.passes();
            self.failures = self.failures.saturating_add(1);
            if (e.passes() || self.failures > 1) && self.wait() {
                return;
            }
        }
    }

    /// Opens the view, or makes it anew, and keeps it until something ends that.
    fn stretch(&mut self) -> Kept<()> {
        let opened = if self.anew { None } else { self.opened()? };
        let mut view = match opened {
            Some(view) => view,
            None => self.rebuild()?,
        };
        self.anew = false;
        self.catch_up(&mut view)?;
        let seq = view.head().seq;
        self.whole(seq)?;
        (self.say)(ViewSays::Caught { seq });
        self.failures = 0;
        *self.shared.trouble.lock().unwrap_or_else(PoisonError::into_inner) = None;
        let kept = self.keep(&mut view);
        match kept {
            Err(End::Stopped) => view.close().map_err(End::Failed),
            other => other,
        }
    }

    /// The view as it lies there, if it is whole and of this record.
    fn opened(&mut self) -> Kept<Option<View>> {
        let view = match View::open(&self.dir) {
            Ok(view) => view,
            Err(ViewError::Missing { .. } | ViewError::Older { .. }) => return Ok(None),
            Err(e) => return Err(e.into()),
        };
        let head = view.head().clone();
        let another = || {
            let path = file::path(&self.dir);
            let why = format!("it ends with a row {} that this record does not have", head.seq);
            ViewError::Damaged { path, why }
        };
        if head.seq > self.shared.evidence_seq.load(Ordering::Acquire) {
            return Err(another().into());
        }
        if head.seq > 0 {
            let error = another();
            let rows = self.ask(head.seq, 1)?;
            let row = rows.first().ok_or(ViewError::NoRows)?;
            if row.seq != head.seq || hex(&row.hash) != head.hash {
                return Err(error.into());
            }
        }
        self.at(&view);
        Ok(Some(view))
    }

    fn rebuild(&mut self) -> Kept<View> {
        let mut rebuild = Rebuild::begin(&self.dir)?;
        let mut told = 0;
        loop {
            let rows = self.ask(rebuild.head().seq + 1, PORTION)?;
            if rows.is_empty() {
                break;
            }
            rebuild.take(&rows)?;
            let (done, of) = (rebuild.head().seq, self.shared.evidence_seq.load(Ordering::Acquire));
            if done * 10 / of.max(1) > told {
                told = done * 10 / of.max(1);
                (self.say)(ViewSays::Rebuilding { done, of });
            }
        }
        self.whole(rebuild.head().seq)?;
        rebuild.finish()?;
        let view = View::open(&self.dir)?;
        self.at(&view);
        Ok(view)
    }

    /// What was committed can be read, or else the journal is lost just now.
    fn whole(&self, seq: u64) -> Kept<()> {
        let whole = seq >= self.shared.evidence_seq.load(Ordering::Acquire);
        if whole { Ok(()) } else { Err(ViewError::NoRows.into()) }
    }

    /// Reads on until the evidence gives no more.
    fn catch_up(&mut self, view: &mut View) -> Kept<()> {
        loop {
            let rows = self.ask(view.head().seq + 1, PORTION)?;
            if rows.is_empty() {
                return Ok(());
            }
            view.take(&rows)?;
            self.at(view);
        }
    }

    /// Takes rows as they come.
    fn keep(&mut self, view: &mut View) -> Kept<()> {
        loop {
            let (mut rows, mut stop) = (Vec::new(), false);
            match self.next() {
                Ok(Message::Rows(more)) => rows = more,
                Ok(Message::Stop) | Err(RecvTimeoutError::Disconnected) => stop = true,
                Err(RecvTimeoutError::Timeout) => self.batches = CHECK_AFTER_BATCHES,
            }
            // What else waits goes into the same transaction.
            while !stop && rows.len() < PORTION {
                match self.from.try_recv() {
                    Ok(Message::Rows(more)) => rows.extend(more),
                    Ok(Message::Stop) => stop = true,
                    Err(_) => break,
                }
            }
            self.take(view, rows)?;
            if stop {
                return Err(End::Stopped);
            }
            self.batches = self.batches.saturating_add(1);
            if !self.checked && self.batches >= CHECK_AFTER_BATCHES {
                self.checked = true;
                view.check()?;
            }
        }
    }

    /// Wakes for nothing once the file has been checked.
    fn next(&self) -> Result<Message, RecvTimeoutError> {
        if self.checked {
            return self.from.recv().map_err(|_| RecvTimeoutError::Disconnected);
        }
        self.from.recv_timeout(self.pace.check_after)
    }

    /// Rows of the journal's own tasks may come later than those after them.
    fn take(&mut self, view: &mut View, mut rows: Vec<Row>) -> Kept<()> {
        rows.sort_by_key(|r| r.seq);
        rows.dedup_by_key(|r| r.seq);
        match view.take(&rows) {
            Ok(()) | Err(ViewError::Gap { .. }) => {}
            Err(e) => return Err(e.into()),
        }
        self.at(view);
        let stopping = self.shared.stopping.load(Ordering::Acquire);
        if !stopping && view.head().seq < self.shared.evidence_seq.load(Ordering::Acquire) {
            self.catch_up(view)?;
        }
        Ok(())
    }

    /// At most `limit` rows, by way of the loop. None if the journal has none or is lost.
    fn ask(&mut self, from_seq: u64, limit: usize) -> Kept<Vec<Row>> {
        let (to, slices) = channel();
        (self.say)(ViewSays::Read { from_seq, limit, to });
        let mut rows = Vec::new();
        loop {
            match slices.recv_timeout(LOOK) {
                Ok(slice) => rows.extend(slice),
                Err(RecvTimeoutError::Disconnected) => return Ok(rows),
                Err(RecvTimeoutError::Timeout) => {}
            }
            if self.shared.stopping.load(Ordering::Acquire) {
                return Err(End::Stopped);
            }
        }
    }

    /// Whether it is time to stop. Rows that come meanwhile are in the evidence.
    fn wait(&mut self) -> bool {
        let looks = self.pace.retry_after.as_millis() / LOOK.as_millis();
        for _ in 0..looks.max(1) {
            std::thread::park_timeout(LOOK);
            while let Ok(message) = self.from.try_recv() {
                if matches!(message, Message::Stop) {
                    return true;
                }
            }
        }
        self.shared.stopping.load(Ordering::Acquire)
    }

    fn at(&self, view: &View) {
        self.shared.view_seq.store(view.head().seq, Ordering::Release);
    }

    fn trouble(&self) -> Option<String> {
        self.shared.trouble.lock().unwrap_or_else(PoisonError::into_inner).clone()
    }

    fn alarm(&mut self, words: String) {
        *self.shared.trouble.lock().unwrap_or_else(PoisonError::into_inner) = Some(words.clone());
        (self.say)(ViewSays::Alarm(words));
    }
}
