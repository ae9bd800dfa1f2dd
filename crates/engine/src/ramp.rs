//! How far the gate opens: along the ramp, under every cap, towards the plan's target.
//!
//! The flow aimed at is the least of
//! * the plan's target,
//! * the licence's flow cap times the aim,
//! * what can be ramped down again in the time left to the window's end, less draining,
//! * what can be ramped down again within the volume left: `q^2 / 2r`,
//!
//! reached no faster than the ramp `r`. While the meter is good and says more than a trickle, each
//! step goes from the metered flow and the opening in proportion, so that no error of the model adds
//! up; else the opening is the plan's model of it.

use model::{AssetId, AssetKind, ClauseId, ClauseKind, EdgeAnchor, Lawful, Setpoint};
use units::{Mono, Percent, Span};

use crate::Stamp;
use crate::decide::{Decision, Goal};
use crate::state::State;

/// One step of the ramp a minute, as the clause counts it.
pub(crate) const RAMP_STEP: Span = Span::minutes(1);
/// Below this a gate that closes goes shut, m3/s: less than meters tell from nothing.
const FLOW_SHUT_M3_S: f64 = 0.03;
/// A metered flow this near to the one aimed at is left alone: each correction is a stroke.
const NEAR_ENOUGH: f64 = 0.03;
/// Towards a window's end the ramp is taken slower than it may be: orders come a little more than a
/// minute apart, and none may be left to catch up.
const END_SHARE: f64 = 0.8;
/// Share of a volume cap that is aimed at: the meter errs by a per cent or so, and the cap is on the
/// water, not on the reading.
pub(crate) const VOLUME_AIM: f64 = 0.985;
/// Above this the meter steers; below, the model.
const TRICKLE_M3_S: f64 = 0.06;

/// What the flow may do, in plain numbers.
struct Limits {
    ramp_m3_s2: f64,
    flow_m3_s: f64,
}

fn limits(state: &State, stamp: &Stamp, asset: AssetId, decision: &Decision) -> Limits {
    let settings = &state.site.settings;
    let guarded = decision.guarded.as_ref();
    let cap = guarded.and_then(|g| g.flow_max).map_or(f64::MAX, |c| c.max.get());
    let ramp_m3_s2 = ramp(state, asset, cap);
    let mut flow_m3_s = cap * settings.flow_aim;
    if let Some(left_s) = time_left_s(state, stamp, asset) {
        flow_m3_s = flow_m3_s.min(END_SHARE * ramp_m3_s2 * left_s.max(0.0));
    }
    if let Some(volume) = guarded.and_then(|g| g.volume_left) {
        let left_m3 =
            volume.max.get() - (1.0 - VOLUME_AIM) * whole_cap_m3(state, stamp, volume.clause);
        flow_m3_s = flow_m3_s.min((2.0 * ramp_m3_s2 * left_m3.max(0.0)).sqrt());
    }
    Limits { ramp_m3_s2, flow_m3_s }
}

/// The cap whose rest is counted down: the tide's own, or the clause's.
fn whole_cap_m3(state: &State, stamp: &Stamp, clause: ClauseId) -> f64 {
    match &state.site.licence.clause(clause).kind {
        ClauseKind::RollingVolume { volume_max, .. } | ClauseKind::MonthVolume { volume_max } => {
            volume_max.get()
        }
        _ => {
            let here = |l: &Lawful| l.holding(stamp.utc).and_then(|w| w.volume_max);
            let caps = state.lawful.iter().flatten().filter_map(here);
            caps.map(|c| c.max.get()).fold(0.0, f64::max)
        }
    }
}

/// The ramp aimed at, m3/s per s: the clause's, else the whole cap over one stroke.
fn ramp(state: &State, asset: AssetId, cap_m3_s: f64) -> f64 {
    let aim = state.site.settings.ramp_aim;
    let by_clause = licence::ramp_cap(&state.site, asset).map(|c| c.max.get() / 60.0);
    let stroke_s = match &state.site.asset(asset).kind {
        AssetKind::Gate(g) => g.stroke.as_seconds().max(60.0),
        AssetKind::Pump(_) => 60.0,
    };
    let by_stroke = if cap_m3_s < 1e6 { cap_m3_s / stroke_s } else { 1.0 / stroke_s };
    by_clause.unwrap_or(by_stroke) * aim
}

/// Seconds until the flow must have ended at the gate: the lawful window's end, less the margins.
fn time_left_s(state: &State, stamp: &Stamp, asset: AssetId) -> Option<f64> {
    let no = state.outlet_no(asset)?;
    let window = state.lawful[no].as_ref()?.holding(stamp.utc)?;
    let settings = &state.site.settings;
    let band = match window.shuts.anchor {
        EdgeAnchor::Modelled => window.shuts.time_sd.scaled(settings.band_sigmas),
        EdgeAnchor::Predicted | EdgeAnchor::SpanEnd => Span::ZERO,
    };
    let end = window.window.end() - settings.clock_margin - band;
    Some((end - state.site.outlets[no].drain_down - stamp.utc).as_seconds())
}

