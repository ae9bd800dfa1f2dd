//! The request for a plan, and the plan: immutable, numbered, with a reason for every slot.

use units::{CubicMetres, CubicMetresPerSecond, Level, Percent, Series, Span, Utc, Window};

use crate::{AssetId, ClauseId, JobId, Lawful, PlanId, TideNumber};

/// Everything a plan depends on besides the site.
#[derive(Clone, PartialEq, Debug)]
pub struct PlanRequest {
    pub job: JobId,
    pub id: PlanId,
    pub parent: Option<PlanId>,
    pub as_of: Utc,
    pub span: Window,
    /// Index into `Site::outlets`.
    pub outlet: usize,
    pub level_now: Level,
    /// Inflow to the storage, m3/s.
    pub inflow: Series,
    /// Level outside, m above the site datum.
    pub outer_level: Series,
    pub lawful: Lawful,
    /// Released so far on tides that are not over: (tide, volume).
    pub used_tides: Vec<(TideNumber, CubicMetres)>,
    pub caps: Vec<LongCap>,
    /// Whether each asset of the site may be planned at all.
    pub available: Vec<bool>,
    /// The gate's flow target at `as_of`, zero when shut: a running release goes on from it.
    pub flow_now: CubicMetresPerSecond,
    /// Longest time from a reversal seen to the gate shut: 1.5 stroke + lease + detection.
    pub closing_lead: Span,
    pub forecast_digest: u64,
}

/// A cap over more than one tide, with what has gone into it already.
#[derive(Clone, PartialEq, Debug)]
pub struct LongCap {
    pub clause: ClauseId,
    pub kind: LongCapKind,
    pub volume_max: CubicMetres,
    /// Released before `as_of`: (start, end, volume), in order.
    pub past: Vec<(Window, CubicMetres)>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub enum LongCapKind {
    /// In (t - span, t] at every t.
    Rolling(Span),
    /// Within this window.
    Fixed(Window),
}

#[derive(Clone, PartialEq, Debug)]
pub struct Plan {
    pub id: PlanId,
    pub parent: Option<PlanId>,
    pub as_of: Utc,
    pub span: Window,
    pub request_digest: u64,
    pub forecast_digest: u64,
    /// One for each asset of the outlet: the gate, then its pumps.
    pub assets: Vec<AssetPlan>,
    pub releases: Vec<PlannedRelease>,
    /// Storage level, m above the site datum, on the 5-minute grid.
    pub level: Series,
    pub volume_released: CubicMetres,
    pub energy_kwh: f64,
    pub cost: f64,
    pub shortfalls: Vec<Shortfall>,
}

impl Plan {
    pub fn slot_at(&self, asset: AssetId, t: Utc) -> Option<&Slot> {
        let plan = self.assets.iter().find(|a| a.asset == asset)?;
        let n = plan.slots.partition_point(|s| s.window.start() <= t);
        plan.slots[..n].last().filter(|s| s.window.contains(t))
    }
}

#[derive(Clone, PartialEq, Debug)]
pub struct AssetPlan {
    pub asset: AssetId,
    /// Gapless, half-open, covering the span.
    pub slots: Vec<Slot>,
}

#[derive(Clone, PartialEq, Debug)]
pub struct Slot {
    pub window: Window,
    pub setpoint: Setpoint,
    pub why: SlotReason,
    /// The release it belongs to, by tide.
    pub tide: Option<TideNumber>,
}

/// What an asset is told.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Setpoint {
    /// Gate shut.
    Shut,
    /// Gate opened so far that this flow leaves. `openings` is the planner's model of how far, at
    /// 1/5, 2/5, 3/5, 4/5 and 5/5 of the target, so that whoever ramps need know no hydraulics.
    Release {
        target: CubicMetresPerSecond,
        openings: [Percent; 5],
    },
    Stopped,
    Running,
}

impl Setpoint {
    /// Whether it passes water or uses power: anything but rest.
    pub const fn is_active(&self) -> bool {
        matches!(self, Self::Release { .. } | Self::Running)
    }
}

#[derive(Clone, PartialEq, Debug)]
pub enum SlotReason {
    /// No lawful window; the clause that shuts it, where one does.
    OutsideWindow { clause: Option<ClauseId> },
    /// Kept for opening, closing and draining inside the window.
    EdgeMargin { clause: Option<ClauseId> },
    /// Releasing; what limits the flow.
    Releasing { limited_by: FlowLimit },
    /// The tide's (or a longer) cap is used up.
    CapReached { clause: ClauseId },
    /// The storage is down to its lowest working level.
    StorageLow,
    /// The water outside is too high for what head there is.
    NoHead,
    /// It pays to wait for more head rather than to pump.
    WaitingForHead,
    /// Gravity does it without this pump.
    GravityEnough,
    /// The pump helps a release that gravity cannot carry.
    Assisting,
    /// Out of service, in hand or local, or its signals are not good.
    Unavailable,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub enum FlowLimit {
    Clause(ClauseId),
    Head,
    Pump,
    Ramp,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct PlannedRelease {
    pub tide: TideNumber,
    pub window: Window,
    pub volume: CubicMetres,
}

/// Water that no lawful plan can keep in: when, and how much.
#[derive(Clone, PartialEq, Debug)]
pub struct Shortfall {
    pub spill: Window,
    pub volume: CubicMetres,
    /// The clauses that bound the releases before it.
    pub clauses: Vec<ClauseId>,
}
