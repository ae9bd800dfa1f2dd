//! The step: one event in, effects out.
//!
//! ```text
//!   event ──► taken in ──► metered ──► each asset: decided ──► driven ──► armed? ──► jobs ──► wake
//!             (frame,       (flow into   (causes against     (order, renew,
//!              act, job,     buckets)     moving, or none)    rest, confirm)
//!              outcome...)
//! ```

use model::{AssetId, Reading};
use units::{Mono, Span};

use crate::state::{Phase, RawSlot, State};
use crate::{Effects, Entry, Event, Notice, Outcome, Product, Severity, Stamp};
use crate::{acts, arming, decide, drive, meter, schedule, start};

/// Takes one event in and says, in `effects`, all that follows. `effects` is cleared first.
pub fn step(state: &mut State, stamp: &Stamp, event: Event, effects: &mut Effects) {
    effects.clear();
    state.term = stamp.term;
    state.trust = stamp.trust;
    match event {
        Event::Started(carried) => start::begin(state, stamp, *carried, effects),
        Event::Frame(readings) => frame(state, stamp, &readings),
        Event::AdapterUp(adapter) => {
            state.adapters_up[adapter.index()] = true;
            state.want_plan();
            let adapter = state.site.adapters[adapter.index()].name.clone();
            effects.records.push(Entry::AdapterUp { adapter });
        }
        Event::AdapterDown { adapter, why } => adapter_down(state, stamp, adapter, why, effects),
        Event::Outcome { command, outcome } => outcome_of(state, command, outcome, effects),
        Event::Act(act) => acts::take(state, stamp, act, effects),
        Event::JobDone { job, product } => {
            product_of(state, job, product, effects);
        }
        Event::JournalLost { why } => {
            let text = format!("the journal is lost: {why}; nothing new starts");
            effects.notices.push(Notice { severity: Severity::Alarm, text });
            state.journal_lost = Some((stamp.boot, why));
        }
        Event::JournalBack => state.journal_lost = None,
        Event::ClockChanged { why } => {
            effects.records.push(Entry::Clock { trust: stamp.trust, why });
        }
        Event::Stopping { why } => {
            drive::stop_all(state, stamp, &why, effects);
            effects.records.push(Entry::Stopping { why });
            return;
        }
        Event::Replan => state.want_plan(),
        Event::Wake => {}
    }
    review(state, stamp, effects);
}

/// What follows from the state as it now is.
fn review(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    meter::run(state, stamp, effects);
    arming::review(state, stamp, effects);
    for outlet in 0..state.site.outlets.len() {
        // The gate first: a pump needs its way.
        let assets: Vec<AssetId> = {
            let o = &state.site.outlets[outlet];
            core::iter::once(o.gate).chain(o.pumps.iter().copied()).collect()
        };
        for asset in assets {
            drive::watch(state, stamp, asset, effects);
            let decision = decide::decide(state, stamp, asset);
            meter::note_idle(state, stamp, outlet, asset, &decision);
            drive::carry_out(state, stamp, asset, decision, effects);
        }
    }
    schedule::jobs(state, stamp, effects);
    effects.wake_at = Some(schedule::wake_at(state, stamp));
}

fn frame(state: &mut State, stamp: &Stamp, readings: &[Reading]) {
    for r in readings {
        state.validator.take(r, stamp.utc);
        let slot = &mut state.raw[r.signal.index()];
        // Out of order or repeated: the younger one stands.
        if slot.is_some_and(|s| s.at >= r.at) || r.at > stamp.utc + Span::seconds(5) {
            continue;
        }
        let boot = stamp.boot + (r.at - stamp.utc);
        let same = slot.filter(|s| s.value.to_bits() == r.value.to_bits());
        let changed = same.map_or(boot, |s| s.changed);
        let value = if r.source_good { r.value } else { f64::NAN };
        *slot = Some(RawSlot { value, at: r.at, boot, changed });
    }
}

fn adapter_down(
    state: &mut State,
    stamp: &Stamp,
    adapter: model::AdapterId,
    why: String,
    effects: &mut Effects,
) {
    state.adapters_up[adapter.index()] = false;
    // Its points are bad the moment it is gone, and what it was told is unknown.
    for signal in state.site.signals.iter().filter(|s| s.adapter == adapter) {
        state.raw[signal.id.index()] = None;
        let gone = Reading { signal: signal.id, value: 0.0, source_good: false, at: stamp.utc };
        state.validator.take(&gone, stamp.utc);
    }
    let lost: Vec<AssetId> =
        state.site.assets.iter().filter(|a| a.adapter == adapter).map(|a| a.id).collect();
    for asset in lost {
        drive::lose_sight(state, asset, &why, effects);
    }
    let adapter = state.site.adapters[adapter.index()].name.clone();
    effects.records.push(Entry::AdapterDown { adapter, why });
}

fn outcome_of(state: &mut State, command: u64, outcome: Outcome, effects: &mut Effects) {
    let found = state.assets.iter().position(|a| a.command.is_some_and(|c| c.id == command));
    // An answer to a command that has been replaced is information, nothing more.
    let Some(index) = found else { return };
    let asset = state.site.assets[index].id;
    let slot = &mut state.assets[index];
    match &outcome {
        Outcome::Accepted => {
            if let Some(c) = slot.command.as_mut().filter(|c| c.phase == Phase::Sent) {
                c.phase = Phase::Accepted;
            }
        }
        Outcome::Refused(why) => {
            effects.notices.push(Notice {
                severity: Severity::Warning,
                text: format!("{} refused its command: {why}", state.site.asset(asset).name),
            });
            slot.command = None;
            slot.flow_target = 0.0;
        }
        Outcome::Unknown(_) => {
            if let Some(c) = &mut slot.command {
                c.phase = Phase::Unknown;
            }
        }
    }
    effects.records.push(Entry::Outcome { asset, command, outcome });
}

fn product_of(state: &mut State, job: model::JobId, product: Product, effects: &mut Effects) {
    match product {
        Product::Forecast(f) if state.jobs.forecast == Some(job) => {
            schedule::adopt_forecast(state, *f);
        }
        Product::Plan(p) if state.jobs.plan.is_some_and(|(_, j)| j == job) => {
            schedule::adopt_plan(state, *p, effects);
        }
        Product::Failed(why) => {
            if state.jobs.forecast == Some(job) {
                state.jobs.forecast = None;
            }
            if state.jobs.plan.is_some_and(|(_, j)| j == job) {
                state.jobs.plan = None;
            }
            let text = format!("a job failed: {why}");
            effects.notices.push(Notice { severity: Severity::Warning, text });
        }
        // Not wanted any more.
        Product::Forecast(_) | Product::Plan(_) => {}
    }
}

impl State {
    /// A signal's last reading with its ages by the boot clock, for the interlock's own checks.
    pub(crate) fn raw_of(&self, signal: model::SignalId, boot: Mono) -> Option<interlock::Raw> {
        let slot = self.raw[signal.index()]?;
        let spec = self.site.signal(signal);
        Some(interlock::Raw {
            value: slot.value,
            age: boot.since(slot.boot),
            unchanged_for: slot.boot.since(slot.changed),
            bounds: interlock::Bounds {
                min: spec.value_min,
                max: spec.value_max,
                age_max: spec.age_max,
                frozen_after: spec.frozen_after,
            },
        })
    }
}
