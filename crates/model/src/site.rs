//! The checked site: what `site` makes of the site and licence files.

use units::{
    CubicMetres, CubicMetresPerSecond, Level, Metres, MetresPerSecond, Percent, Span, Window,
    ZoneRules,
};

use crate::{AdapterId, Asset, AssetId, Keeping, Licence, Outlet, PlaceId, SignalId, StorageId};

/// One site, whole and checked.
#[derive(Clone, PartialEq, Debug)]
pub struct Site {
    /// Short name, `[a-z0-9-]+`, used in files and rows.
    pub name: String,
    pub title: String,
    pub datum: String,
    pub zone: ZoneRules,
    pub port: Port,
    pub places: Vec<Place>,
    pub storages: Vec<Storage>,
    pub outlets: Vec<Outlet>,
    pub assets: Vec<Asset>,
    pub signals: Vec<Signal>,
    pub adapters: Vec<Adapter>,
    pub licence: Licence,
    pub settings: Settings,
    pub keeping: Keeping,
    /// Present when the plant is simulated; then the clock may run faster.
    pub simulation: Option<Simulation>,
    /// BLAKE3 of the site file and of the licence file, hex.
    pub site_digest: String,
    pub licence_digest: String,
}

impl Site {
    pub fn place(&self, id: PlaceId) -> &Place {
        &self.places[id.index()]
    }
    pub fn storage(&self, id: StorageId) -> &Storage {
        &self.storages[id.index()]
    }
    pub fn asset(&self, id: AssetId) -> &Asset {
        &self.assets[id.index()]
    }
    pub fn signal(&self, id: SignalId) -> &Signal {
        &self.signals[id.index()]
    }
    pub fn asset_named(&self, name: &str) -> Option<&Asset> {
        self.assets.iter().find(|a| a.name == name)
    }
    pub fn signal_named(&self, name: &str) -> Option<&Signal> {
        self.signals.iter().find(|s| s.name == name)
    }
    pub fn place_named(&self, name: &str) -> Option<&Place> {
        self.places.iter().find(|p| p.name == name)
    }
    /// The outlet that this asset is a gate or a pump of.
    pub fn outlet_of(&self, asset: AssetId) -> Option<&Outlet> {
        self.outlets.iter().find(|o| o.gate == asset || o.pumps.contains(&asset))
    }
    pub fn all_simulated(&self) -> bool {
        self.adapters.iter().all(|a| a.program == AdapterProgram::SimulatedPlant)
    }
}

/// The reference port: constants that were published or fitted, with their conventions.
#[derive(Clone, PartialEq, Debug)]
pub struct Port {
    pub name: String,
    /// Mean level above the site datum.
    pub mean_level: Level,
    pub nodal: NodalRule,
    pub constants: Vec<PortConstant>,
    /// Outside this span nothing is predicted and nothing runs automatically.
    pub valid: Window,
    /// The gauge at the port, if there is one.
    pub gauge: Option<SignalId>,
}

/// One harmonic constant: amplitude in metres, Greenwich phase lag in degrees.
#[derive(Clone, PartialEq, Debug)]
pub struct PortConstant {
    /// The constituent's name as the tide table of constituents knows it, e.g. `M2`.
    pub name: String,
    pub amplitude: Metres,
    pub phase_lag_greenwich_deg: f64,
}

/// How node factors move with time; part of the constants.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum NodalRule {
    /// Schureman's formulas at each instant.
    Continuous,
    /// Schureman's formulas at the middle of each calendar year (UTC), held for that year.
    MidYear,
}

/// A point along the channel where water matters.
#[derive(Clone, PartialEq, Debug)]
pub struct Place {
    pub id: PlaceId,
    pub name: String,
    /// Metres upstream of the mouth.
    pub chainage: Metres,
    pub differences: Differences,
    /// A gauge here, if there is one.
    pub gauge: Option<SignalId>,
}

/// A figure at neap and at spring range of the port, straight between and a little beyond.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct NeapSpring<T> {
    pub neap: T,
    pub spring: T,
}

/// From port to place by tabulated differences: four separate laws, never one lag.
#[derive(Clone, PartialEq, Debug)]
pub struct Differences {
    /// The ranges at the port that the two columns stand for.
    pub range: NeapSpring<Metres>,
    /// Local high water after the port's high water, and its rise over the port's.
    pub high_lag: NeapSpring<Span>,
    pub high_rise: NeapSpring<Metres>,
    /// Local low water after the port's low water, and its level (absolute: at a place far up a
    /// channel the low water has little to do with the port's).
    pub low_lag: NeapSpring<Span>,
    pub low_level: NeapSpring<LowLevel>,
    /// The current turns seaward this long after the **port's** high water, and landward this long
    /// after the port's low water; absent where no current is needed.
    pub current: Option<CurrentDifferences>,
    /// One standard deviation of a predicted time and level here, inside neap to spring.
    pub time_sd: Span,
    pub level_sd: Metres,
}

