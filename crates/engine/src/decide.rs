//! The decision on one asset: what is asked for, and everything that stands against it.
//!
//! Pure and complete: it lists every cause, not the first, so that `why` can say what would have to
//! change. If it lists one cause, changing the one fact that it names turns the decision.

use interlock::{Action, Scene, Verdict, Wish};
use licence::{Conditions, Guarded};
use model::{
    About, AssetId, AssetKind, By, Cause, Fact, Is, MustBe, Outlet, Plan, Setpoint, Slot,
    SlotReason, TideNumber,
};
use units::{Mono, Percent, Span, Utc, Window};

use crate::state::State;
use crate::{Mode, Stamp};

/// What an asset should do now, and what stands against it.
#[derive(Clone, PartialEq, Debug)]
pub struct Decision {
    pub asset: AssetId,
    /// What is asked for, by the plan or a person; `None` when rest is.
    pub goal: Option<Goal>,
    /// Empty exactly when the asset should be active.
    pub causes: Vec<Cause>,
    /// Caps that hold for the release, as the clauses stand now.
    pub(crate) guarded: Option<Guarded>,
    /// The interlock sends it to rest, whatever else.
    pub(crate) forced: bool,
    /// The plan itself asks for rest now.
    pub(crate) planned_rest: bool,
}

/// What is asked for.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Goal {
    pub setpoint: Setpoint,
    pub tide: Option<TideNumber>,
    /// A person's, not the plan's.
    pub hand: bool,
}

impl Decision {
    pub fn active(&self) -> bool {
        self.goal.is_some() && self.causes.is_empty()
    }
    /// Whether a release may end along its ramp instead of at once: the plan or a volume ends it.
    pub(crate) fn soft(&self) -> bool {
        let volume = |about| {
            matches!(about, About::VolumeThisTide | About::VolumeRolling | About::VolumeMonth)
        };
        // When the plan asks for rest, its one cause (the clause behind the slot, say) is no hold.
        let by_plan = self.planned_rest && self.causes.len() == 1;
        let by_volume = |c: &Cause| matches!(c.by, By::Clause(_)) && volume(c.fact.about);
        !self.forced && (by_plan || (!self.planned_rest && self.causes.iter().all(by_volume)))
    }
}

fn cause(by: By, about: About, is: Is, must_be: MustBe) -> Cause {
    Cause { by, fact: Fact { about, is, must_be } }
}

/// Decides on one asset as the state stands at this stamp. Changes nothing.
pub fn decide(state: &State, stamp: &Stamp, asset: AssetId) -> Decision {
    let mut causes = Vec::new();
    people(state, stamp, asset, &mut causes);
    let goal = goal(state, stamp, asset, &mut causes);
    let planned_rest = goal.is_none() && state.assets[asset.index()].hand.is_none();
    let mut decision = Decision { asset, goal, causes, guarded: None, forced: false, planned_rest };
    let active = state.active(asset);
    if let Some(goal) = goal {
        if !goal.hand {
            program(state, asset, &goal, active, &mut decision.causes);
        }
        let guarded = guard(state, stamp, asset, active);
        decision.causes.extend(guarded.causes.iter().cloned());
        decision.guarded = Some(guarded);
    }
    if goal.is_some() || active {
        interlocks(state, stamp, goal.as_ref(), &mut decision);
    }
    decision
}

/// Locks, holds and trips: a person, or the plant, has taken the asset from the program.
fn people(state: &State, stamp: &Stamp, asset: AssetId, causes: &mut Vec<Cause>) {
    let a = &state.assets[asset.index()];
    if let Some(until) = a.hold_until.filter(|until| stamp.utc < *until) {
        let is = Is::Words(format!("held until {until}"));
        causes.push(cause(By::Person, About::Hold(asset), is, MustBe::Words("no hold")));
    }
    if let Some((_, why)) = state.journal_lost.as_ref().filter(|_| state.active(asset)) {
        let is = Is::Words(format!("lost: {why}"));
        causes.push(cause(By::Armed, About::Journal, is, MustBe::Words("kept")));
    }
}

