//! Carrying a decision out: orders, renewals and rests, and watching what comes of them.

use interlock::{Action, Renewed, Travel, Verdict};
use model::{AssetId, AssetKind, RestAction, Setpoint};
use units::{Mono, Percent, Span};

use crate::decide::{self, Decision, Goal};
use crate::ramp;
use crate::state::{Command, Phase, State};
use crate::{Effects, Entry, Notice, Order, Outcome, RestOrder, Severity, Stamp};

/// A confirmed position that strays further than this has been moved by something else.
const DRIFT_PERCENT: f64 = 6.0;

/// Looks at feedback for the asset's command: done, under way, late, or undone by the plant.
pub(crate) fn watch(state: &mut State, stamp: &Stamp, asset: AssetId, effects: &mut Effects) {
    let Some(command) = state.assets[asset.index()].command else { return };
    let to = command.action.setting();
    let position = state.position(asset, stamp.boot);
    if command.phase == Phase::Confirmed {
        strayed(state, stamp, asset, command, position, effects);
        return;
    }
    let (stroke, factor) = match &state.site.asset(asset).kind {
        AssetKind::Gate(g) => (g.stroke, g.travel_factor),
        AssetKind::Pump(p) => (p.start_timeout, 1.0),
    };
    let since = stamp.boot.since(command.sent);
    match interlock::travel(stroke, factor, command.from, to, since, position) {
        Travel::Moving => {}
        Travel::Arrived => {
            let found = position.unwrap_or(to.get());
            effects.records.push(Entry::Confirmed { asset, command: command.id, position: found });
            let done = Command { phase: Phase::Confirmed, ..command };
            let slot = &mut state.assets[asset.index()];
            slot.command = command.action.is_active().then_some(done);
            if !command.action.is_active() {
                slot.last_stop = Some(stamp.boot);
                slot.assisted_since = None;
            }
        }
        Travel::Late => discrepancy(state, stamp, asset, command, position, effects),
    }
}

fn strayed(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    command: Command,
    position: Option<f64>,
    effects: &mut Effects,
) {
    let to = command.action.setting().get();
    let Some(p) = position else { return };
    if (p - to).abs() <= DRIFT_PERCENT {
        return;
    }
    if stamp.boot >= command.lease_end {
        let cause = "its lease ran out and it went to rest by itself".to_owned();
        let action = state.site.asset(asset).rest.lease_out;
        effects.records.push(Entry::Rest { asset, action, cause });
        forget(state, asset);
    } else {
        discrepancy(state, stamp, asset, command, position, effects);
    }
}

fn forget(state: &mut State, asset: AssetId) {
    let slot = &mut state.assets[asset.index()];
    slot.command = None;
    slot.flow_target = 0.0;
    slot.assisted_since = None;
}

/// Its adapter is gone: nothing can be told and nothing is seen. Its lease runs out and it rests by
/// itself; if the adapter is back before that, what it does is adopted.
pub(crate) fn lose_sight(state: &mut State, asset: AssetId, why: &str, effects: &mut Effects) {
    let Some(command) = state.assets[asset.index()].command else { return };
    let spec = state.site.asset(asset);
    let stroke = match &spec.kind {
        AssetKind::Gate(g) => g.stroke,
        AssetKind::Pump(p) => p.start_timeout,
    };
    let drained = state.site.outlet_of(asset).map_or(Span::ZERO, |o| o.drain_down);
    let outcome = Outcome::Unknown(why.to_owned());
    effects.records.push(Entry::Outcome { asset, command: command.id, outcome });
    forget(state, asset);
    let slot = &mut state.assets[asset.index()];
    slot.carried = Some(command.action).filter(|a| a.is_active());
    slot.unseen_until = Some(command.lease_end + stroke + drained);
}

/// Feedback does not fit: the asset is tripped, sent to rest, and waits for a person.
fn discrepancy(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    command: Command,
    found: Option<f64>,
    effects: &mut Effects,
) {
    let wanted = command.action.setting().get();
    let name = state.site.asset(asset).name.clone();
    let at = found.map_or("not read".to_owned(), |p| format!("{p:.0} %"));
    let why = format!("told {wanted:.0} %, found {at}");
    effects.records.push(Entry::Discrepancy { asset, command: command.id, wanted, found });
    effects.records.push(Entry::Latched { asset: Some(asset), cause: why.clone() });
    let text = format!("{name} does not follow: {why}. It is tripped: see to it, then reset it");
    effects.notices.push(Notice { severity: Severity::Alarm, text });
    state.assets[asset.index()].tripped = Some(why);
    state.want_plan();
    rest(state, stamp, asset, "position discrepancy", effects);
    // Tripped already: its way to rest is not judged a second time.
    forget(state, asset);
}

