//! Entries: what a step wants kept for ever. `record` gives them bytes.

use interlock::Action;
use model::{AssetId, Cause, ClauseId, PlanId, RestAction, Term, TideNumber};
use units::{CubicMetres, Mono, Utc, Window};

use crate::{Act, ClockTrust, Mode, Outcome};

#[derive(Clone, PartialEq, Debug)]
pub enum Entry {
    /// First row of each run: which build, site and licence spoke.
    Started {
        build: String,
        site_digest: String,
        licence_digest: String,
        mode: Mode,
    },
    Act {
        act: Act,
        refused: Option<String>,
    },
    ModeChanged {
        mode: Mode,
        why: String,
    },
    Armed {
        armed: bool,
        reasons: Vec<String>,
    },
    Clock {
        trust: ClockTrust,
        why: String,
    },
    /// A plan came into force.
    PlanAdopted {
        plan: PlanId,
        parent: Option<PlanId>,
        request_digest: u64,
        forecast_digest: u64,
        released: CubicMetres,
        spill: CubicMetres,
    },
    /// What an asset is to do changed, and why: the causes that stand against it, or none.
    Decision {
        asset: AssetId,
        action: Action,
        plan: Option<PlanId>,
        causes: Vec<Cause>,
    },
    /// Written before the command leaves.
    Intent {
        asset: AssetId,
        action: Action,
        command: u64,
        lease_end: Mono,
        state_seq: u64,
        readings: u64,
    },
    Outcome {
        asset: AssetId,
        command: u64,
        outcome: Outcome,
    },
    /// The plant's own feedback shows the command done.
    Confirmed {
        asset: AssetId,
        command: u64,
        position: f64,
    },
    Rest {
        asset: AssetId,
        action: RestAction,
        cause: String,
    },
    /// Feedback does not fit the command; the asset is tripped.
    Discrepancy {
        asset: AssetId,
        command: u64,
        wanted: f64,
        found: Option<f64>,
    },
    Latched {
        asset: Option<AssetId>,
        cause: String,
    },
    Reset {
        asset: Option<AssetId>,
    },
    /// Released in one 5-minute bucket of UTC; `estimated` when no good meter said so.
    Released {
        tide: TideNumber,
        bucket: Window,
        volume: CubicMetres,
        estimated: bool,
    },
    /// Minutes of lawful window that passed unused, and the first cause.
    WindowMissed {
        tide: TideNumber,
        window: Window,
        cause: String,
    },
    SpillForecast {
        window: Window,
        volume: CubicMetres,
        clauses: Vec<ClauseId>,
    },
    AdapterUp {
        adapter: String,
    },
    AdapterDown {
        adapter: String,
        why: String,
    },
    Stopping {
        why: String,
    },
}

/// What the journal carries from one term to the next. `Default` is a site never run.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Carried {
    pub term: Option<Term>,
    pub build: String,
    pub site_digest: String,
    pub licence_digest: String,
    /// The mode when the last term ended.
    pub mode: Option<Mode>,
    pub authorisation: Option<StandingAuthorisation>,
    /// Last row's instant: the outage is counted from here.
    pub last_seen: Option<Utc>,
    /// (asset or the whole site, cause)
    pub latches: Vec<(Option<AssetId>, String)>,
    /// (asset, who holds the lock)
    pub locks: Vec<(AssetId, String)>,
    pub holds: Vec<(AssetId, Utc)>,
    /// (bucket, volume, tide) of the last 62 days.
    pub released: Vec<(Window, CubicMetres, TideNumber)>,
    /// Commands that went out, or may have, and had no rest or successor.
    pub open_intents: Vec<OpenIntent>,
    /// Instants of the last 24 h at which a pump was told to run.
    pub starts: Vec<(AssetId, Utc)>,
    pub last_plan: Option<PlanId>,
}

#[derive(Clone, PartialEq, Debug)]
pub struct StandingAuthorisation {
    pub by: String,
    pub reason: String,
    pub until: Utc,
    /// The digests it was given under; it dies with any of them.
    pub build: String,
    pub site_digest: String,
    pub licence_digest: String,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct OpenIntent {
    pub asset: AssetId,
    pub command: u64,
    pub action: Action,
    pub at: Utc,
}
