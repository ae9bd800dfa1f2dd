//! The host: a supervisor for each adapter, and the way to it.

use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::mpsc::{SyncSender, TrySendError, sync_channel};
use std::thread::{self, JoinHandle};
use std::time::Duration;

use interlock::Renewal;
use journal::Committed;
use protocol::{Point, Reading, RestAction, RestCause, Trouble};
use units::Mono;

use crate::supervisor::{Supervisor, Work};

/// What to start.
#[derive(Clone, PartialEq, Debug)]
pub struct AdapterSpec {
    /// Index in the site's list of adapters.
    pub id: u16,
    pub name: String,
    pub program: PathBuf,
    pub args: Vec<String>,
    pub settings: BTreeMap<String, String>,
    pub site: String,
    pub term: u64,
    /// Real time that it has for an answer.
    pub answer_within: Duration,
}

/// A point to bring to rest.
#[derive(Clone, PartialEq, Debug)]
pub struct RestPoint {
    pub point: String,
    pub action: RestAction,
}

/// What became of a command.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Outcome {
    Accepted,
    Refused(String),
    Unknown(String),
}

/// What the host has to tell.
#[derive(Clone, PartialEq, Debug)]
pub enum HostEvent {
    Up { adapter: u16, points: Vec<Point> },
    Down { adapter: u16, why: String, quarantined: bool },
    Readings { adapter: u16, readings: Vec<Reading> },
    Outcome { command: u64, outcome: Outcome },
    Trouble { adapter: u16, trouble: Trouble },
    Log { adapter: u16, text: String },
}

#[derive(Debug, thiserror::Error)]
pub enum HostError {
    #[error("there is no adapter {0}")]
    NoAdapter(u16),
    #[error("the supervisor of adapter {0} has ended")]
    Ended(u16),
    #[error("adapter {0} is not keeping up: its queue is full")]
    Full(u16),
    #[error("a supervisor could not be started")]
    Thread(#[source] std::io::Error),
}

/// All adapters of a site.
pub struct Host {
    adapters: Vec<(u16, SyncSender<Work>, JoinHandle<()>)>,
}

/// The boot clock as the daemon reads it: permits and leases are in it.
pub type Now = Arc<dyn Fn() -> Mono + Send + Sync>;
/// Where events go. It may block: then the adapters are held back, and nothing piles up.
pub type Events = Arc<dyn Fn(HostEvent) + Send + Sync>;

/// Messages that may wait for one supervisor; an adapter that floods is held back at this.
const QUEUE: usize = 1024;

impl Host {
    /// Starts every adapter; what they do is told to `events`.
    pub fn start(specs: Vec<AdapterSpec>, events: &Events, now: &Now) -> Result<Self, HostError> {
        let mut adapters = Vec::new();
        for spec in specs {
            let (work, queue) = sync_channel(QUEUE);
            let id = spec.id;
            let name = format!("{}-supervisor", spec.name);
            let supervisor = Supervisor::new(spec, work.clone(), events.clone(), now.clone());
            let joined = thread::Builder::new()
                .name(name)
                .spawn(move || supervisor.run(&queue))
                .map_err(HostError::Thread)?;
            adapters.push((id, work, joined));
        }
        Ok(Self { adapters })
    }

    fn send(&self, adapter: u16, work: Work) -> Result<(), HostError> {
        let found = self.adapters.iter().find(|(id, ..)| *id == adapter);
        let (_, to, _) = found.ok_or(HostError::NoAdapter(adapter))?;
        // Never wait here: the engine's loop must not hang on an adapter.
        to.try_send(work).map_err(|e| match e {
            TrySendError::Full(_) => HostError::Full(adapter),
            TrySendError::Disconnected(_) => HostError::Ended(adapter),
        })
    }

    /// Sends a command whose intent is durable. It is refused, with an outcome, if its permit has
    /// expired by the time it would leave.
    pub fn drive(&self, adapter: u16, point: &str, committed: Committed) -> Result<(), HostError> {
        self.send(adapter, Work::Drive { point: point.to_owned(), committed: Box::new(committed) })
    }
    pub fn renew(&self, adapter: u16, renewal: Renewal) -> Result<(), HostError> {
        self.send(adapter, Work::Renew(renewal))
    }
    /// Goes out at once.
    pub fn rest(
        &self,
        adapter: u16,
        points: Vec<RestPoint>,
        cause: RestCause,
        words: &str,
    ) -> Result<(), HostError> {
        self.send(adapter, Work::Rest { points, cause, words: words.to_owned() })
    }
    /// Tells every adapter that wants to know where the record's chain ended.
    pub fn anchor(&self, anchor: &str) {
        for (id, ..) in &self.adapters {
            // One that is full or gone does without this one.
            let _ = self.send(*id, Work::Anchor { anchor: anchor.to_owned() });
        }
    }
    /// Ends every adapter: each brings its points to rest, and is killed if it has not ended in
    /// `within` of real time.
    pub fn finish(self, within: Duration) {
        for (_, work, _) in &self.adapters {
            // A supervisor that has ended needs no telling.
            let _ = work.send(Work::Finish { within });
        }
        for (_, _, joined) in self.adapters {
            let _ = joined.join();
        }
    }
}