/// What is asked for; when nothing is, the cause says when something will be.
fn goal(state: &State, stamp: &Stamp, asset: AssetId, causes: &mut Vec<Cause>) -> Option<Goal> {
    if let Some((setting, _)) = state.assets[asset.index()].hand {
        return hand_goal(state, asset, setting, causes);
    }
    let nothing = |words: &str, causes: &mut Vec<Cause>| {
        let is = Is::Words(words.to_owned());
        causes.push(cause(By::Plan, About::Plan, is, MustBe::Words("a plan")));
        None
    };
    let Some(plan) = state.outlet_no(asset).and_then(|o| state.plans[o].as_ref()) else {
        return nothing("no plan yet", causes);
    };
    let Some(slot) = plan.slot_at(asset, stamp.utc) else {
        return nothing("the plan does not reach to now", causes);
    };
    if slot.setpoint.is_active() {
        return Some(Goal { setpoint: slot.setpoint, tide: slot.tide, hand: false });
    }
    causes.push(not_planned(plan, slot, asset, stamp.utc));
    None
}

fn hand_goal(
    state: &State,
    asset: AssetId,
    setting: Percent,
    causes: &mut Vec<Cause>,
) -> Option<Goal> {
    if setting == Percent::ZERO {
        let is = Is::Words("in hand at rest".to_owned());
        causes.push(cause(By::Person, About::Selector(asset), is, MustBe::Words("auto")));
        return None;
    }
    let setpoint = match state.site.asset(asset).kind {
        AssetKind::Gate(_) => {
            let target = licence::flow_cap(&state.site, asset)
                .map_or(units::CubicMetresPerSecond::ZERO, |c| c.max);
            Setpoint::Release { target, openings: [setting; 5] }
        }
        AssetKind::Pump(_) => Setpoint::Running,
    };
    Some(Goal { setpoint, tide: None, hand: true })
}

/// The plan keeps it at rest now: until when, and the clause behind it where there is one.
fn not_planned(plan: &Plan, slot: &Slot, asset: AssetId, now: Utc) -> Cause {
    let by = match slot.why {
        SlotReason::OutsideWindow { clause: Some(c) }
        | SlotReason::EdgeMargin { clause: Some(c) }
        | SlotReason::CapReached { clause: c } => By::Clause(c),
        _ => By::Plan,
    };
    match next_active(plan, asset, now) {
        Some(window) => cause(by, About::Now, Is::Instant(now), MustBe::Inside(window)),
        None => {
            let is = Is::Words(slot_words(&slot.why).to_owned());
            cause(by, About::Plan, is, MustBe::Words("a planned release"))
        }
    }
}

/// The asset's next stretch of active slots, joined.
pub fn next_active(plan: &Plan, asset: AssetId, now: Utc) -> Option<Window> {
    let slots = &plan.assets.iter().find(|a| a.asset == asset)?.slots;
    let ahead = |s: &&Slot| s.window.end() > now && s.setpoint.is_active();
    let first = slots.iter().position(|s| ahead(&s))?;
    let run = slots[first..].iter().take_while(|s| s.setpoint.is_active());
    let end = run.last()?.window.end();
    Window::new(slots[first].window.start(), end).ok()
}

/// The reason of a slot in plain words.
pub fn slot_words(why: &SlotReason) -> &'static str {
    match why {
        SlotReason::OutsideWindow { .. } => "outside the lawful window",
        SlotReason::EdgeMargin { .. } => "kept for opening, closing and draining in the window",
        SlotReason::Releasing { .. } => "releasing",
        SlotReason::CapReached { .. } => "the licensed volume is used up",
        SlotReason::StorageLow => "the storage is down to its lowest working level",
        SlotReason::NoHead => "the water outside is too high",
        SlotReason::WaitingForHead => "waiting for more head rather than pumping",
        SlotReason::GravityEnough => "gravity does it without this pump",
        SlotReason::Assisting => "helping a release that gravity cannot carry",
        SlotReason::Unavailable => "not available to the program",
    }
}

