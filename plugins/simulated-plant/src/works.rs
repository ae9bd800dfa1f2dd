//! From a checked site to the plant that stands in for it, and between names and numbers.

use model::{
    AssetKind, Outlet, RestActions, SignalId, SimulatedFault, SimulatedFaultKind, Site, Storage,
};
use plant::{
    Beginning, Fault, FaultKind, GateConfig, InflowProfile, OutfallFigures, PlantConfig, Point,
    PumpConfig, SpillWeir, Truth, Water,
};
use structures::StorageCurve;
use units::{Mono, Span, Utc, Window};

use crate::SimulationError;
use crate::ahead::water;
use crate::wire::RestWord;

/// The weir of a site file has a level and no more; these are the demonstration's own.
const CREST_LENGTH_M: f64 = 6.0;
const CREST_DISCHARGE: f64 = 0.95;
/// The most that can arrive, as a multiple of the mean: three times dry-weather flow is what a
/// works of this kind treats in full (common practice).
const INFLOW_MAX_SHARE: f64 = 3.0;
const RECORD_EVERY: Span = Span::seconds(60);

/// What the adapter's points are, in the site's own names.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Names {
    /// (drivable point, asset name, kind), by asset number: the gate, then the pumps.
    pub assets: Vec<DrivenPoint>,
    /// (readable point, unit, what it reads)
    pub signals: Vec<ReadPoint>,
    /// Signals of the site that this plant has no source for.
    pub without_source: Vec<String>,
}

#[derive(Clone, PartialEq, Debug)]
pub(crate) struct DrivenPoint {
    pub point: String,
    pub name: String,
    pub gate: bool,
    pub rest: RestActions,
}

#[derive(Clone, PartialEq, Debug)]
pub(crate) struct ReadPoint {
    pub point: String,
    pub name: String,
    pub unit: String,
    pub value_min: f64,
    pub value_max: f64,
    pub reads: Point,
}

impl Names {
    pub fn asset(&self, point: &str) -> Option<usize> {
        self.assets.iter().position(|a| a.point == point)
    }
    pub fn of(site: &Site) -> Result<Self, SimulationError> {
        let outlet = the_outlet(site)?;
        let order = core::iter::once(&outlet.gate).chain(&outlet.pumps);
        let driven = order.clone().map(|id| {
            let a = site.asset(*id);
            DrivenPoint {
                point: a.point.clone(),
                name: a.name.clone(),
                gate: matches!(a.kind, AssetKind::Gate(_)),
                rest: a.rest,
            }
        });
        let (mut signals, mut without_source) = (Vec::new(), Vec::new());
        for s in &site.signals {
            match source_of(site, outlet, s.id) {
                Some(reads) => signals.push(ReadPoint {
                    point: s.point.clone(),
                    name: s.name.clone(),
                    unit: s.unit.clone(),
                    value_min: s.value_min,
                    value_max: s.value_max,
                    reads,
                }),
                None => without_source.push(s.name.clone()),
            }
        }
        Ok(Self { assets: driven.collect(), signals, without_source })
    }
}

/// The plant of a site over a whole span, for a run inside one process (`world`), with every piece
/// of water it needs. Refuses what [`crate::run_plant`] refuses.
pub fn plant_for(site: &Site, span: &Window, boot: Mono) -> Result<PlantConfig, SimulationError> {
    let names = Names::of(site)?;
    let water = water(site, span.start(), span.length())?;
    plant_config(site, &names, (span.start(), boot), None, water)
}

/// What in the plant a signal of the site reads; `None` where the plant has no source for it.
pub fn point_of(site: &Site, signal: SignalId) -> Option<Point> {
    source_of(site, the_outlet(site).ok()?, signal)
}

fn the_outlet(site: &Site) -> Result<&Outlet, SimulationError> {
    match &site.outlets[..] {
        [one] => Ok(one),
        many => Err(SimulationError::NotSimulated(format!(
            "it has {} outlets, and the plant is one storage with one outlet",
            many.len()
        ))),
    }
}