/// Makes the asset do what was decided, and writes a change of decision down.
pub(crate) fn carry_out(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    decision: Decision,
    effects: &mut Effects,
) {
    note(state, asset, &decision, effects);
    let active = state.active(asset);
    match (active, decision.goal.filter(|_| decision.active())) {
        (false, Some(goal)) => start(state, stamp, asset, &goal, &decision, effects),
        (true, Some(goal)) => go_on(state, stamp, asset, &goal, &decision, effects),
        (true, None) if decision.soft() => wind_down(state, stamp, asset, effects),
        (true, None) => stop_short(state, stamp, asset, &decision, effects),
        (false, None) => {}
    }
}

fn note(state: &mut State, asset: AssetId, decision: &Decision, effects: &mut Effects) {
    let mut signature: Vec<_> = decision.causes.iter().map(|c| (c.by, c.fact.about)).collect();
    signature.sort_unstable();
    let decided = Some((decision.active(), signature));
    if state.assets[asset.index()].decided == decided {
        return;
    }
    state.assets[asset.index()].decided = decided;
    let action = match (&state.site.asset(asset).kind, decision.goal.filter(|_| decision.active()))
    {
        (AssetKind::Gate(_), Some(Goal { setpoint: Setpoint::Release { openings, .. }, .. })) => {
            Action::Open(openings[4])
        }
        (AssetKind::Gate(_), _) => Action::Shut,
        (AssetKind::Pump(_), Some(_)) => Action::Run,
        (AssetKind::Pump(_), None) => Action::Stop,
    };
    let plan = state.outlet_no(asset).and_then(|o| state.plans[o].as_ref()).map(|p| p.id);
    let causes = decision.causes.clone();
    effects.records.push(Entry::Decision { asset, action, plan, causes });
}

fn start(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    goal: &Goal,
    decision: &Decision,
    effects: &mut Effects,
) {
    // An earlier term's position is adopted where it fits, so that a restart strokes nothing.
    let carried = state.assets[asset.index()].carried.take();
    if carried.is_some_and(|a| a.is_active())
        && let Some(outlet) = state.site.outlet_of(asset)
    {
        let flow = state.metered_flow(outlet, stamp.utc).unwrap_or(0.0);
        state.assets[asset.index()].flow_target = flow.max(0.0);
    }
    let action = match goal.setpoint {
        Setpoint::Running => Action::Run,
        Setpoint::Release { .. } => {
            if decide::wants_pump(state, stamp, asset) {
                state.assets[asset.index()].assisted_since = Some(stamp.boot);
            }
            match ramp::first_opening(state, stamp, asset, goal, decision) {
                Some(opening) => Action::Open(opening),
                None => return,
            }
        }
        Setpoint::Shut | Setpoint::Stopped => return,
    };
    if action == Action::Run {
        state.assets[asset.index()].starts.retain(|t| stamp.utc - *t < Span::hours(24));
    }
    if order(state, stamp, asset, action, Some(goal), effects) && action == Action::Run {
        state.assets[asset.index()].starts.push(stamp.utc);
    }
}

/// A running asset: a step along the ramp or of the trim when due, else a renewal when due.
fn go_on(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    goal: &Goal,
    decision: &Decision,
    effects: &mut Effects,
) {
    if state.site.outlet_of(asset).is_some_and(|o| decide::pump_runs(state, o, stamp.boot)) {
        state.assets[asset.index()].assisted_since = None;
    }
    if let Some(opening) = ramp::next_opening(state, stamp, asset, goal, decision) {
        let action = if opening == Percent::ZERO { Action::Shut } else { Action::Open(opening) };
        order(state, stamp, asset, action, Some(goal), effects);
        return;
    }
    renew(state, stamp, asset, effects);
}

fn renew(state: &mut State, stamp: &Stamp, asset: AssetId, effects: &mut Effects) {
    let Some(command) = state.assets[asset.index()].command else { return };
    let lease = state.site.asset(asset).lease;
    let left = command.lease_end.since(stamp.boot);
    if left > lease.scaled(2.0 / 3.0) || !state.adapters_up[state.adapter_of(asset)] {
        return;
    }
    let scene = decide::scene(state, stamp, asset, true);
    match interlock::renew(&state.rules[asset.index()], &scene, command.id, stamp.boot) {
        Renewed::Renewal(renewal) => {
            let lease_end = renewal.lease_end();
            state.assets[asset.index()].command = Some(Command { lease_end, ..command });
            effects.renewals.push(renewal);
        }
        Renewed::Force(_) => rest(state, stamp, asset, "the interlock ends it", effects),
    }
}

/// The plan or a volume ends it: shut or stop by an ordinary command, along the ramp for a gate.
fn wind_down(state: &mut State, stamp: &Stamp, asset: AssetId, effects: &mut Effects) {
    let action = match state.site.asset(asset).kind {
        AssetKind::Pump(_) => Action::Stop,
        AssetKind::Gate(_) => match ramp::closing_step(state, stamp, asset) {
            ramp::Closing::Shut => Action::Shut,
            ramp::Closing::To(opening) => Action::Open(opening),
            ramp::Closing::NotYet => {
                renew(state, stamp, asset, effects);
                return;
            }
        },
    };
    if !order(state, stamp, asset, action, None, effects) {
        rest(state, stamp, asset, "the plan ends it", effects);
    }
}

