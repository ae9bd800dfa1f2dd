//! Jobs to be done elsewhere, their products, and when to wake next.

use std::sync::Arc;

use model::{AssetId, AssetKind, Cap, Forecast, Lawful, LongCap, Plan, PlanRequest, Site};
use units::{CubicMetresPerSecond, Level, Mono, Series, Span, Utc, Window};

use crate::state::{Phase, State};
use crate::{Effects, Entry, ForecastRequest, Job, JobKind, Notice, Severity, Stamp, ramp};

const GRID: Span = Span::minutes(5);
/// Astronomy does not age; a new forecast only moves the span along.
const FORECAST_EVERY: Span = Span::hours(6);
/// A plan is made anew this often, and at once when something that it rests on has changed.
const PLAN_EVERY: Span = Span::minutes(30);
/// A storage level this far from the plan's own asks for a new plan, but not more often than this.
const STRAY_EVERY: Span = Span::minutes(15);
const LEVEL_STRAY_M: f64 = 0.05;
/// Seen and answered within this, for the latest safe start of a closing (rule 2).
const DETECTION: Span = Span::seconds(60);

pub(crate) fn jobs(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    if forecast_due(state, stamp.utc) && state.jobs.forecast.is_none() {
        let as_of = stamp.utc.floor_to(GRID);
        let horizon = state.site.settings.horizon;
        // Back over the last tides, so that sums by tide find theirs; on past the plan's end.
        let (from, to) = (as_of - Span::hours(30), as_of + horizon + FORECAST_EVERY + GRID);
        let valid = state.site.port.valid;
        let span = Window::new(from.max(valid.start()), to.min(valid.end()));
        if let Ok(span) = span {
            let id = state.new_job();
            state.jobs.forecast = Some(id);
            let kind = JobKind::Forecast(ForecastRequest { as_of, span });
            effects.jobs.push(Job { id, kind });
        }
    }
    for outlet in 0..state.site.outlets.len() {
        if state.jobs.plan.is_none() && plan_due(state, stamp, outlet) {
            ask_plan(state, stamp, outlet, effects);
        }
    }
}

fn forecast_due(state: &State, now: Utc) -> bool {
    state.forecast.as_ref().is_none_or(|f| f.as_of + FORECAST_EVERY <= now)
}

fn plan_due(state: &State, stamp: &Stamp, outlet: usize) -> bool {
    if state.jobs.plan_wanted[outlet] {
        return true;
    }
    let asked = state.jobs.planned_at[outlet];
    asked.is_none_or(|t| t + PLAN_EVERY <= stamp.utc) || level_strays(state, stamp, outlet)
}

fn level_strays(state: &State, stamp: &Stamp, outlet: usize) -> bool {
    let Some(plan) = &state.plans[outlet] else { return false };
    let site = &state.site;
    let measured = state.storage_level(&site.outlets[outlet], stamp.utc);
    let planned = plan.level.at(stamp.utc);
    let fresh = plan.as_of + STRAY_EVERY > stamp.utc;
    !fresh && measured.zip(planned).is_some_and(|(m, p)| (m - p).abs() > LEVEL_STRAY_M)
}

fn ask_plan(state: &mut State, stamp: &Stamp, outlet: usize, effects: &mut Effects) {
    let Some(kind) = request(state, stamp, outlet) else { return };
    state.jobs.plan_wanted[outlet] = false;
    state.jobs.planned_at[outlet] = Some(kind.as_of);
    state.jobs.plan = Some((outlet, kind.job));
    effects.jobs.push(Job { id: kind.job, kind: JobKind::Plan(Box::new(kind)) });
}

/// `None` while there is no forecast, or no level to begin from.
fn request(state: &mut State, stamp: &Stamp, no: usize) -> Option<PlanRequest> {
    let as_of = stamp.utc.floor_to(GRID);
    let site = state.site.clone();
    let outlet = &site.outlets[no];
    let storage = site.storage(outlet.storage);
    let forecast = state.forecast.clone()?;
    let span = Window::new(as_of, as_of + site.settings.horizon).ok()?;
    let span = span.intersect(&forecast.span)?;
    let level_now = Level::new(state.storage_level(outlet, stamp.utc)?).ok()?;
    let lawful = state.lawful[no].clone()?;
    let tides = forecast.tides.iter().filter(|t| t.window.end() > as_of);
    let used_tides = tides.map(|t| (t.number, state.tallies.in_tide(t.number))).collect();
    let gate = &state.assets[outlet.gate.index()];
    let flow_now = if state.active(outlet.gate) {
        gate.flow_target.max(0.0)
    } else {
        state.left_open_flow(outlet, stamp.utc)
    };
    let available = site.assets.iter().map(|a| available(state, stamp, a.id)).collect();
    Some(PlanRequest {
        job: state.new_job(),
        id: state.new_plan_id(),
        parent: state.plans[no].as_ref().map(|p| p.id),
        as_of,
        span,
        outlet: no,
        level_now,
        inflow: inflow(storage, &span)?,
        outer_level: forecast.place(outlet.place).level.clone(),
        lawful: aimed(lawful),
        used_tides,
        caps: long_caps(&site, state, as_of, outlet.gate),
        available,
        flow_now: CubicMetresPerSecond::of(flow_now),
        closing_lead: closing_lead(&site, outlet.gate),
        forecast_digest: forecast.digest,
    })
}