/// What in the plant a signal of the site reads. A constant of the simulation comes first.
fn source_of(site: &Site, outlet: &Outlet, signal: SignalId) -> Option<Point> {
    let name = &site.signal(signal).name;
    let constants = site.simulation.as_ref().map_or(&[][..], |s| &s.constants);
    if let Some(n) = constants.iter().position(|(of, _)| of == name) {
        return Some(Point::Constant(n as u16));
    }
    let levels = &site.storage(outlet.storage).level_signals;
    if let Some(n) = levels.iter().position(|s| *s == signal) {
        return (n < 2).then_some(Point::Level(n as u8));
    }
    if outlet.flow_signal == Some(signal) {
        return Some(Point::Outflow);
    }
    if outlet.outer_signal == Some(signal) || site.place(outlet.place).gauge == Some(signal) {
        return Some(Point::Outer);
    }
    if site.port.gauge == Some(signal) {
        return Some(Point::Port);
    }
    let order = core::iter::once(&outlet.gate).chain(&outlet.pumps);
    for (n, id) in order.enumerate() {
        let asset = site.asset(*id);
        if asset.position == signal {
            return Some(if n == 0 { Point::GatePosition } else { Point::PumpRuns(n as u8) });
        }
        if asset.local == Some(signal) {
            return Some(Point::Local(n as u8));
        }
    }
    None
}

/// The plant of a site, beginning at `start`. `water` must cover it.
pub(crate) fn plant_config(
    site: &Site,
    names: &Names,
    (start, boot): (Utc, Mono),
    beginning: Option<Beginning>,
    water: Water,
) -> Result<PlantConfig, SimulationError> {
    let simulation = site.simulation.as_ref().ok_or_else(|| {
        SimulationError::NotSimulated("the site file has no [simulation] section".to_owned())
    })?;
    let outlet = the_outlet(site)?;
    let storage = site.storage(outlet.storage);
    let totals = plant::Totals::default();
    let level_m = simulation.level_start.get();
    let fresh = Beginning { level_m, gate_percent: 0.0, totals };
    let faults = simulation.faults.iter().map(|f| fault(names, f)).collect::<Result<_, _>>()?;
    Ok(PlantConfig {
        start,
        boot,
        beginning: beginning.unwrap_or(fresh),
        truth: Truth::drawn(simulation.seed),
        storage: curve(storage)?,
        spill: SpillWeir {
            crest_level_m: storage.level_spill.get(),
            crest_length_m: CREST_LENGTH_M,
            discharge: CREST_DISCHARGE,
        },
        outfall: outfall(outlet),
        drain_down: outlet.drain_down,
        gate: gate(site, outlet)?,
        pumps: pumps(site, outlet)?,
        inflow: inflow(storage),
        water,
        constants: simulation.constants.iter().map(|c| c.1).collect(),
        faults,
        record_every: RECORD_EVERY,
    })
}

fn curve(storage: &Storage) -> Result<StorageCurve, SimulationError> {
    let points: Vec<_> = storage.curve.iter().map(|(l, v)| (l.get(), v.get())).collect();
    StorageCurve::new(&points)
        .map_err(|source| plant::PlantError::Structure { part: "storage", source }.into())
}

fn outfall(outlet: &Outlet) -> OutfallFigures {
    let p = &outlet.pipe;
    OutfallFigures {
        diameter_m: p.diameter.get(),
        length_m: p.length.get(),
        friction_f: p.friction_f,
        loss_k: p.loss_k,
        port_centre_m: p.port_centre.get(),
        density_excess: p.density_excess,
    }
}

fn inflow(storage: &Storage) -> InflowProfile {
    let i = &storage.inflow;
    InflowProfile {
        mean_m3_s: i.mean.get(),
        swing: i.swing,
        peak_hour_utc: i.peak_hour_utc,
        max_m3_s: i.mean.get() * INFLOW_MAX_SHARE,
    }
}

fn gate(site: &Site, outlet: &Outlet) -> Result<GateConfig, SimulationError> {
    let asset = site.asset(outlet.gate);
    match &asset.kind {
        AssetKind::Gate(g) => {
            Ok(GateConfig { stroke: g.stroke, rest: RestWord::of(asset.rest.lease_out).into_do() })
        }
        AssetKind::Pump(_) => {
            Err(SimulationError::NotSimulated(format!("its gate {} is a pump", asset.name)))
        }
    }
}