/// The opening for `flow` on the plan's curve: straight between its fifths.
fn opening_for(target_m3_s: f64, openings: &[Percent; 5], flow_m3_s: f64) -> f64 {
    let fifths = (flow_m3_s / target_m3_s.max(1e-6) * 5.0).clamp(0.0, 5.0);
    let lower = fifths.floor() as usize;
    let at = |n: usize| if n == 0 { 0.0 } else { openings[n.min(5) - 1].get() };
    at(lower) + (at(lower + 1) - at(lower)) * (fifths - lower as f64)
}

fn set(state: &mut State, asset: AssetId, goal: &Goal, flow_m3_s: f64) -> Option<Percent> {
    let Setpoint::Release { target, openings } = goal.setpoint else { return None };
    state.assets[asset.index()].flow_target = flow_m3_s;
    Some(tenth(opening_for(target.get(), &openings, flow_m3_s)))
}

/// The opening that begins a release; `None` if nothing may flow that would be worth it.
pub(crate) fn first_opening(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    goal: &Goal,
    decision: &Decision,
) -> Option<Percent> {
    let Setpoint::Release { target, openings } = goal.setpoint else { return None };
    if goal.hand {
        return Some(openings[4]);
    }
    let limits = limits(state, stamp, asset, decision);
    let from = state.assets[asset.index()].flow_target;
    let step = limits.ramp_m3_s2 * RAMP_STEP.as_seconds();
    let flow = target.get().min(limits.flow_m3_s).min(from + step);
    if flow < FLOW_SHUT_M3_S {
        return None;
    }
    set(state, asset, goal, flow).filter(|p| *p > Percent::ZERO)
}

/// The next opening of a running release, when a step is due and worth a stroke.
pub(crate) fn next_opening(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    goal: &Goal,
    decision: &Decision,
) -> Option<Percent> {
    let Setpoint::Release { target, openings } = goal.setpoint else { return None };
    let dt = since_order(state, stamp, asset)?;
    if dt < RAMP_STEP {
        return None;
    }
    let now = state.assets[asset.index()].command?.action.setting();
    if goal.hand {
        return (now != openings[4]).then_some(openings[4]);
    }
    let limits = limits(state, stamp, asset, decision);
    let step = limits.ramp_m3_s2 * RAMP_STEP.as_seconds();
    let aim = target.get().min(limits.flow_m3_s);
    let least = state.site.settings.opening_step_min.get();
    if let Some(metered) = metered_more_than_a_trickle(state, stamp, asset) {
        let flow = aim.clamp(metered - step, metered + step).max(FLOW_SHUT_M3_S);
        state.assets[asset.index()].flow_target = flow;
        if (flow / metered - 1.0).abs() <= NEAR_ENOUGH {
            return None;
        }
        let opening = tenth(now.get() * flow / metered);
        return ((opening.get() - now.get()).abs() >= least.min(now.get() / 10.0))
            .then_some(opening);
    }
    let prev = state.assets[asset.index()].flow_target;
    let flow = aim.clamp(prev - step, prev + step);
    if flow < FLOW_SHUT_M3_S && flow < prev && prev <= step {
        return Some(Percent::ZERO);
    }
    let opening = set(state, asset, goal, flow.max(FLOW_SHUT_M3_S))?;
    ((opening.get() - now.get()).abs() >= least.min(0.5)).then_some(opening)
}

/// The metered flow, where it says enough to steer by.
fn metered_more_than_a_trickle(state: &State, stamp: &Stamp, asset: AssetId) -> Option<f64> {
    let outlet = state.site.outlet_of(asset)?;
    state.metered_flow(outlet, stamp.utc).filter(|m| *m > TRICKLE_M3_S)
}

/// Openings are told to a tenth of a per cent.
fn tenth(percent: f64) -> Percent {
    Percent::clamped((percent * 10.0).round() / 10.0)
}

fn since_order(state: &State, stamp: &Stamp, asset: AssetId) -> Option<Span> {
    state.assets[asset.index()].last_move.map(|t| stamp.boot.since(t))
}

/// One step of a closing along the ramp.
pub(crate) enum Closing {
    Shut,
    To(Percent),
    NotYet,
}

/// Closing when nothing but the plan or a volume ends the release: the opening shrinks in
/// proportion to the flow, a step a minute.
pub(crate) fn closing_step(state: &mut State, stamp: &Stamp, asset: AssetId) -> Closing {
    let metered = metered_more_than_a_trickle(state, stamp, asset);
    let flow = metered.unwrap_or(state.assets[asset.index()].flow_target);
    let Some(command) = state.assets[asset.index()].command else { return Closing::Shut };
    let step = ramp(state, asset, f64::MAX) * RAMP_STEP.as_seconds();
    if flow <= step {
        return Closing::Shut;
    }
    if since_order(state, stamp, asset).is_some_and(|dt| dt < RAMP_STEP) {
        return Closing::NotYet;
    }
    let next = (flow - step).max(FLOW_SHUT_M3_S);
    state.assets[asset.index()].flow_target = next;
    let opening = command.action.setting().get() * next / flow;
    Closing::To(tenth(opening))
}

/// When the next step of a running release is due.
pub(crate) fn due(state: &State, asset: AssetId) -> Option<Mono> {
    state.active(asset).then_some(())?;
    state.assets[asset.index()].last_move.map(|t| t + RAMP_STEP)
}
