//! Events: what can happen to a site.

use interlock::ClockTrust;
use model::{AdapterId, Forecast, JobId, Plan, Reading, Term};
use units::{Mono, Utc};

use crate::{Act, Carried};

/// When, by whom and how sure: on every event.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Stamp {
    /// Gapless within a term.
    pub seq: u64,
    pub term: Term,
    pub utc: Utc,
    pub boot: Mono,
    pub trust: ClockTrust,
}

#[derive(Clone, PartialEq, Debug)]
pub enum Event {
    /// First of a term, with what the journal carries over.
    Started(Box<Carried>),
    /// Changed or repeated readings of one adapter's answer.
    Frame(Vec<Reading>),
    AdapterUp(AdapterId),
    AdapterDown {
        adapter: AdapterId,
        why: String,
    },
    /// What became of a command.
    Outcome {
        command: u64,
        outcome: Outcome,
    },
    Act(Act),
    JobDone {
        job: JobId,
        product: Product,
    },
    JournalLost {
        why: String,
    },
    JournalBack,
    /// The clock's own watch found a step, or trust came back: the stamp says which.
    ClockChanged {
        why: String,
    },
    /// Bring everything to rest: the daemon is about to stop.
    Stopping {
        why: String,
    },
    /// New plans are wanted: a duty that recurs.
    Replan,
    Wake,
}

/// An adapter's answer to a command, or the lack of one.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Outcome {
    Accepted,
    Refused(String),
    /// No answer in time, or the adapter went away: unknown, to be read back, never re-sent.
    Unknown(String),
}

#[derive(Clone, PartialEq, Debug)]
pub enum Product {
    Forecast(Box<Forecast>),
    Plan(Box<Plan>),
    Failed(String),
}