/// Mode, the operator's yes, and being armed: what the program needs and a person in hand does not.
fn program(state: &State, asset: AssetId, goal: &Goal, active: bool, causes: &mut Vec<Cause>) {
    match state.mode {
        Mode::Observe => {
            let is = Is::Words("observe".to_owned());
            causes.push(cause(By::Mode, About::Mode, is, MustBe::Words("automatic or advise")));
        }
        Mode::Advise if state.assets[asset.index()].confirmed_tide != goal.tide => {
            let must = MustBe::Words("an operator's yes to this release");
            causes.push(cause(By::Person, About::Confirmation(asset), Is::Nothing, must));
        }
        Mode::Advise | Mode::Automatic => {}
    }
    if !active && state.armed.is_none() {
        let is = Is::Words("not looked at yet".to_owned());
        causes.push(cause(By::Armed, About::Latch, is, MustBe::Words("armed")));
    }
    for (about, words) in state.armed_reasons.iter().filter(|_| !active) {
        let is = Is::Words(words.clone());
        causes.push(cause(By::Armed, *about, is, MustBe::Words("mended")));
    }
}

/// The clauses against live conditions and sums, at the moment of action.
fn guard(state: &State, stamp: &Stamp, asset: AssetId, active: bool) -> Guarded {
    let signals = state.validator.all(stamp.utc);
    let outlet = state.outlet_no(asset);
    let conditions = Conditions {
        now: stamp.utc,
        signals: &signals,
        forecast: state.forecast.as_deref(),
        lawful: outlet.and_then(|o| state.lawful[o].as_ref()),
        tallies: &state.tallies,
        recent_flow: outlet.map_or(&[], |o| state.meters[o].recent.as_slice()),
    };
    let phase = if active { licence::Phase::Running } else { licence::Phase::Starting };
    licence::guard(&state.site, &conditions, asset, phase)
}

fn interlocks(state: &State, stamp: &Stamp, goal: Option<&Goal>, decision: &mut Decision) {
    let asset = decision.asset;
    let setpoint = goal.map(|g| g.setpoint);
    let wish = wish(state, stamp, asset, nominal(state, asset, setpoint), goal);
    let scene = scene(state, stamp, asset, goal.is_some());
    let verdict = interlock::judge(&state.rules[asset.index()], &scene, &wish, stamp.boot);
    decision.forced = matches!(verdict, Verdict::Force(_));
    if let Verdict::Deny(findings) | Verdict::Force(findings) = verdict {
        decision.causes.extend(findings.iter().map(|f| finding_cause(state, asset, f)));
    }
}

/// An action of the right kind, for judging whether the asset may be active at all.
fn nominal(state: &State, asset: AssetId, setpoint: Option<Setpoint>) -> Action {
    match (&state.site.asset(asset).kind, setpoint) {
        (AssetKind::Gate(_), Some(Setpoint::Release { openings, .. })) => {
            Action::Open(openings[4].max(Percent::of(1.0)))
        }
        (AssetKind::Gate(_), _) => Action::Open(Percent::of(1.0)),
        (AssetKind::Pump(_), _) => Action::Run,
    }
}

pub(crate) fn wish(
    state: &State,
    stamp: &Stamp,
    asset: AssetId,
    action: Action,
    goal: Option<&Goal>,
) -> Wish {
    Wish {
        action,
        // The plan's releases begin because a window has; a person's hand does not.
        anchored_on_time: goal.is_some_and(|g| !g.hand),
        command: state.assets[asset.index()].command.map_or(0, |c| c.id),
        term: state.term.0,
        state_seq: stamp.seq,
    }
}

/// The asset's surroundings as the interlock sees them: raw readings with ages, nothing else.
pub(crate) fn scene(state: &State, stamp: &Stamp, asset: AssetId, wanted: bool) -> Scene {
    let spec = state.site.asset(asset);
    let a = &state.assets[asset.index()];
    let outlet = state.site.outlet_of(asset);
    let raw = |s| state.raw_of(s, stamp.boot);
    let levels = outlet.map(|o| &state.site.storage(o.storage).level_signals);
    let level = |n: usize| levels.and_then(|l| l.get(n)).map(|s| raw(*s));
    let is_gate = matches!(spec.kind, AssetKind::Gate(_));
    let since = |t: Option<Mono>| t.map(|t| stamp.boot.since(t));
    Scene {
        clock: stamp.trust,
        state: interlock::State {
            active: state.active(asset),
            locked_out: a.locked_by.is_some(),
            latched: a.tripped.is_some() || state.safe_latch.is_some(),
            since_move: since(a.last_move),
            since_stop: since(a.last_stop),
            starts_last_hour: starts_last_hour(&a.starts, stamp.utc),
            pump_runs: outlet.is_some_and(|o| pump_runs(state, o, stamp.boot)),
            assisted_for: assisted_for(state, stamp, asset, wanted),
        },
        position: raw(spec.position),
        selector: spec.local.map(raw),
        inner: [level(0), level(1)],
        outer: outlet.filter(|_| is_gate).and_then(|o| o.outer_signal).map(raw),
        way: outlet.filter(|_| !is_gate).and_then(|o| raw(state.site.asset(o.gate).position)),
    }
}