/// How a low-water level at the place is tabulated.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum LowLevel {
    /// The level itself, above the site datum.
    At(Level),
    /// A rise over the port's low water.
    RiseOverPort(Metres),
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct CurrentDifferences {
    pub seaward_after_port_high: NeapSpring<Span>,
    pub landward_after_port_low: NeapSpring<Span>,
    /// Greatest speed on the ebb and on the flood, both positive numbers.
    pub peak_ebb: NeapSpring<MetresPerSecond>,
    pub peak_flood: NeapSpring<MetresPerSecond>,
}

/// A tank, lagoon, drain or basin.
#[derive(Clone, PartialEq, Debug)]
pub struct Storage {
    pub id: StorageId,
    pub name: String,
    /// (level, volume) pairs, both strictly rising, at least two; straight between.
    pub curve: Vec<(Level, CubicMetres)>,
    pub level_lowest_working: Level,
    pub level_high_alarm: Level,
    pub level_spill: Level,
    /// Signals of its level, best first.
    pub level_signals: Vec<SignalId>,
    pub inflow: InflowProfile,
}

/// Dry-weather inflow: mean x (1 + swing x cos(2 pi (t - peak)/24 h)), t in hours UTC.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct InflowProfile {
    pub mean: CubicMetresPerSecond,
    pub swing: f64,
    pub peak_hour_utc: f64,
}

/// Something measured or forecast from outside.
#[derive(Clone, PartialEq, Debug)]
pub struct Signal {
    pub id: SignalId,
    pub name: String,
    pub adapter: AdapterId,
    /// The adapter's own id for it.
    pub point: String,
    pub unit: String,
    pub value_min: f64,
    pub value_max: f64,
    /// Fastest change that can be true, per second.
    pub rate_max_per_s: Option<f64>,
    pub age_max: Span,
    /// A reading that has not changed for this long is frozen; `None` where flat is healthy.
    pub frozen_after: Option<Span>,
}

/// A process that talks to equipment.
#[derive(Clone, PartialEq, Debug)]
pub struct Adapter {
    pub id: AdapterId,
    pub name: String,
    pub program: AdapterProgram,
    /// Passed on at `introduce`, as text.
    pub settings: Vec<(String, String)>,
}

#[derive(Clone, PartialEq, Eq, Debug)]
pub enum AdapterProgram {
    /// The plant that this binary carries.
    SimulatedPlant,
    /// A program and its arguments.
    Command(Vec<String>),
}

/// Settings of planning and running.
#[derive(Clone, PartialEq, Debug)]
pub struct Settings {
    pub horizon: Span,
    /// Share of a flow cap that a release aims at, so that the meter's error stays under the cap.
    pub flow_aim: f64,
    /// Share of a ramp cap that a change of flow aims at; planner and engine both ramp so.
    pub ramp_aim: f64,
    /// Clock uncertainty, taken once off both ends of a window with a predicted anchor.
    pub clock_margin: Span,
    /// Standard deviations taken off an edge with a modelled or observed anchor.
    pub band_sigmas: f64,
    pub energy_price_per_kwh: f64,
    /// How long a setpoint may go on being renewed with the journal lost.
    pub journal_grace: Span,
    /// Longest outage after which a standing authorisation still resumes by itself.
    pub outage_max: Span,
    /// Nobody moves an asset for less than this change of opening.
    pub opening_step_min: Percent,
    /// A file that is touched at each healthy round, for independent telemetry.
    pub heartbeat_file: Option<String>,
}

/// What the simulated plant is told.
#[derive(Clone, PartialEq, Debug)]
pub struct Simulation {
    pub seed: u64,
    /// Where simulated time begins; the real date when absent.
    pub start: Option<units::Utc>,
    pub level_start: Level,
    /// Ammonia and the like: constant readings by signal name.
    pub constants: Vec<(String, f64)>,
    pub faults: Vec<SimulatedFault>,
}

#[derive(Clone, PartialEq, Debug)]
pub struct SimulatedFault {
    pub kind: SimulatedFaultKind,
    /// An asset for a jam, a signal for a frozen or missing reading.
    pub subject: String,
    pub window: Window,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum SimulatedFaultKind {
    GateJam,
    SignalFrozen,
    SignalMissing,
}
