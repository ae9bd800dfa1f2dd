//! What leaves an outlet, summed by 5-minute buckets of UTC, whoever let it out; and the lawful
//! minutes in which nothing did.

use model::{AssetId, Outlet};
use units::{CubicMetres, Span, Utc, Window};

use crate::decide::Decision;
use crate::state::{State, Unused};
use crate::{Effects, Entry, Stamp};

pub(crate) const BUCKET: Span = Span::minutes(5);
/// Pieces older than this are of no interest to an averaging clause.
const RECENT: Span = Span::hours(1);
/// Over a longer silence than this the greater of the flows before and after it is taken.
const SILENCE: Span = Span::minutes(2);
/// Less than this in a bucket is the meter's noise, not water.
const VOLUME_LEAST_M3: f64 = 0.5;

pub(crate) fn run(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    for no in 0..state.meters.len() {
        let site = state.site.clone();
        let outlet = &site.outlets[no];
        let (flow, estimated) = flow_now(state, outlet, stamp);
        let now = stamp.utc;
        let meter = &mut state.meters[no];
        let from = meter.last.replace(now).unwrap_or(now);
        let before = core::mem::replace(&mut meter.last_flow, flow);
        if let Ok(piece) = Window::new(from, now) {
            let flow = if piece.length() > SILENCE { flow.max(before) } else { flow };
            add(state, no, piece, flow, estimated, effects);
        }
        close_bucket(state, no, now, effects);
        end_idle(state, no, stamp, effects);
    }
}

/// The metered flow, or the full flow aimed at while the meter is not good.
fn flow_now(state: &State, outlet: &Outlet, stamp: &Stamp) -> (f64, bool) {
    match state.metered_flow(outlet, stamp.utc) {
        Some(q) => (q, false),
        None => {
            let unseen = state.assets[outlet.gate.index()].unseen_until;
            let open = match state.position(outlet.gate, stamp.boot) {
                Some(percent) => percent > 2.5 || state.active(outlet.gate),
                None => state.active(outlet.gate) || unseen.is_some_and(|t| stamp.boot < t),
            };
            let cap = licence::flow_cap(&state.site, outlet.gate).map_or(0.0, |c| c.max.get());
            (if open { cap } else { 0.0 }, true)
        }
    }
}

fn add(
    state: &mut State,
    no: usize,
    piece: Window,
    flow_m3_s: f64,
    estimated: bool,
    effects: &mut Effects,
) {
    let mut from = piece.start();
    while from < piece.end() {
        let start = from.floor_to(BUCKET);
        // Flow belongs to its instant: a piece across low water is split between the tides.
        let turn = state.forecast.as_deref().and_then(|f| f.tide_at(from)).map(|t| t.window.end());
        let to = piece.end().min(start + BUCKET).min(turn.unwrap_or(piece.end()));
        let bucket = Window::new(start, start + BUCKET).expect("a bucket is not empty");
        if state.meters[no].bucket != Some(bucket) {
            close_bucket(state, no, from, effects);
            state.meters[no].bucket = Some(bucket);
        }
        let volume = flow_m3_s * (to - from).as_seconds();
        let meter = &mut state.meters[no];
        meter.volume += volume;
        meter.estimated |= estimated && volume > 0.0;
        // The sums know of it at once; the record gets the bucket when it is whole.
        let moment = Window::new(from, to).expect("a piece is not empty");
        if volume > 0.0 {
            let tide = tide_at(state, from);
            state.tallies.add(moment, CubicMetres::of(volume), tide);
        }
        from = to;
    }
    let meter = &mut state.meters[no];
    meter.recent.push((piece, flow_m3_s));
    let oldest = piece.end() - RECENT;
    meter.recent.retain(|(w, _)| w.end() > oldest);
}

fn tide_at(state: &State, t: Utc) -> model::TideNumber {
    let forecast = state.forecast.as_deref();
    let tide = forecast.and_then(|f| f.tide_at(t)).map(|t| t.number);
    tide.or_else(|| state.tallies.last_tide()).unwrap_or(0)
}

fn close_bucket(state: &mut State, no: usize, now: Utc, effects: &mut Effects) {
    let Some(bucket) = state.meters[no].bucket.filter(|b| b.end() <= now) else { return };
    let meter = &mut state.meters[no];
    let volume = CubicMetres::of(meter.volume);
    let estimated = meter.estimated;
    (meter.bucket, meter.volume, meter.estimated) = (None, 0.0, false);
    if volume.get() >= VOLUME_LEAST_M3 {
        let tide = tide_at(state, bucket.start());
        effects.records.push(Entry::Released { tide, bucket, volume, estimated });
    }
}

/// Counts lawful time in which the gate stays shut, with the first cause that kept it so.
pub(crate) fn note_idle(
    state: &mut State,
    stamp: &Stamp,
    no: usize,
    asset: AssetId,
    decision: &Decision,
) {
    if state.site.outlets[no].gate != asset {
        return;
    }
    let Some(lawful) = state.lawful[no].as_ref().and_then(|l| l.holding(stamp.utc)) else {
        return;
    };
    let (window, tide) = (lawful.window, lawful.tide);
    let meter = &mut state.meters[no];
    if meter.unused.as_ref().is_none_or(|u| u.window != window) {
        meter.unused = Some(Unused { window, tide, idle: Span::ZERO, cause: None });
    }
    let piece = meter.recent.last().map_or(Span::ZERO, |(w, _)| w.length());
    if let (Some(unused), false) = (&mut meter.unused, decision.active()) {
        unused.idle += piece;
        if unused.cause.is_none() {
            unused.cause = decision.causes.iter().find(|c| c.by != model::By::Plan).cloned();
        }
    }
}

/// A window that ended with something other than the plan having kept it shut is written down.
fn end_idle(state: &mut State, no: usize, stamp: &Stamp, effects: &mut Effects) {
    let ended = |u: &mut Unused| u.window.end() <= stamp.utc;
    let Some(unused) = state.meters[no].unused.take_if(ended) else { return };
    let Some(cause) = unused.cause else { return };
    if unused.idle < unused.window.length().scaled(0.5)
        || state.released_this_tide(unused.tide).get() > VOLUME_LEAST_M3
    {
        return;
    }
    let cause = crate::words::cause(&state.site, &cause);
    effects.records.push(Entry::WindowMissed { tide: unused.tide, window: unused.window, cause });
}
