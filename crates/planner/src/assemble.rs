//! The plan put together: slots without gaps, releases, levels, shortfalls.

use model::{
    AssetId, AssetPlan, ClauseId, Plan, PlanRequest, PlannedRelease, Setpoint, Shortfall, Site,
    Slot, SlotReason, TideNumber,
};
use units::{CubicMetres, CubicMetresPerSecond, Percent, Series, Utc, Window};

use crate::digest::digest;
use crate::error::PlanError;
use crate::forward::{Does, Idle, Path, Step};
use crate::problem::{Problem, SLOT};
use crate::reasons;
use crate::repair::feasible;
use crate::throttle::Bound;

/// Plans one outlet over the request's span. Pure: the same request gives the same plan, bit for
/// bit. What cannot be planned at all is refused by name; a gate that is not available is planned
/// as staying shut.
pub fn plan(site: &Site, request: &PlanRequest) -> Result<Plan, PlanError> {
    let problem = Problem::new(site, request)?;
    let path = feasible(&problem);
    let outlet = &site.outlets[request.outlet];
    let mut assets = vec![gate_plan(&problem, &path, outlet.gate)];
    assets.extend(outlet.pumps.iter().map(|pump| pump_plan(&problem, &path, *pump)));
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

/// Slots in order; neighbours that say the same are one.
#[derive(Default)]
struct Slots {
    list: Vec<Slot>,
}

impl Slots {
    fn push(
        &mut self,
        window: Window,
        setpoint: Setpoint,
        why: SlotReason,
        tide: Option<TideNumber>,
    ) {
        match self.list.last_mut() {
            Some(last) if last.setpoint == setpoint && last.why == why && last.tide == tide => {
                last.window = Window::new(last.window.start(), window.end())
                    .expect("a later end keeps a window a window");
            }
            _ => self.list.push(Slot { window, setpoint, why, tide }),
        }
    }
    /// Rest from `from` to `to`, outside every release window.
    fn rest(&mut self, problem: &Problem, from: Utc, to: Utc, rest: Setpoint) {
        let mut at = from;
        while at < to {
            let (end, why) = reasons::between(problem, at, to);
            // Whatever the reason, it moves on.
            let end = if end > at { end } else { to };
            self.push(Window::new(at, end).expect("it ends later"), rest, why, None);
            at = end;
        }
    }
}

/// An asset over the whole span: at rest between the periods, and `of` each step within.
fn asset_plan(
    problem: &Problem,
    path: &Path,
    asset: AssetId,
    rest: Setpoint,
    of: impl Fn(&Step) -> (Setpoint, SlotReason),
) -> AssetPlan {
    let span = &problem.request.span;
    let mut slots = Slots::default();
    if !problem.request.available[asset.index()] {
        slots.push(*span, rest, SlotReason::Unavailable, None);
        return AssetPlan { asset, slots: slots.list };
    }
    let mut at = span.start();
    for step in &path.steps {
        slots.rest(problem, at, step.slot.start(), rest);
        let (setpoint, why) = of(step);
        let tide = setpoint.is_active().then_some(problem.periods[step.period].tide);
        slots.push(step.slot, setpoint, why, tide);
        at = step.slot.end();
    }
    slots.rest(problem, at, span.end(), rest);
    AssetPlan { asset, slots: slots.list }
}

fn gate_plan(problem: &Problem, path: &Path, gate: AssetId) -> AssetPlan {
    asset_plan(problem, path, gate, Setpoint::Shut, |step| {
        let why = reasons::of_gate(problem, path, step);
        match step.does {
            Does::Idle(_) => (Setpoint::Shut, why),
            Does::Release { target_m3_s, bound, .. } => {
                // To a litre a second, downward: enough for any gate, and never over a cap.
                let target = (target_m3_s * 1e3).floor() / 1e3;
                let openings = openings(problem, step, target, bound);
                let target = CubicMetresPerSecond::of(target);
                (Setpoint::Release { target, openings }, why)
            }
        }
    })
}

fn pump_plan(problem: &Problem, path: &Path, pump: AssetId) -> AssetPlan {
    asset_plan(problem, path, pump, Setpoint::Stopped, |step| match step.does {
        Does::Idle(_) => (Setpoint::Stopped, reasons::of_gate(problem, path, step)),
        Does::Release { pumps, .. } => {
            let tide = problem.periods[step.period].tide;
            if problem.turn(pumps, tide).any(|p| p.asset == pump) {
                (Setpoint::Running, SlotReason::Assisting)
            } else {
                (Setpoint::Stopped, reasons::of_pump_at_rest(problem, step, tide))
            }
        }
    })
}

/// Openings at fifths of the target, at the slot's middle heads: fully open where the head gives no
/// more. With pumps the penstock opens in step with the flow, so that it throttles their start.
fn openings(problem: &Problem, step: &Step, target_m3_s: f64, bound: Bound) -> [Percent; 5] {
    let middle = step.slot.start() + step.slot.length().scaled(0.5);
    let outer_m = problem.outer_m(middle);
    let level_m = problem.storage.level_m(step.volume_middle);
    let gravity = problem.outfall.flow_m3_s(level_m, outer_m, 1.0);
    let pumping = matches!(step.does, Does::Release { pumps, .. } if pumps > 0);
    [1.0, 2.0, 3.0, 4.0, 5.0].map(|fifths| {
        if bound == Bound::Pump || (pumping && gravity <= 0.0) {
            return Percent::clamped(20.0 * fifths);
        }
        let flow = target_m3_s * fifths / 5.0;
        let share = problem.outfall.opening_for_flow(level_m, outer_m, flow);
        Percent::clamped(share.map_or(100.0, |a| (a * 1000.0).round() / 10.0))
    })
}

/// One release a stretch of flow: a pause of a slot or more makes two.
fn releases(problem: &Problem, path: &Path) -> Vec<PlannedRelease> {
    let mut list: Vec<PlannedRelease> = Vec::new();
    for s in path.steps.iter().filter(|s| s.released_m3 > 0.0) {
        let tide = problem.periods[s.period].tide;
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

/// The storage level at each instant of the 5-minute grid within the span.
fn level(problem: &Problem, path: &Path) -> Series {
    let span = problem.request.span;
    let end = Window::new(span.start(), span.end().floor_to(SLOT)).expect("a slot or more");
    Series::sampled(&end, SLOT, |t| {
        // Every instant of the grid is the end of a minute that was walked.
        let n = path.volumes.partition_point(|(at, _)| *at <= t);
        problem.storage.level_m(path.volumes[n - 1].1)
    })
    .expect("a slot or more gives two values, and volumes are finite")
}

/// Every spill, with the clauses that bound the releases before it.
fn shortfalls(problem: &Problem, path: &Path) -> Vec<Shortfall> {
    let each = path.spills.iter().filter_map(|(from, to, m3)| {
        let spill = Window::new(*from, *to).ok()?;
        Some(Shortfall {
            spill,
            volume: CubicMetres::of(*m3),
            clauses: binding(problem, path, *to),
        })
    });
    each.collect()
}

/// Clauses that kept the releases before `until` from being more: volumes that were used up, tides
/// that had none, and, where a release ran to its window's end, the window and the flow.
fn binding(problem: &Problem, path: &Path, until: Utc) -> Vec<ClauseId> {
    let mut clauses: Vec<ClauseId> = Vec::new();
    for (n, step) in path.steps.iter().enumerate().filter(|(_, s)| s.slot.start() < until) {
        let window = step.window.map(|w| &problem.windows[w]);
        match step.does {
            Does::Idle(Idle::Used(clause)) => clauses.push(clause),
            Does::Idle(_) => {}
            Does::Release { bound, .. } => {
                if let Bound::Volume(clause) = bound {
                    clauses.push(clause);
                }
                let next = path.steps.get(n + 1);
                let last = next.is_none_or(|s| s.window != step.window);
                let left = problem.periods[step.period].allotment_m3 - path.in_period(step.period);
                if let Some(w) = window.filter(|_| last && left > 1.0) {
                    clauses.extend(w.shuts_by);
                    clauses.extend(w.flow_by);
                }
            }
        }
    }
    let nil = reasons::nil_windows(&problem.request.lawful);
    let since = problem.request.span.start();
    let within = nil.iter().filter(|(w, _)| w.start() < until && w.end() > since);
    clauses.extend(within.map(|(_, clause)| *clause));
    clauses.sort_unstable();
    clauses.dedup();
    clauses
}
