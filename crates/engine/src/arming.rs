//! Armed: computed at every step, with all the reasons when it is not.

use interlock::ClockTrust;

use crate::state::State;
use crate::{Effects, Entry, Mode, Notice, Severity, Stamp};

pub(crate) fn review(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    let reasons = reasons_against(state, stamp);
    let armed = reasons.is_empty();
    if state.armed != Some(armed) || (!armed && reasons != state.armed_reasons) {
        if state.armed != Some(armed) {
            effects.records.push(Entry::Armed { armed, reasons: reasons.clone() });
        }
        state.armed = Some(armed);
        state.armed_reasons = reasons;
    }
    expire(state, stamp, effects);
    if armed && state.safe_latch.is_none() {
        resume(state, stamp, effects);
    }
}

fn reasons_against(state: &State, stamp: &Stamp) -> Vec<String> {
    let mut reasons = Vec::new();
    if let Some((_, why)) = &state.journal_lost {
        reasons.push(format!("the journal is lost: {why}"));
    }
    if stamp.trust == ClockTrust::Distrusted {
        reasons.push("the clock is not trusted".to_owned());
    }
    if let Err(case) = state.self_test {
        reasons.push(format!("the interlock's self-test failed: {case}"));
    }
    if !state.site.port.valid.contains(stamp.utc) {
        reasons.push(format!("the tide constants hold for {} only", state.site.port.valid));
    }
    for adapter in &state.site.adapters {
        if !state.adapters_up[adapter.id.index()] {
            reasons.push(format!("adapter {} is down", adapter.name));
        }
    }
    for asset in &state.site.assets {
        if state.position(asset.id, stamp.boot).is_none() {
            reasons.push(format!("the position of {} is not read back", asset.name));
        }
    }
    for outlet in &state.site.outlets {
        let storage = state.site.storage(outlet.storage);
        if state.storage_level(outlet, stamp.utc).is_none() {
            reasons.push(format!("no good level of {}", storage.name));
        }
        if let Some(s) = outlet.outer_signal
            && state.validator.state(s, stamp.utc).now().is_none()
        {
            let words = state.validator.state(s, stamp.utc).quality.words();
            reasons.push(format!("{} is {words}", state.site.signal(s).name));
        }
    }
    reasons
}

/// Holds, hands and authorisations end by themselves.
fn expire(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    let now = stamp.utc;
    for asset in &mut state.assets {
        asset.hold_until = asset.hold_until.filter(|until| now < *until);
        asset.hand = asset.hand.filter(|(_, until)| now < *until);
    }
    if state.authorisation.as_ref().is_some_and(|a| a.until <= now) {
        state.authorisation = None;
        let text = "the standing authorisation has ended".to_owned();
        effects.notices.push(Notice { severity: Severity::Info, text });
    }
}

fn resume(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    let Some(auth) = state.resume.take() else { return };
    if auth.until <= stamp.utc || state.assets.iter().any(|a| a.tripped.is_some()) {
        return;
    }
    state.mode = Mode::Automatic;
    let why = format!("standing authorisation by {}: {}", auth.by, auth.reason);
    effects.records.push(Entry::ModeChanged { mode: Mode::Automatic, why });
}
