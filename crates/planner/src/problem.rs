//! The request in plain numbers: volumes, flows and seconds.

use model::{AssetId, AssetKind, Outlet, PlanRequest, Pump, Site, Storage};
use structures::{Friction, Outfall, Pipe, StorageCurve};
use units::{Series, Span, Utc};

use crate::error::PlanError;
use crate::prices::Prices;
use crate::windows::{Period, ReleaseWindow, periods, release_windows};

pub(crate) const SLOT: Span = Span::minutes(5);

/// One pump that may be planned.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct PumpPlate {
    pub asset: AssetId,
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
    /// Pumps change at most this often, so that run, rest and starts per hour are kept.
    pub pump_block: Span,
    pub pump_run_min: Span,
    pub windows: Vec<ReleaseWindow>,
    /// The windows of each tide, cut into slots.
    pub periods: Vec<Period>,
    /// m3/s per s: the rate at which flows are ramped.
    pub ramp_m3_s2: f64,
    pub prices: Prices,
    inflow: Volumes,
}

impl<'a> Problem<'a> {
    pub(crate) fn new(site: &'a Site, request: &'a PlanRequest) -> Result<Self, PlanError> {
        let outlet = checked(site, request)?;
        let spec = site.storage(outlet.storage);
        let (storage, outfall) = structures(outlet, spec)?;
        let level_m = request.level_now.get();
        if level_m < storage.floor_m() {
            return Err(PlanError::LevelOutside { level_m });
        }
        let all = pumps(site, outlet)?;
        let free = |id: &AssetId| request.available[id.index()];
        let plate = |(id, p): &(AssetId, &Pump)| PumpPlate {
            asset: *id,
            flow_m3_s: p.flow.get(),
            power_kw: p.power.get(),
        };
        let pumps: Vec<PumpPlate> = all.iter().filter(|(id, _)| free(id)).map(plate).collect();
        let mut problem = Self {
            volume_now: storage.volume_m3(level_m),
            volume_low: storage.volume_m3(spec.level_lowest_working.get()),
            volume_alarm: storage.volume_m3(spec.level_high_alarm.get()),
            volume_spill: storage.volume_m3(spec.level_spill.get()),
            pump_block: all.iter().map(|(_, p)| pump_block(p)).max().unwrap_or(SLOT),
            pump_run_min: all.iter().map(|(_, p)| p.run_min).max().unwrap_or(Span::ZERO),
            windows: if free(&outlet.gate) { release_windows(site, request) } else { Vec::new() },
            periods: Vec::new(),
            ramp_m3_s2: ramp_m3_s2(site, outlet.gate),
            prices: Prices::of(site.settings.energy_price_per_kwh, &pumps),
            inflow: Volumes::of(&request.inflow),
            pumps,
            storage,
            outfall,
            request,
        };
        problem.periods = periods(&problem);
        Ok(problem)
    }

    /// Inflow volume, exact for the straight lines of the series.
    pub(crate) fn inflow_m3(&self, from: Utc, to: Utc) -> f64 {
        self.inflow.until(&self.request.inflow, to) - self.inflow.until(&self.request.inflow, from)
    }
    pub(crate) fn outer_m(&self, t: Utc) -> f64 {
        held(&self.request.outer_level, t)
    }
    /// The highest level outside in `[from, to]`.
    pub(crate) fn outer_most_m(&self, from: Utc, to: Utc) -> f64 {
        let series = &self.request.outer_level;
        let mut most = self.outer_m(from).max(self.outer_m(to));
        let mut t = series.start() + steps(series, from);
        while t < to.min(series.last_instant()) {
            if t > from {
                most = most.max(self.outer_m(t));
            }
            t = t + series.step();
        }
        most
    }
    /// What gravity passes with the gate fully open.
    pub(crate) fn gravity_m3_s(&self, volume: f64, outer_m: f64) -> f64 {
        self.outfall.flow_m3_s(self.storage.level_m(volume), outer_m, 1.0)
    }
    /// The storage volume that just balances the water outside; over it there is a head.
    pub(crate) fn volume_head(&self, outer_m: f64) -> f64 {
        // The net head is the inner level less something that only the outside knows.
        self.storage.volume_m3(-self.outfall.net_head_m(0.0, outer_m))
    }
    /// Flow of `n` pumps on this tide: which ones come first goes round with the tides.
    pub(crate) fn pumped_m3_s(&self, n: usize, tide: i64) -> f64 {
        self.turn(n, tide).map(|p| p.flow_m3_s).sum()
    }
    pub(crate) fn pump_kw(&self, n: usize, tide: i64) -> f64 {
        self.turn(n, tide).map(|p| p.power_kw).sum()
    }
    /// The first `n` pumps of this tide.
    pub(crate) fn turn(&self, n: usize, tide: i64) -> impl Iterator<Item = &PumpPlate> {
        let count = self.pumps.len();
        let first = if count > 0 { tide.rem_euclid(count as i64) as usize } else { 0 };
        (0..n).map(move |i| &self.pumps[(first + i) % count])
    }
    pub(crate) fn spilled(&self, volume: f64) -> (f64, f64) {
        let over = (volume - self.volume_spill).max(0.0);
        (volume - over, over)
    }
}

/// Volumes under a series, from its start to each of its instants.
struct Volumes {
    sums: Vec<f64>,
}

