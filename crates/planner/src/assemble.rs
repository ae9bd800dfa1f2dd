//! The plan put together: slots without gaps, reasons, releases, shortfalls.

use model::{
    AssetId, AssetPlan, ClauseId, FlowLimit, Plan, PlanRequest, PlannedRelease, Setpoint,
    Shortfall, Site, Slot, SlotReason,
};
use units::{CubicMetres, CubicMetresPerSecond, Digest, Percent, Series, Span, Utc, Window};

use crate::dp::{GRAVITY, SHUT};
use crate::forward::{Limited, Path, Step};
use crate::problem::{PlanError, Problem, SLOT};
use crate::repair::feasible;
use crate::windows::ReleaseWindow;

/// Plans one outlet. Pure: the same request gives the same plan, bit for bit.
pub fn plan(site: &Site, request: &PlanRequest) -> Result<Plan, PlanError> {
    let mut problem = Problem::new(site, request)?;
    let path = feasible(&mut problem);
    let outlet = &site.outlets[request.outlet];
    let mut assets = vec![asset_plan(&problem, &path, outlet.gate, |s| gate_slot(&problem, s))];
    let mut running = 0;
    for pump in &outlet.pumps {
        let available = request.available[pump.index()];
        if available {
            running += 1;
        }
        let number = running;
        assets.push(asset_plan(&problem, &path, *pump, |s| pump_slot(s, number, available)));
    }
    let energy_kwh: f64 = path.steps.iter().map(|s| s.energy_kwh).sum();
    Ok(Plan {
        id: request.id,
        parent: request.parent,
        as_of: request.as_of,
        span: request.span,
        request_digest: digest(request),
        forecast_digest: request.forecast_digest,
        assets,
        releases: releases(&problem, &path),
        level: level(&problem, &path),
        volume_released: CubicMetres::of(path.released_m3()),
        energy_kwh,
        cost: energy_kwh * site.settings.energy_price_per_kwh,
        shortfalls: shortfalls(&problem, &path),
    })
}

/// Slots of one asset over the whole span: rest between the windows, and in each slot of a window
/// what `of` makes of the step. Neighbours that say the same are joined.
fn asset_plan(
    problem: &Problem,
    path: &Path,
    asset: AssetId,
    of: impl Fn(&Step) -> (Setpoint, SlotReason),
) -> AssetPlan {
    let rest = of_rest(problem, asset);
    let mut slots: Vec<Slot> = Vec::new();
    let mut at = problem.request.span.start();
    let mut push =
        |window: Window, (setpoint, why): (Setpoint, SlotReason), tide| match slots.last_mut() {
            Some(last) if last.setpoint == setpoint && last.why == why && last.tide == tide => {
                last.window = Window::new(last.window.start(), window.end())
                    .expect("a later end keeps a window a window");
            }
            _ => slots.push(Slot { window, setpoint, why, tide }),
        };
    for step in &path.steps {
        gaps(problem, at, step.slot.start(), &rest, &mut push);
        push(step.slot, of(step), Some(problem.windows[step.window].tide));
        at = step.slot.end();
    }
    gaps(problem, at, problem.request.span.end(), &rest, &mut push);
    AssetPlan { asset, slots }
}

/// What an asset does outside every window.
struct Rest {
    setpoint: Setpoint,
    available: bool,
}

fn of_rest(problem: &Problem, asset: AssetId) -> Rest {
    let gate = problem.request.lawful.asset == asset;
    let setpoint = if gate { Setpoint::Shut } else { Setpoint::Stopped };
    Rest { setpoint, available: problem.request.available[asset.index()] }
}