fn starts_last_hour(starts: &[Utc], now: Utc) -> u32 {
    starts.iter().filter(|t| now - **t < Span::hours(1)).count() as u32
}

pub(crate) fn pump_runs(state: &State, outlet: &Outlet, boot: Mono) -> bool {
    outlet.pumps.iter().any(|p| state.position(*p, boot).is_some_and(|v| v > 50.0))
}

/// How long a gate has been open (or is about to be) for pumps that the plan wants to run now.
fn assisted_for(state: &State, stamp: &Stamp, asset: AssetId, wanted: bool) -> Option<Span> {
    let a = &state.assets[asset.index()];
    if let Some(since) = a.assisted_since {
        return Some(stamp.boot.since(since));
    }
    (wanted && wants_pump(state, stamp, asset)).then_some(Span::ZERO)
}

/// Whether the plan has a pump of this gate's outlet run now.
pub(crate) fn wants_pump(state: &State, stamp: &Stamp, gate: AssetId) -> bool {
    let Some(no) = state.outlet_no(gate) else { return false };
    let Some(plan) = &state.plans[no] else { return false };
    let runs =
        |p: &AssetId| plan.slot_at(*p, stamp.utc).is_some_and(|s| s.setpoint == Setpoint::Running);
    state.site.outlets[no].pumps.iter().any(runs)
}

fn finding_cause(state: &State, asset: AssetId, f: &interlock::Finding) -> Cause {
    use interlock::{Id, Subject};
    let outlet = state.site.outlet_of(asset);
    let levels = outlet.map(|o| &state.site.storage(o.storage).level_signals);
    let about = match f.subject {
        Subject::Clock => About::ClockTrust,
        Subject::Position => About::Signal(state.site.asset(asset).position),
        Subject::Selector => About::Selector(asset),
        Subject::Inner(n) => levels
            .and_then(|l| l.get(usize::from(n)))
            .map_or(About::Position(asset), |s| About::Signal(*s)),
        Subject::Outer => {
            outlet.and_then(|o| o.outer_signal).map_or(About::Position(asset), About::Signal)
        }
        Subject::Way => outlet.map_or(About::Position(asset), |o| About::Position(o.gate)),
        Subject::Asset => match f.id {
            Id::LockedOut => About::Lock(asset),
            Id::Latched => About::Latch,
            _ => About::LastMove(asset),
        },
    };
    let is = if f.value.is_finite() { Is::Number(f.value) } else { Is::Words(f.words.to_owned()) };
    let must_be = match f.id {
        Id::MinimumRest | Id::NoOpenWay | Id::Backflow | Id::DryRun => MustBe::AtLeast(f.limit),
        Id::TooManyStarts | Id::SignalsDisagree | Id::BadLease | Id::BadSetting => {
            MustBe::AtMost(f.limit)
        }
        Id::LockedOut => MustBe::Words("not locked out"),
        Id::Local => MustBe::Words("remote"),
        Id::Latched => MustBe::Words("reset"),
        Id::SignalBad => MustBe::Words("a good reading"),
        Id::ClockDistrusted => MustBe::Words("trusted"),
    };
    cause(By::Interlock(f.id.code()), about, is, must_be)
}

/// Whether feedback shows the asset at rest (shut or stopped).
pub(crate) fn at_rest(state: &State, asset: AssetId, boot: Mono) -> bool {
    state.position(asset, boot).is_some_and(|p| p <= 2.5)
}
