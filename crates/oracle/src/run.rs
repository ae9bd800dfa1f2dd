//! What is judged: the plant's record and the rules, as plain data.

use units::{Mono, Span, Utc, Window};

/// How the plant stood at one instant.
#[derive(Clone, PartialEq, Debug)]
pub struct Sample {
    pub utc: Utc,
    pub boot: Mono,
    pub level_m: f64,
    pub outer_m: f64,
    pub gate_percent: f64,
    pub pumps_run: u32,
    pub ports_m3_s: f64,
    pub inflow_m3_s: f64,
    /// Through the ports and over the weir, since the very beginning.
    pub released_m3: f64,
    pub spilled_m3: f64,
}

#[derive(Clone, PartialEq, Debug)]
pub struct Event {
    pub utc: Utc,
    pub boot: Mono,
    pub kind: EventKind,
}

/// Assets are numbered as the plant does: 0 the gate, 1 and up the pumps.
#[derive(Clone, PartialEq, Debug)]
pub enum EventKind {
    /// A command reached the plant and was taken.
    Driven {
        asset: usize,
        setting_percent: f64,
        lease_end: Mono,
    },
    /// A command reached the plant and was refused by it.
    DriveRefused {
        asset: usize,
    },
    Renewed {
        asset: usize,
        lease_end: Mono,
    },
    RestTold {
        asset: usize,
    },
    RestBegun {
        asset: usize,
    },
    RestDone {
        asset: usize,
    },
    /// The plant's own protection stopped it.
    ProtectionStopped {
        asset: usize,
    },
    LocalTaken {
        asset: usize,
    },
    LocalGiven {
        asset: usize,
    },
    /// The gate can move no more, and can again.
    JamBegun,
    JamEnded,
    PortsFlow,
    PortsStill,
    /// A plant that had stopped begins again: what stood before says nothing of now.
    PlantStarted,
}

/// In order of time, events of one instant as they came.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Run {
    pub samples: Vec<Sample>,
    pub events: Vec<Event>,
}

/// A stretch in which water may leave the ports.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct LawfulWindow {
    pub window: Window,
    pub tide: i64,
    /// As the mean over [`Rules::averaging`].
    pub flow_max_m3_s: f64,
}

/// A tide, from the low water that begins it to the one that ends it, and what may leave in it.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct TideCap {
    pub window: Window,
    pub tide: i64,
    pub volume_max_m3: f64,
}

/// A fixed stretch (a calendar month) and what may leave in it.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct FixedCap {
    pub window: Window,
    pub volume_max_m3: f64,
}

/// When an asset may not be commanded, and why: locked out, or its position cannot be read.
#[derive(Clone, PartialEq, Debug)]
pub struct Barred {
    pub asset: usize,
    pub window: Window,
    pub why: String,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Asset {
    /// From one end to the other; zero for a pump.
    pub stroke: Span,
}

/// The gate's own head: inner - outside - excess x (outside - ports), outside never below the ports.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct GateHead {
    pub port_centre_m: f64,
    pub density_excess: f64,
}

impl GateHead {
    pub fn net_m(&self, inner_m: f64, outer_m: f64) -> f64 {
        let outside_m = outer_m.max(self.port_centre_m);
        inner_m - outside_m - self.density_excess * (outside_m - self.port_centre_m)
    }
}

/// The list of constraints.
#[derive(Clone, PartialEq, Debug)]
pub struct Rules {
    /// In order, disjoint.
    pub lawful: Vec<LawfulWindow>,
    pub tides: Vec<TideCap>,
    pub fixed: Vec<FixedCap>,
    /// (span, greatest volume in (t - span, t] at every t)
    pub rolling: Option<(Span, f64)>,
    pub averaging: Span,
    /// Greatest change of flow in a minute; rests are no licence acts and are left out.
    pub ramp_max_m3_s: Option<f64>,
    /// Flow at the ports up to this counts as still, m3/s.
    pub still_m3_s: f64,
    pub assets: Vec<Asset>,
    pub head: GateHead,
    /// A gate may be opened against the head if a pump runs within this time.
    pub assist_within: Span,
    /// A pump needs the gate open by this share at least, percent.
    pub way_open_min_percent: f64,
    pub level_lowest_working_m: f64,
    /// How far instruments in order may stand from the truth, m: one that reads a head of a
    /// centimetre where there is none has not been passed by.
    pub instruments_m: f64,
    /// A fact of the plant is known to a reader this late at most.
    pub known_within: Span,
    pub barred: Vec<Barred>,
}