/// From `from` to `to` nothing is released: inside a lawful window for its margins, else for the
/// clause that opens the next window.
fn gaps(
    problem: &Problem,
    from: Utc,
    to: Utc,
    rest: &Rest,
    push: &mut impl FnMut(Window, (Setpoint, SlotReason), Option<i64>),
) {
    let lawful = &problem.request.lawful.windows;
    let mut at = from;
    while at < to {
        let inside = lawful.iter().find(|w| w.window.contains(at));
        let next = lawful.iter().find(|w| w.window.start() > at);
        let (end, why) = match (inside, next) {
            (Some(w), _) if !rest.available => (w.window.end(), SlotReason::Unavailable),
            (Some(w), _) => (w.window.end(), SlotReason::EdgeMargin { clause: w.shuts.clause }),
            (None, Some(w)) => {
                (w.window.start(), SlotReason::OutsideWindow { clause: w.opens.clause })
            }
            (None, None) => (to, SlotReason::OutsideWindow { clause: None }),
        };
        let end = end.min(to);
        if let Ok(window) = Window::new(at, end) {
            push(window, (rest.setpoint, why), None);
        }
        at = end;
    }
}

fn gate_slot(problem: &Problem, s: &Step) -> (Setpoint, SlotReason) {
    let w = &problem.windows[s.window];
    if s.mode == SHUT || s.target_m3_s <= 0.0 {
        return (Setpoint::Shut, idle_reason(problem, w, s));
    }
    let target = round_flow(s.target_m3_s);
    let setpoint = Setpoint::Release {
        target: CubicMetresPerSecond::of(target),
        openings: openings(problem, s, target),
    };
    let by = |clause: Option<ClauseId>| clause.map_or(FlowLimit::Head, FlowLimit::Clause);
    let limited_by = match s.limited {
        Limited::Cap => by(w.flow_by),
        Limited::Allotment => by(w.volume_by),
        Limited::Pump => FlowLimit::Pump,
        Limited::Ramp => FlowLimit::Ramp,
        Limited::Head | Limited::StorageLow | Limited::Shut => FlowLimit::Head,
    };
    (setpoint, SlotReason::Releasing { limited_by })
}

/// To a millilitre a second: enough for any gate, and equal slots stay equal.
fn round_flow(m3_s: f64) -> f64 {
    (m3_s * 1e3).round() / 1e3
}

fn idle_reason(problem: &Problem, w: &ReleaseWindow, s: &Step) -> SlotReason {
    let volume = problem.storage.volume_m3(s.level_m);
    let middle = s.slot.start() + s.slot.length().scaled(0.5);
    if w.allotment_m3 <= 1.0 {
        return w
            .volume_by
            .map_or(SlotReason::StorageLow, |clause| SlotReason::CapReached { clause });
    }
    if volume <= problem.volume_low + 1.0 {
        SlotReason::StorageLow
    } else if problem.gravity_m3_s(s.level_m, middle) <= 0.0 {
        if problem.pumps.is_empty() { SlotReason::NoHead } else { SlotReason::WaitingForHead }
    } else {
        match w.volume_by.filter(|_| s.limited == Limited::Allotment) {
            Some(clause) => SlotReason::CapReached { clause },
            None => SlotReason::WaitingForHead,
        }
    }
}

/// Openings at fifths of the target; fully open where the head gives no more, or for pumps.
fn openings(problem: &Problem, s: &Step, target_m3_s: f64) -> [Percent; 5] {
    if s.mode > GRAVITY && s.limited == Limited::Pump {
        return [Percent::FULL; 5];
    }
    let middle = s.slot.start() + s.slot.length().scaled(0.5);
    let outer_m = problem.outer_m(middle);
    [1.0, 2.0, 3.0, 4.0, 5.0].map(|fifth| {
        let flow = target_m3_s * fifth / 5.0;
        let share = problem.outfall.opening_for_flow(s.level_m, outer_m, flow);
        Percent::clamped(share.map_or(100.0, |a| (a * 1000.0).round() / 10.0))
    })
}

fn pump_slot(s: &Step, number: usize, available: bool) -> (Setpoint, SlotReason) {
    if available && s.mode >= GRAVITY + number {
        return (Setpoint::Running, SlotReason::Assisting);
    }
    let why = match (available, s.mode) {
        (false, _) => SlotReason::Unavailable,
        (true, SHUT) => SlotReason::WaitingForHead,
        (true, _) => SlotReason::GravityEnough,
    };
    (Setpoint::Stopped, why)
}