fn pumps(site: &Site, outlet: &Outlet) -> Result<Vec<PumpConfig>, SimulationError> {
    let pump = |id: &model::AssetId| {
        let asset = site.asset(*id);
        match &asset.kind {
            AssetKind::Pump(p) => Ok(PumpConfig {
                flow_m3_s: p.flow.get(),
                power_kw: p.power.get(),
                rest: RestWord::of(asset.rest.lease_out).into_do(),
            }),
            AssetKind::Gate(_) => {
                Err(SimulationError::NotSimulated(format!("its pump {} is a gate", asset.name)))
            }
        }
    };
    outlet.pumps.iter().map(pump).collect()
}

fn fault(names: &Names, f: &SimulatedFault) -> Result<Fault, SimulationError> {
    let lost = || {
        let words = format!("a fault names {}, which the plant does not have", f.subject);
        SimulationError::NotSimulated(words)
    };
    let signal = || names.signals.iter().find(|s| s.name == f.subject).map(|s| s.reads);
    let kind = match f.kind {
        SimulatedFaultKind::GateJam => {
            let asset = names.assets.iter().find(|a| a.name == f.subject && a.gate);
            asset.map(|_| FaultKind::GateJam).ok_or_else(lost)?
        }
        SimulatedFaultKind::SignalFrozen => FaultKind::SignalFrozen(signal().ok_or_else(lost)?),
        SimulatedFaultKind::SignalMissing => FaultKind::SignalMissing(signal().ok_or_else(lost)?),
    };
    Ok(Fault { kind, window: f.window })
}

#[cfg(test)]
mod tests {
    use std::path::Path;

    use super::*;

    fn tarrow() -> Site {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../deploy/sites/tarrow-works");
        site::load(&folder).unwrap()
    }

    #[test]
    fn every_signal_of_the_demonstration_site_has_a_source() {
        let names = Names::of(&tarrow()).unwrap();
        assert_eq!(names.without_source, Vec::<String>::new());
        let mut sources: Vec<Point> = names.signals.iter().map(|s| s.reads).collect();
        sources.sort();
        sources.dedup();
        assert_eq!(sources.len(), names.signals.len(), "no two signals read one thing");
        assert!(names.assets[0].gate && !names.assets[2].gate);
    }

    #[test]
    fn a_month_of_the_demonstration_site_runs_at_rest_and_spills_in_the_end() {
        let start = Utc::from_civil(2027, 3, 1, 0, 0, 0).unwrap();
        let span = Window::new(start, start + Span::days(30)).unwrap();
        let boot = Mono::from_nanos(77);
        let config = plant_for(&tarrow(), &span, boot).unwrap();
        let mut plant = plant::Plant::new(config).unwrap();
        plant.advance(span.end(), boot + span.length()).unwrap();
        // Nobody opens: 0.133 m3/s for 30 days is 345,000 m3 (+-10 %, and some showers), and all
        // but the free 9,800 m3 of the lagoon goes over the weir.
        let t = plant.totals();
        assert_eq!(t.released_m3, 0.0);
        assert!((300_000.0..390_000.0).contains(&t.inflow_m3), "{}", t.inflow_m3);
        let kept = t.inflow_m3 - t.spilled_m3;
        assert!((9_000.0..11_500.0).contains(&kept), "{kept}");
    }

    #[test]
    fn a_fault_that_names_nothing_is_refused_by_name() {
        let mut site = tarrow();
        let start = Utc::from_civil(2027, 3, 1, 0, 0, 0).unwrap();
        let window = Window::new(start, start + Span::days(1)).unwrap();
        let simulation = site.simulation.as_mut().unwrap();
        let kind = SimulatedFaultKind::GateJam;
        let subject = "pump-1".to_owned();
        simulation.faults = vec![SimulatedFault { kind, subject, window }];
        let refused = plant_for(&site, &window, Mono::ZERO).unwrap_err();
        assert!(refused.to_string().contains("pump-1"), "{refused}");
        site.simulation = None;
        let refused = plant_for(&site, &window, Mono::ZERO).unwrap_err();
        assert!(refused.to_string().contains("[simulation]"), "{refused}");
    }
}