fn stop_short(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    decision: &Decision,
    effects: &mut Effects,
) {
    // With the journal lost what runs may go on for its grace; then it rests and stays so.
    if let Some((lost, _)) = state.journal_lost
        && decision.causes.iter().all(|c| c.fact.about == model::About::Journal)
    {
        if stamp.boot.since(lost) < state.site.settings.journal_grace {
            renew(state, stamp, asset, effects);
            return;
        }
        let cause = "the journal was lost for longer than its grace".to_owned();
        effects.records.push(Entry::Latched { asset: None, cause: cause.clone() });
        state.safe_latch = Some(cause);
    }
    let first = decision.causes.first().map_or("no cause", |c| by_words(&c.by));
    rest(state, stamp, asset, first, effects);
}

fn by_words(by: &model::By) -> &'static str {
    match by {
        model::By::AssetState | model::By::Person => "a person holds it",
        model::By::Interlock(code) => code,
        model::By::Latch => "latched",
        model::By::Clause(_) => "a clause of the licence holds it",
        model::By::Mode => "the mode commands nothing",
        model::By::Armed => "not armed",
        model::By::Plan => "the plan ends it",
    }
}

/// Sends a command through the interlock; `false` if it was denied (then nothing is sent).
fn order(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    action: Action,
    goal: Option<&Goal>,
    effects: &mut Effects,
) -> bool {
    if state.journal_lost.is_some() || !state.adapters_up[state.adapter_of(asset)] {
        return false;
    }
    let mut wish = decide::wish(state, stamp, asset, action, goal);
    wish.command = state.new_command();
    let scene = decide::scene(state, stamp, asset, goal.is_some());
    let verdict = interlock::judge(&state.rules[asset.index()], &scene, &wish, stamp.boot);
    let Verdict::Permit(permit) = verdict else { return false };
    let from = state.position(asset, stamp.boot).map_or(Percent::ZERO, Percent::clamped);
    effects.records.push(Entry::Intent {
        asset,
        action,
        command: wish.command,
        lease_end: permit.lease_end(),
        state_seq: stamp.seq,
        readings: permit.readings(),
    });
    let slot = &mut state.assets[asset.index()];
    slot.command = Some(Command {
        id: wish.command,
        action,
        sent: stamp.boot,
        lease_end: permit.lease_end(),
        from,
        phase: Phase::Sent,
    });
    slot.last_move = Some(stamp.boot);
    if !action.is_active() {
        slot.flow_target = 0.0;
    }
    effects.orders.push(Order { asset, permit });
    true
}

/// To rest at once. Nothing is sent to an asset that a person has at the panel or locked out.
pub(crate) fn rest(
    state: &mut State,
    stamp: &Stamp,
    asset: AssetId,
    cause: &str,
    effects: &mut Effects,
) {
    let spec = state.site.asset(asset);
    let action = spec.rest.trip;
    let scene = decide::scene(state, stamp, asset, false);
    let theirs = scene.state.locked_out
        || scene.selector.flatten().and_then(|r| r.checked().ok()).is_some_and(|v| v >= 0.5);
    let from = state.position(asset, stamp.boot).map_or(Percent::ZERO, Percent::clamped);
    effects.records.push(Entry::Rest { asset, action, cause: cause.to_owned() });
    if !theirs {
        effects.rests.push(RestOrder { asset, action, cause: cause.to_owned() });
    }
    let slot = &mut state.assets[asset.index()];
    let id = slot.command.map_or(0, |c| c.id);
    slot.flow_target = 0.0;
    slot.assisted_since = None;
    slot.last_move = Some(stamp.boot);
    let resting = match action {
        RestAction::Close => Some(Action::Shut),
        RestAction::Stop => Some(Action::Stop),
        RestAction::Open | RestAction::Hold | RestAction::HandToLocal => None,
    };
    // On its way to rest it is watched like any command.
    slot.command = resting.filter(|_| !theirs).map(|action| Command {
        id,
        action,
        sent: stamp.boot,
        lease_end: stamp.boot,
        from,
        phase: Phase::Accepted,
    });
}

/// Everything that may be moving goes to rest: the daemon is about to stop.
pub(crate) fn stop_all(state: &mut State, stamp: &Stamp, why: &str, effects: &mut Effects) {
    let assets: Vec<AssetId> = state.site.assets.iter().map(|a| a.id).collect();
    for asset in assets {
        if state.active(asset) {
            rest(state, stamp, asset, why, effects);
        }
    }
}

impl State {
    fn adapter_of(&self, asset: AssetId) -> usize {
        self.site.asset(asset).adapter.index()
    }
    /// When the asset's command wants attention next.
    pub(crate) fn command_due(&self, asset: AssetId) -> Option<Mono> {
        let command = self.assets[asset.index()].command?;
        if command.phase != Phase::Confirmed {
            return Some(command.sent + Span::seconds(15));
        }
        let lease = self.site.asset(asset).lease;
        Some(command.lease_end + lease.scaled(-2.0 / 3.0))
    }
}