/// One release a stretch of flow: a pause of a slot or more makes two.
fn releases(problem: &Problem, path: &Path) -> Vec<PlannedRelease> {
    let mut list: Vec<PlannedRelease> = Vec::new();
    for s in path.steps.iter().filter(|s| s.released_m3 > 0.0) {
        let tide = problem.windows[s.window].tide;
        let volume = CubicMetres::of(s.released_m3);
        match list.last_mut().filter(|r| r.window.end() == s.slot.start() && r.tide == tide) {
            Some(r) => {
                r.window = Window::new(r.window.start(), s.slot.end()).expect("it grows");
                r.volume = r.volume + volume;
            }
            None => list.push(PlannedRelease { tide, window: s.slot, volume }),
        }
    }
    list
}

/// The storage level on the 5-minute grid, from the minute-by-minute volumes.
fn level(problem: &Problem, path: &Path) -> Series {
    let span = problem.request.span;
    let last = path.volumes.len() - 1;
    Series::sampled(&span, SLOT, |t| {
        let n = path.volumes.partition_point(|(at, _)| *at <= t);
        let (t0, v0) = path.volumes[n.saturating_sub(1)];
        let (t1, v1) = path.volumes[n.min(last)];
        let share = if t1 > t0 { (t - t0).as_seconds() / (t1 - t0).as_seconds() } else { 0.0 };
        problem.storage.level_m(v0 + (v1 - v0) * share.clamp(0.0, 1.0))
    })
    .expect("a span of days has a grid, and volumes are finite")
}

/// Every spill, with the clauses that bound the releases of the two days before it.
fn shortfalls(problem: &Problem, path: &Path) -> Vec<Shortfall> {
    let mut list = Vec::new();
    for (from, to, m3) in &path.spills {
        let Ok(spill) = Window::new(*from, *to) else { continue };
        let before =
            |w: &&ReleaseWindow| w.lawful.start() < *to && w.lawful.end() > *from - Span::hours(48);
        let mut clauses: Vec<ClauseId> = Vec::new();
        for w in problem.windows.iter().filter(before) {
            let left = w.allotment_m3 - path.in_tide(&problem.windows, w.tide);
            clauses.extend(if left < 50.0 { w.volume_by } else { w.shuts_by });
            clauses.extend(if left < 50.0 { None } else { w.opens_by });
        }
        let nil = &problem.request.lawful.nil;
        clauses.extend(nil.iter().map(|n| n.clause));
        clauses.sort_unstable();
        clauses.dedup();
        list.push(Shortfall { spill, volume: CubicMetres::of(*m3), clauses });
    }
    list
}

/// Of the whole request, in a fixed order.
fn digest(r: &PlanRequest) -> u64 {
    let mut d = Digest::new();
    d.i64(r.as_of.as_micros()).i64(r.span.start().as_micros()).i64(r.span.end().as_micros());
    d.u64(r.outlet as u64).f64(r.level_now.get()).f64(r.flow_now.get());
    d.i64(r.closing_lead.as_micros()).u64(r.forecast_digest);
    for series in [&r.inflow, &r.outer_level] {
        d.i64(series.start().as_micros()).i64(series.step().as_micros());
        series.values().iter().for_each(|v| {
            d.f64(*v);
        });
    }
    for w in &r.lawful.windows {
        d.i64(w.tide).i64(w.window.start().as_micros()).i64(w.window.end().as_micros());
        d.f64(w.volume_max.map_or(-1.0, |c| c.max.get()));
        d.f64(w.flow_max.map_or(-1.0, |c| c.max.get()));
        d.i64(w.opens.time_sd.as_micros()).i64(w.shuts.time_sd.as_micros());
    }
    for (tide, volume) in &r.used_tides {
        d.i64(*tide).f64(volume.get());
    }
    for cap in &r.caps {
        d.u64(u64::from(cap.clause.0)).f64(cap.volume_max.get());
        for (w, v) in &cap.past {
            d.i64(w.start().as_micros()).f64(v.get());
        }
    }
    r.available.iter().for_each(|a| {
        d.u64(u64::from(*a));
    });
    d.get()
}
