//! What the judge reads, and what it says.

use units::{Mono, Span, Utc, Window};

/// How the plant stood; flows hold from then on.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Sample {
    pub utc: Utc,
    pub level_m: f64,
    pub volume_m3: f64,
    pub outer_m: f64,
    pub gate_percent: f64,
    pub pump_runs: bool,
    pub ports_m3_s: f64,
    pub spill_m3_s: f64,
    pub inflow_m3_s: f64,
    /// True current at the ports, positive seaward.
    pub current_m_s: f64,
    /// Since the beginning.
    pub released_m3: f64,
    pub spilled_m3: f64,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Event {
    pub utc: Utc,
    pub boot: Mono,
    /// 0 the gate, 1 and up the pumps.
    pub asset: usize,
    pub kind: Kind,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Kind {
    Driven { setting_percent: f64, lease_end: Mono },
    Renewed { lease_end: Mono },
    LeaseOut { lease_end: Mono },
    RestTold,
    RestBegun,
    RestDone,
    JamBegun,
    JamEnded,
}

/// A stretch in which the licence lets water out, with the caps of its tide.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Allowed {
    pub window: Window,
    pub flow_max_m3_s: f64,
    pub volume_max_m3: f64,
}

/// What must hold.
#[derive(Clone, PartialEq, Debug)]
pub struct Rules {
    pub allowed: Vec<Allowed>,
    /// Seaward current at the least, m/s.
    pub current_min_m_s: f64,
    pub averaging: Span,
    pub rolling: Span,
    pub rolling_max_m3: f64,
    /// Calendar months with their cap.
    pub months: Vec<(Window, f64)>,
    pub level_low_m: f64,
    pub stroke: Span,
    pub port_centre_m: f64,
    pub density_excess: f64,
}

impl Rules {
    pub(crate) fn allowed_at(&self, t: Utc) -> Option<&Allowed> {
        self.allowed.iter().find(|a| a.window.contains(t))
    }
    /// Head of the storage over the water outside, in metres of the water inside.
    pub(crate) fn net_head_m(&self, s: &Sample) -> f64 {
        let outside_m = s.outer_m.max(self.port_centre_m);
        s.level_m - outside_m - self.density_excess * (outside_m - self.port_centre_m)
    }
}

#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum Rule {
    /// Flow at the ports outside every window, or against the current.
    OutsideWindow,
    /// The mean over the averaging span is over the cap.
    Flow,
    TideVolume,
    RollingVolume,
    MonthVolume,
    /// A gate told to open against the head with no pump to follow.
    PastInterlock,
    RestLate,
    RestNotDone,
    /// Moved with no lease alive.
    NoLease,
}

#[derive(Clone, PartialEq, Debug)]
pub struct Finding {
    pub rule: Rule,
    pub at: Utc,
    pub what: String,
}
