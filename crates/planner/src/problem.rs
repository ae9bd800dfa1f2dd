//! The request in plain numbers: volumes, flows and seconds.

use core::fmt;

use model::{AssetKind, PlanRequest, Site};
use structures::{Friction, Outfall, Pipe, StorageCurve, StructureError};
use units::{Span, Utc};

use crate::windows::{ReleaseWindow, release_windows};

/// A request that no plan can be made from.
#[derive(Clone, PartialEq, Debug)]
pub enum PlanError {
    Structure {
        part: &'static str,
        source: StructureError,
    },
    /// The level is outside the storage's curve.
    LevelOutside {
        level_m: f64,
    },
    /// A series of the request does not cover its span.
    Uncovered {
        what: &'static str,
        at: Utc,
    },
    /// A pump that must run (or rest) longer than a slot.
    RunTooLong {
        pump: String,
        needs: Span,
    },
}

impl fmt::Display for PlanError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Structure { part, source } => write!(f, "the {part}: {source}"),
            Self::LevelOutside { level_m } => {
                write!(f, "a storage level of {level_m} m is outside its curve")
            }
            Self::Uncovered { what, at } => write!(f, "the {what} says nothing of {at}"),
            Self::RunTooLong { pump, needs } => write!(
                f,
                "{pump} must run or rest for {needs}; the planner keeps 5 min at the most so far"
            ),
        }
    }
}
impl std::error::Error for PlanError {}

pub(crate) const SLOT: Span = Span::minutes(5);

/// One pump.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct PumpPlate {
    pub flow_m3_s: f64,
    pub power_kw: f64,
}

/// What the dynamic programme works on.
pub(crate) struct Problem<'a> {
    pub request: &'a PlanRequest,
    pub storage: StorageCurve,
    pub outfall: Outfall,
    pub volume_now: f64,
    pub volume_low: f64,
    pub volume_alarm: f64,
    pub volume_spill: f64,
    pub pumps: Vec<PumpPlate>,
    pub windows: Vec<ReleaseWindow>,
    /// m3/s per s: the rate at which flows are ramped.
    pub ramp_m3_s2: f64,
    pub closing_lead: Span,
    pub energy_price: f64,
}

impl<'a> Problem<'a> {
    pub(crate) fn new(site: &'a Site, request: &'a PlanRequest) -> Result<Self, PlanError> {
        let outlet = &site.outlets[request.outlet];
        let spec = site.storage(outlet.storage);
        let of = |part| move |source| PlanError::Structure { part, source };
        let points: Vec<(f64, f64)> = spec.curve.iter().map(|(l, v)| (l.get(), v.get())).collect();
        let storage = StorageCurve::new(&points).map_err(of("storage curve"))?;
        let p = &outlet.pipe;
        let friction = Friction::Darcy(p.friction_f);
        let pipe = Pipe::new(p.diameter.get(), p.length.get(), friction, p.loss_k);
        let pipe = pipe.map_err(of("outfall pipe"))?;
        let outfall = Outfall::new(pipe, p.port_centre.get(), p.density_excess);
        let outfall = outfall.map_err(of("outfall"))?;
        let level_m = request.level_now.get();
        if level_m < storage.floor_m() {
            return Err(PlanError::LevelOutside { level_m });
        }
        let gate_free = request.available[outlet.gate.index()];
        let windows = if gate_free { release_windows(site, request) } else { Vec::new() };
        let problem = Self {
            volume_now: storage.volume_m3(level_m),
            volume_low: storage.volume_m3(spec.level_lowest_working.get()),
            volume_alarm: storage.volume_m3(spec.level_high_alarm.get()),
            volume_spill: storage.volume_m3(spec.level_spill.get()),
            pumps: pumps(site, request)?,
            windows,
            ramp_m3_s2: ramp(site, request),
            closing_lead: request.closing_lead,
            energy_price: site.settings.energy_price_per_kwh,
            storage,
            outfall,
            request,
        };
        problem.covered()?;
        Ok(problem)
    }

    /// Both series must reach over the span, so that nothing later has to guess.
    fn covered(&self) -> Result<(), PlanError> {
        let span = &self.request.span;
        let both = [("inflow", &self.request.inflow), ("outer level", &self.request.outer_level)];
        for (what, series) in both {
            for at in [span.start(), span.end()] {
                if series.at(at).is_none() {
                    return Err(PlanError::Uncovered { what, at });
                }
            }
        }
        Ok(())
    }

    pub(crate) fn inflow_m3_s(&self, t: Utc) -> f64 {
        clamped(&self.request.inflow, t)
    }
    pub(crate) fn outer_m(&self, t: Utc) -> f64 {
        clamped(&self.request.outer_level, t)
    }
    /// Inflow volume by the trapezium rule on a grid no coarser than a slot.
    pub(crate) fn inflow_m3(&self, from: Utc, to: Utc) -> f64 {
        let mut sum = 0.0;
        let mut t = from;
        while t < to {
            let next = (t.floor_to(SLOT) + SLOT).min(to);
            let mean = (self.inflow_m3_s(t) + self.inflow_m3_s(next)) / 2.0;
            sum += mean * (next - t).as_seconds();
            t = next;
        }
        sum
    }
    /// The most that gravity can pass at this storage level, gate fully open; zero where the head
    /// would be gone within the closing lead.
    pub(crate) fn gravity_m3_s(&self, level_m: f64, t: Utc) -> f64 {
        if self.outfall.net_head_m(level_m, self.outer_m(t + self.closing_lead)) <= 0.0 {
            return 0.0;
        }
        self.outfall.flow_m3_s(level_m, self.outer_m(t), 1.0)
    }
    /// Flow of the first `n` pumps.
    pub(crate) fn pumped_m3_s(&self, n: usize) -> f64 {
        self.pumps[..n].iter().map(|p| p.flow_m3_s).sum()
    }
    pub(crate) fn pump_kw(&self, n: usize) -> f64 {
        self.pumps[..n].iter().map(|p| p.power_kw).sum()
    }
}

/// `covered` has shown that the span is inside; a look a little past its end takes the last value.
fn clamped(series: &units::Series, t: Utc) -> f64 {
    let t = t.max(series.start()).min(series.last_instant());
    series.at(t).expect("inside the series")
}

fn pumps(site: &Site, request: &PlanRequest) -> Result<Vec<PumpPlate>, PlanError> {
    let mut list = Vec::new();
    for id in &site.outlets[request.outlet].pumps {
        let asset = site.asset(*id);
        let AssetKind::Pump(pump) = &asset.kind else { continue };
        let needs = pump.run_min.max(pump.rest_min);
        if needs > SLOT {
            return Err(PlanError::RunTooLong { pump: asset.name.clone(), needs });
        }
        if request.available[id.index()] {
            list.push(PumpPlate { flow_m3_s: pump.flow.get(), power_kw: pump.power.get() });
        }
    }
    Ok(list)
}

/// The clause's ramp, else the whole flow cap over one stroke, times the aim.
fn ramp(site: &Site, request: &PlanRequest) -> f64 {
    let gate = site.outlets[request.outlet].gate;
    let aim = site.settings.ramp_aim;
    if let Some(cap) = licence::ramp_cap(site, gate) {
        return cap.max.get() / 60.0 * aim;
    }
    let stroke_s = match &site.asset(gate).kind {
        AssetKind::Gate(g) => g.stroke.as_seconds().max(60.0),
        AssetKind::Pump(_) => 60.0,
    };
    licence::flow_cap(site, gate).map_or(1.0, |c| c.max.get()) / stroke_s * aim
}
