//! Armed: computed at every step, with all the reasons when it is not.

use interlock::ClockTrust;
use model::About;

use crate::state::State;
use crate::{Effects, Entry, Mode, Notice, Severity, Stamp};

pub(crate) fn review(state: &mut State, stamp: &Stamp, effects: &mut Effects) {
    let reasons = reasons_against(state, stamp);
    let armed = reasons.is_empty();
    let news = state.armed != Some(armed);
    (state.armed, state.armed_reasons) = (Some(armed), reasons);
    if news {
        let reasons = state.armed_words();
        effects.records.push(Entry::Armed { armed, reasons });
    }
    expire(state, stamp, effects);
    if armed && state.safe_latch.is_none() {
        resume(state, stamp, effects);
    }
}

fn reasons_against(state: &State, stamp: &Stamp) -> Vec<(About, String)> {
    let mut reasons = Vec::new();
    if let Some((_, why)) = &state.journal_lost {
        reasons.push((About::Journal, format!("the journal is lost: {why}")));
    }
    if stamp.trust == ClockTrust::Distrusted {
        reasons.push((About::ClockTrust, "the clock is not trusted".to_owned()));
    }
    if let Err(case) = state.self_test {
        reasons.push((About::Latch, format!("the interlock's self-test failed: {case}")));
    }
    if !state.site.port.valid.contains(stamp.utc) {
        let words = format!("the tide constants hold for {} only", state.site.port.valid);
        reasons.push((About::Forecast, words));
    }
    for adapter in &state.site.adapters {
        if !state.adapters_up[adapter.id.index()] {
            let words = format!("adapter {} is down", adapter.name);
            reasons.push((About::Adapter(adapter.id), words));
        }
    }
    for asset in &state.site.assets {
        if state.position(asset.id, stamp.boot).is_none() {
            let words = format!("the position of {} is not read back", asset.name);
            reasons.push((About::Signal(asset.position), words));
        }
    }
    for outlet in &state.site.outlets {
        let storage = state.site.storage(outlet.storage);
        if state.storage_level(outlet, stamp.utc).is_none() {
            let first = storage.level_signals.first().copied();
            let about = first.map_or(About::Latch, About::Signal);
            reasons.push((about, format!("no good level of {}", storage.name)));
        }
        if let Some(s) = outlet.outer_signal
            && state.validator.state(s, stamp.utc).now().is_none()
        {
            let words = state.validator.state(s, stamp.utc).quality.words();
            let words = format!("{} is {words}", state.site.signal(s).name);
            reasons.push((About::Signal(s), words));
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
