//! People's acts: accepted whole or refused with the reason, and kept either way.

use model::AssetId;

use crate::decide;
use crate::state::State;
use crate::{Act, ActKind, Effects, Entry, Mode, Stamp, StandingAuthorisation, drive};

pub(crate) fn take(state: &mut State, stamp: &Stamp, act: Act, effects: &mut Effects) {
    let answer = check(&act).and_then(|()| apply(state, stamp, &act, effects));
    let refused = answer.as_ref().err().cloned();
    effects.answer = Some(answer);
    // The act itself comes before what it brings about.
    effects.records.insert(0, Entry::Act { act, refused });
}

fn check(act: &Act) -> Result<(), String> {
    if act.by.trim().is_empty() {
        return Err("who acts must be named: --by NAME".to_owned());
    }
    if act.reason.trim().is_empty() {
        return Err("an act needs its reason: --reason TEXT".to_owned());
    }
    Ok(())
}

fn apply(
    state: &mut State,
    stamp: &Stamp,
    act: &Act,
    effects: &mut Effects,
) -> Result<String, String> {
    let name = |state: &State, a: AssetId| state.site.asset(a).name.clone();
    match &act.kind {
        ActKind::Mode(mode) => set_mode(state, *mode, act, effects),
        ActKind::Authorise { until } => {
            if *until <= stamp.utc {
                return Err(format!("{until} is past; an authorisation must end in the future"));
            }
            state.authorisation = Some(StandingAuthorisation {
                by: act.by.clone(),
                reason: act.reason.clone(),
                until: *until,
                build: state.config.build.clone(),
                site_digest: state.site.site_digest.clone(),
                licence_digest: state.site.licence_digest.clone(),
            });
            Ok(format!("automatic may resume by itself after a restart until {until}"))
        }
        ActKind::Confirm { asset } => confirm(state, stamp, *asset),
        ActKind::Hold { asset, until } => {
            if *until <= stamp.utc {
                return Err(format!("{until} is past; a hold must end in the future"));
            }
            state.assets[asset.index()].hold_until = Some(*until);
            state.want_plan();
            Ok(format!("{} is held at rest until {until}", name(state, *asset)))
        }
        ActKind::Hand { asset, setting, until } => {
            if *until <= stamp.utc {
                return Err(format!("{until} is past; hand must end in the future"));
            }
            state.assets[asset.index()].hand = Some((*setting, *until));
            state.want_plan();
            Ok(format!("{} is in hand at {setting:.0} until {until}", name(state, *asset)))
        }
        ActKind::Auto { asset } => {
            let a = &mut state.assets[asset.index()];
            (a.hand, a.hold_until) = (None, None);
            state.want_plan();
            Ok(format!("{} is given back to the program", name(state, *asset)))
        }
        ActKind::OutOfService { asset, locked } => lock(state, act, *asset, *locked),
        ActKind::Reset { asset } => reset(state, stamp, *asset, effects),
        ActKind::Rest { asset } => {
            let all: Vec<AssetId> = match asset {
                Some(a) => vec![*a],
                None => state.site.assets.iter().map(|a| a.id).collect(),
            };
            for a in all {
                drive::rest(state, stamp, a, &format!("ordered by {}", act.by), effects);
                // Without this the program would start it again at once.
                state.assets[a.index()].hold_until = Some(stamp.utc + units::Span::hours(1));
            }
            state.want_plan();
            Ok("sent to rest, and held there for one hour; `order auto` ends it".to_owned())
        }
        ActKind::TrustClock => {
            Ok("the clock is vouched for; the daemon takes it as trusted from now".to_owned())
        }
    }
}

fn set_mode(
    state: &mut State,
    mode: Mode,
    act: &Act,
    effects: &mut Effects,
) -> Result<String, String> {
    if mode != Mode::Observe
        && let Some(latch) = &state.safe_latch
    {
        return Err(format!("the safe latch is set ({latch}); reset it first"));
    }
    state.resume = None;
    state.mode = mode;
    let why = format!("{}: {}", act.by, act.reason);
    effects.records.push(Entry::ModeChanged { mode, why });
    let not_yet = match state.armed {
        Some(true) => String::new(),
        _ => format!("; not armed yet: {}", state.armed_words().join("; ")),
    };
    Ok(format!("mode is {}{not_yet}", mode.words()))
}

fn confirm(state: &mut State, stamp: &Stamp, asset: AssetId) -> Result<String, String> {
    let outlet = state.outlet_no(asset).ok_or("this asset has no plan to confirm")?;
    let plan = state.plans[outlet].as_ref().ok_or("there is no plan yet to confirm")?;
    let next = plan.releases.iter().find(|r| r.window.end() > stamp.utc);
    let release = next.ok_or("the plan has no release ahead to confirm")?;
    let (tide, window) = (release.tide, release.window);
    let outlet = &state.site.outlets[outlet];
    for a in core::iter::once(&outlet.gate).chain(&outlet.pumps) {
        state.assets[a.index()].confirmed_tide = Some(tide);
    }
    Ok(format!("the release of tide {tide} is confirmed: {window}"))
}

fn lock(state: &mut State, act: &Act, asset: AssetId, locked: bool) -> Result<String, String> {
    let name = state.site.asset(asset).name.clone();
    let slot = &mut state.assets[asset.index()];
    match (&slot.locked_by, locked) {
        (Some(holder), _) if *holder != act.by => {
            Err(format!("{name} is locked out by {holder}; only {holder} clears that lock"))
        }
        (None, false) => Err(format!("{name} is not locked out")),
        (_, true) => {
            slot.locked_by = Some(act.by.clone());
            state.want_plan();
            Ok(format!("{name} is out of service, locked by {}", act.by))
        }
        (Some(_), false) => {
            slot.locked_by = None;
            state.want_plan();
            Ok(format!("{name} is back in service"))
        }
    }
}

/// A reset never restarts by itself, and is refused while its cause is there.
fn reset(
    state: &mut State,
    stamp: &Stamp,
    asset: Option<AssetId>,
    effects: &mut Effects,
) -> Result<String, String> {
    let Some(asset) = asset else {
        if state.safe_latch.take().is_none() {
            return Err("the safe latch is not set".to_owned());
        }
        effects.records.push(Entry::Reset { asset: None });
        state.mode = Mode::Observe;
        return Ok("the safe latch is reset; the mode is observe".to_owned());
    };
    let name = state.site.asset(asset).name.clone();
    if state.assets[asset.index()].tripped.is_none() {
        return Err(format!("{name} is not tripped"));
    }
    if !decide::at_rest(state, asset, stamp.boot) {
        let found = state.position(asset, stamp.boot);
        let found = found.map_or("not read".to_owned(), |p| format!("{p:.0} %"));
        return Err(format!("{name} is not at rest (position {found}); see to the plant first"));
    }
    state.assets[asset.index()].tripped = None;
    effects.records.push(Entry::Reset { asset: Some(asset) });
    state.want_plan();
    Ok(format!("{name} is reset; it moves again when the plan next says so"))
}