impl Volumes {
    fn of(series: &Series) -> Self {
        let step_s = series.step().as_seconds();
        let mut sums = vec![0.0];
        for pair in series.values().windows(2) {
            sums.push(sums[sums.len() - 1] + (pair[0] + pair[1]) / 2.0 * step_s);
        }
        Self { sums }
    }
    fn until(&self, series: &Series, t: Utc) -> f64 {
        let t = t.max(series.start()).min(series.last_instant());
        let n = ((t - series.start()).as_micros() / series.step().as_micros()) as usize;
        let since_s = (t - series.instant(n)).as_seconds();
        self.sums[n] + (series.values()[n] + held(series, t)) / 2.0 * since_s
    }
}

/// The coverage check has shown that the span is inside; a look past its end takes the last value.
pub(crate) fn held(series: &Series, t: Utc) -> f64 {
    let t = t.max(series.start()).min(series.last_instant());
    series.at(t).expect("inside the series")
}

/// Whole steps of the series from its start to `t` or just before.
fn steps(series: &Series, t: Utc) -> Span {
    let offset = (t - series.start()).as_micros().max(0);
    Span::micros(offset - offset % series.step().as_micros())
}

/// Everything that would make the rest guess.
fn checked<'a>(site: &'a Site, request: &PlanRequest) -> Result<&'a Outlet, PlanError> {
    let (outlet, span) = (request.outlet, request.span);
    let spec = site.outlets.get(outlet);
    let spec = spec.ok_or(PlanError::NoSuchOutlet { outlet, outlets: site.outlets.len() })?;
    let (given, assets) = (request.available.len(), site.assets.len());
    if given != assets {
        return Err(PlanError::AvailableCount { given, assets });
    }
    if !matches!(site.asset(spec.gate).kind, AssetKind::Gate(_)) {
        let asset = site.asset(spec.gate).name.clone();
        return Err(PlanError::WrongKind { asset, must_be: "gate" });
    }
    let storage = site.storage(spec.storage);
    let lowest_m = storage.level_lowest_working.get();
    let (alarm_m, spill_m) = (storage.level_high_alarm.get(), storage.level_spill.get());
    if !(lowest_m < alarm_m && alarm_m <= spill_m) {
        return Err(PlanError::LevelsOutOfOrder { lowest_m, alarm_m, spill_m });
    }
    let settings = &site.settings;
    for (setting, value) in [("flow_aim", settings.flow_aim), ("ramp_aim", settings.ramp_aim)] {
        if !(value > 0.0 && value <= 1.0) {
            return Err(PlanError::BadShare { setting, value });
        }
    }
    if span.start().floor_to(SLOT) != span.start() {
        return Err(PlanError::OffGrid { start: span.start() });
    }
    if span.length() < SLOT {
        return Err(PlanError::TooShort { span });
    }
    for (what, series) in [("inflow", &request.inflow), ("outer level", &request.outer_level)] {
        for at in [span.start(), span.end()] {
            series.at(at).ok_or(PlanError::Uncovered { what, at })?;
        }
    }
    Ok(spec)
}

fn structures(outlet: &Outlet, spec: &Storage) -> Result<(StorageCurve, Outfall), PlanError> {
    let of = |part| move |source| PlanError::Structure { part, source };
    let points: Vec<(f64, f64)> = spec.curve.iter().map(|(l, v)| (l.get(), v.get())).collect();
    let storage = StorageCurve::new(&points).map_err(of("storage curve"))?;
    let p = &outlet.pipe;
    let friction = Friction::Darcy(p.friction_f);
    let pipe = Pipe::new(p.diameter.get(), p.length.get(), friction, p.loss_k);
    let pipe = pipe.map_err(of("outfall pipe"))?;
    let outfall = Outfall::new(pipe, p.port_centre.get(), p.density_excess);
    Ok((storage, outfall.map_err(of("outfall"))?))
}

fn pumps<'a>(site: &'a Site, outlet: &Outlet) -> Result<Vec<(AssetId, &'a Pump)>, PlanError> {
    let each = outlet.pumps.iter().map(|id| {
        let asset = site.asset(*id);
        match &asset.kind {
            AssetKind::Pump(p) if p.needs_open == outlet.gate => Ok((*id, p)),
            AssetKind::Pump(_) => Err(PlanError::PumpOfAnotherGate { pump: asset.name.clone() }),
            AssetKind::Gate(_) => {
                Err(PlanError::WrongKind { asset: asset.name.clone(), must_be: "pump" })
            }
        }
    });
    each.collect()
}

/// The least whole number of slots that, as the shortest time between two changes of a pump, keeps
/// its run, its rest and its starts per hour: a start comes at most every two blocks, so any hour
/// holds at most one more than go into it.
fn pump_block(pump: &Pump) -> Span {
    let needs = pump.run_min.max(pump.rest_min);
    let mut block = SLOT;
    let starts = |b: Span| Span::hours(1).as_micros() / (b.as_micros() * 2) + 1;
    let most = i64::from(pump.starts_per_hour_max).max(1);
    while block < needs || starts(block) > most {
        block += SLOT;
    }
    block
}

/// The ramp aimed at, m3/s per s: the clause's, but no faster than the gate's own stroke lets the
/// whole flow go.
fn ramp_m3_s2(site: &Site, gate: AssetId) -> f64 {
    let stroke_s = match &site.asset(gate).kind {
        AssetKind::Gate(g) => g.stroke.as_seconds().max(60.0),
        AssetKind::Pump(_) => 60.0,
    };
    let by_stroke = licence::flow_cap(site, gate).map_or(1.0, |c| c.max.get()) / stroke_s;
    let by_clause = licence::ramp_cap(site, gate).map(|c| c.max.get() / 60.0);
    by_clause.map_or(by_stroke, |r| r.min(by_stroke)) * site.settings.ramp_aim
}
