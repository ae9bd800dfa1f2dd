//! Effects: what a step asks the outside to do. The caller owns the buffer and reuses it.

use interlock::{Permit, Renewal};
use model::{AssetId, JobId, PlanRequest, RestAction};
use units::{Mono, Utc, Window};

use crate::Entry;

#[derive(Default, Debug)]
pub struct Effects {
    /// To be committed in this order, before any order goes out.
    pub records: Vec<Entry>,
    /// Each needs its intent (an [`Entry::Intent`] of the same command) committed first.
    pub orders: Vec<Order>,
    pub renewals: Vec<Renewal>,
    /// Go out at once; they wait for nobody.
    pub rests: Vec<RestOrder>,
    pub jobs: Vec<Job>,
    pub notices: Vec<Notice>,
    /// When to wake the engine if nothing else happens first.
    pub wake_at: Option<Mono>,
    /// Answer to an act: accepted, or why not. Set by [`crate::Event::Act`] only.
    pub answer: Option<Result<String, String>>,
}

impl Effects {
    pub fn clear(&mut self) {
        let Self { records, orders, renewals, rests, jobs, notices, wake_at, answer } = self;
        records.clear();
        orders.clear();
        renewals.clear();
        rests.clear();
        jobs.clear();
        notices.clear();
        *wake_at = None;
        *answer = None;
    }
}

/// A command that may leave once its intent is committed.
#[derive(PartialEq, Debug)]
pub struct Order {
    pub asset: AssetId,
    pub permit: Permit,
}

#[derive(Clone, PartialEq, Debug)]
pub struct RestOrder {
    pub asset: AssetId,
    pub action: RestAction,
    pub cause: String,
}

/// Work for a worker: self-contained.
#[derive(Clone, PartialEq, Debug)]
pub struct Job {
    pub id: JobId,
    pub kind: JobKind,
}

#[derive(Clone, PartialEq, Debug)]
pub enum JobKind {
    Forecast(ForecastRequest),
    Plan(Box<PlanRequest>),
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct ForecastRequest {
    /// On the 5-minute grid.
    pub as_of: Utc,
    pub span: Window,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Severity {
    Info,
    Warning,
    Alarm,
}

/// For people, now; the record has its own entry where it matters.
#[derive(Clone, PartialEq, Debug)]
pub struct Notice {
    pub severity: Severity,
    pub text: String,
}
