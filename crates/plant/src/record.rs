//! The plant's own record: what a judge reads, written by nobody else.

use units::{Mono, Utc};

use crate::{FaultKind, RestDo};

/// Volumes and energy since the very beginning.
#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub struct Totals {
    pub inflow_m3: f64,
    /// Through the ports.
    pub released_m3: f64,
    /// Over the weir.
    pub spilled_m3: f64,
    pub pump_kwh: f64,
}

/// How everything stood at one instant. Flows hold from then on.
#[derive(Clone, PartialEq, Debug)]
pub struct Sample {
    pub utc: Utc,
    pub boot: Mono,
    pub level_m: f64,
    pub volume_m3: f64,
    pub outer_m: f64,
    pub gate_percent: f64,
    pub pumps_run: Vec<bool>,
    pub ports_m3_s: f64,
    pub spill_m3_s: f64,
    pub inflow_m3_s: f64,
    pub totals: Totals,
    /// True current at the ports, positive seaward; absent where no series was given.
    pub current_m_s: Option<f64>,
}

#[derive(Clone, PartialEq, Debug)]
pub struct Event {
    pub utc: Utc,
    pub boot: Mono,
    pub kind: EventKind,
}

#[derive(Clone, PartialEq, Debug)]
pub enum EventKind {
    DriveReceived {
        asset: usize,
        command: u64,
        setting_percent: f64,
        lease_end: Mono,
    },
    DriveRefused {
        asset: usize,
        command: u64,
        why: String,
    },
    Renewed {
        asset: usize,
        command: u64,
        lease_end: Mono,
    },
    LeaseOut {
        asset: usize,
        command: u64,
        lease_end: Mono,
    },
    RestTold {
        asset: usize,
        why: String,
    },
    RestBegun {
        asset: usize,
        action: RestDo,
    },
    RestDone {
        asset: usize,
    },
    /// The controller's own protection stopped a pump.
    ProtectionStopped {
        asset: usize,
        why: &'static str,
    },
    LocalTaken {
        asset: usize,
    },
    LocalGiven {
        asset: usize,
    },
    FaultBegun {
        kind: FaultKind,
    },
    FaultEnded {
        kind: FaultKind,
    },
    /// Flow at the ports began, or the last of it was gone.
    PortsFlow,
    PortsStill,
    SpillBegun,
    SpillEnded,
}

#[derive(Clone, PartialEq, Debug, Default)]
pub struct Record {
    pub samples: Vec<Sample>,
    pub events: Vec<Event>,
}
