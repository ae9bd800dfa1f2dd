//! How far the gate opens: along the ramp, under every cap, towards the plan's target.
//!
//! The flow aimed at is the least of
//! * the plan's target,
//! * the licence's flow cap times the aim,
//! * what can be ramped down again in the time left to the window's end, less draining,
//! * what can be ramped down again within the volume left: `q^2 / 2r`,
//!
//! reached no faster than the ramp `r`. The opening for a flow is the plan's model of it, corrected
//! by a trim that the meter teaches.

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
const NEAR_ENOUGH: f64 = 0.04;
/// Towards a window's end the ramp is taken slower than it may be: orders come a little more than a
/// minute apart, and none may be left to catch up.
const END_SHARE: f64 = 0.8;
/// Share of a volume cap that is aimed at: the meter errs by a per cent or so, and the cap is on the
/// water, not on the reading.
pub(crate) const VOLUME_AIM: f64 = 0.985;
/// The trim stays within a factor that no honest model misses by.
const TRIM_LEAST: f64 = 0.6;
const TRIM_MOST: f64 = 1.6;

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
    let slot = &mut state.assets[asset.index()];
    slot.flow_target = flow_m3_s;
    let opening = opening_for(target.get(), &openings, flow_m3_s) * slot.trim;
    Some(Percent::clamped((opening * 10.0).round() / 10.0))
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
    state.assets[asset.index()].trim = 1.0;
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
    let prev = state.assets[asset.index()].flow_target;
    let step = limits.ramp_m3_s2 * RAMP_STEP.as_seconds();
    let flow = target.get().min(limits.flow_m3_s).clamp(prev - step, prev + step);
    if flow < FLOW_SHUT_M3_S && flow < prev && prev <= step {
        return Some(Percent::ZERO);
    }
    let flow = flow.max(FLOW_SHUT_M3_S);
    // What the ramp leaves of this step is the trim's: both together stay within it.
    let room = (step - (flow - prev).abs()).max(0.0) / prev.max(1e-6);
    learn_trim(state, stamp, asset, (target.get(), &openings), room);
    if (flow - prev).abs() < NEAR_ENOUGH * prev / 2.0 && near_enough(state, stamp, asset) {
        return None;
    }
    let opening = set(state, asset, goal, flow)?;
    let least = state.site.settings.opening_step_min.get();
    ((opening.get() - now.get()).abs() >= least).then_some(opening)
}

fn since_order(state: &State, stamp: &Stamp, asset: AssetId) -> Option<Span> {
    state.assets[asset.index()].last_move.map(|t| stamp.boot.since(t))
}

fn near_enough(state: &State, stamp: &Stamp, asset: AssetId) -> bool {
    let aimed = state.assets[asset.index()].flow_target;
    let outlet = state.site.outlet_of(asset);
    let metered = outlet.and_then(|o| state.metered_flow(o, stamp.utc));
    metered.is_some_and(|m| (m / aimed.max(1e-6) - 1.0).abs() <= NEAR_ENOUGH)
}

/// Where a good meter differs from the flow aimed at, the model's opening is corrected, a little at
/// a time. A gate that is fully open says nothing about the model.
fn learn_trim(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    (target_m3_s, openings): (f64, &[Percent; 5]),
    room: f64,
) {
    let Some(outlet) = state.site.outlet_of(asset) else { return };
    let Some(metered) = state.metered_flow(outlet, stamp.utc) else { return };
    let slot = &state.assets[asset.index()];
    let aimed = slot.flow_target;
    let full = opening_for(target_m3_s, openings, aimed) * slot.trim >= 99.0;
    if aimed < 0.1
        || metered < 0.05
        || (full && metered <= aimed)
        || (metered / aimed - 1.0).abs() <= NEAR_ENOUGH
    {
        return;
    }
    let ratio = (aimed / metered).clamp(1.0 - room, 1.0 + room);
    let trim = (slot.trim * ratio).clamp(TRIM_LEAST, TRIM_MOST);
    state.assets[asset.index()].trim = trim;
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
    let flow = state.assets[asset.index()].flow_target;
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
    Closing::To(Percent::clamped((opening * 10.0).round() / 10.0))
}

/// When the next step of a running release is due.
pub(crate) fn due(state: &State, asset: AssetId) -> Option<Mono> {
    state.active(asset).then_some(())?;
    state.assets[asset.index()].last_move.map(|t| t + RAMP_STEP)
}