/// Volume caps as they are aimed at: the meter errs, and the cap is on the water.
fn aimed(mut lawful: Lawful) -> Lawful {
    for w in &mut lawful.windows {
        w.volume_max = w.volume_max.map(|c| Cap { max: c.max * ramp::VOLUME_AIM, ..c });
    }
    lawful
}

fn long_caps(site: &Site, state: &State, as_of: Utc, gate: AssetId) -> Vec<LongCap> {
    let mut caps = licence::long_caps(site, &state.tallies, as_of, gate);
    caps.iter_mut().for_each(|c| c.volume_max = c.volume_max * ramp::VOLUME_AIM);
    caps
}

/// 1.5 stroke + lease + detection (rule 2).
fn closing_lead(site: &Site, gate: AssetId) -> Span {
    let asset = site.asset(gate);
    let stroke = match &asset.kind {
        AssetKind::Gate(g) => g.stroke,
        AssetKind::Pump(p) => p.start_timeout,
    };
    stroke.scaled(1.5) + asset.lease + DETECTION
}

fn inflow(storage: &model::Storage, span: &Window) -> Option<Series> {
    let p = storage.inflow;
    let mean = p.mean.get();
    Series::sampled(span, GRID, |t| {
        let hour = t.as_micros().rem_euclid(86_400_000_000) as f64 / 3.6e9;
        let angle = core::f64::consts::TAU * (hour - p.peak_hour_utc) / 24.0;
        mean * (1.0 + p.swing * libm::cos(angle))
    })
    .ok()
}

/// Whether the program may plan with the asset at all.
fn available(state: &State, stamp: &Stamp, asset: AssetId) -> bool {
    let a = &state.assets[asset.index()];
    let spec = state.site.asset(asset);
    let remote = spec
        .local
        .is_none_or(|s| state.validator.state(s, stamp.utc).now().is_some_and(|local| local < 0.5));
    let free = a.locked_by.is_none() && a.tripped.is_none() && a.hand.is_none();
    free && a.hold_until.is_none()
        && remote
        && state.adapters_up[spec.adapter.index()]
        && state.position(asset, stamp.boot).is_some()
}

pub(crate) fn adopt_forecast(state: &mut State, forecast: Forecast) {
    state.jobs.forecast = None;
    for (no, outlet) in state.site.outlets.iter().enumerate() {
        state.lawful[no] = Some(licence::lawful(&state.site, &forecast, outlet.gate));
    }
    state.forecast = Some(Arc::new(forecast));
    state.want_plan();
}

pub(crate) fn adopt_plan(state: &mut State, plan: Plan, effects: &mut Effects) {
    let Some((outlet, _)) = state.jobs.plan.take() else { return };
    let worth = |p: &Plan| {
        let total: f64 = p.shortfalls.iter().map(|s| s.volume.get()).sum();
        (p.shortfalls.len(), (total / 100.0).round() as i64)
    };
    let spill = plan.shortfalls.iter().map(|s| s.volume.get()).sum();
    let news = state.plans[outlet].as_ref().is_none_or(|old| worth(old) != worth(&plan));
    effects.records.push(Entry::PlanAdopted {
        plan: plan.id,
        parent: plan.parent,
        request_digest: plan.request_digest,
        forecast_digest: plan.forecast_digest,
        released: plan.volume_released,
        spill: units::CubicMetres::of(spill),
    });
    if news {
        for s in &plan.shortfalls {
            let (window, volume) = (s.spill, s.volume);
            let clauses = s.clauses.clone();
            effects.records.push(Entry::SpillForecast { window, volume, clauses });
            let text = format!("a spill of {volume:.0} cannot be avoided lawfully: {window}");
            effects.notices.push(Notice { severity: Severity::Alarm, text });
        }
    }
    state.plans[outlet] = Some(plan);
}

/// The next instant at which something is due by itself.
pub(crate) fn wake_at(state: &State, stamp: &Stamp) -> Mono {
    let mut next = stamp.boot + Span::minutes(5);
    let mut sooner = |t: Mono| {
        if t > stamp.boot && t < next {
            next = t;
        }
    };
    let at = |utc: Utc| stamp.boot + (utc - stamp.utc);
    for asset in &state.site.assets {
        let moving =
            state.assets[asset.id.index()].command.is_some_and(|c| c.phase != Phase::Confirmed);
        if moving {
            sooner(stamp.boot + Span::seconds(15));
        }
        state.command_due(asset.id).into_iter().for_each(&mut sooner);
        ramp::due(state, asset.id).into_iter().for_each(&mut sooner);
        let slot = state.outlet_no(asset.id).and_then(|o| state.plans[o].as_ref());
        let slot = slot.and_then(|p| p.slot_at(asset.id, stamp.utc));
        slot.map(|s| at(s.window.end())).into_iter().for_each(&mut sooner);
    }
    for lawful in state.lawful.iter().flatten() {
        let inside = lawful.holding(stamp.utc).map(|w| w.window.end());
        let ahead = lawful.next_after(stamp.utc).map(|w| w.window.start());
        inside.into_iter().chain(ahead).map(at).for_each(&mut sooner);
    }
    next
}
