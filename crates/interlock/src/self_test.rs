//! A known-answer test that is run at each start: no answer, no arming.

use units::{Mono, Percent, Span};

use crate::{
    Action, Bounds, ClockTrust, GateRules, Id, Kind, PermitLife, Raw, Rules, Scene, State, Verdict,
    Wish, judge,
};

const GATE: Rules = Rules {
    site: 1,
    asset: 0,
    kind: Kind::Gate(GateRules {
        port_centre_m: -3.6,
        density_excess: 0.02,
        assist_grace: Span::seconds(60),
    }),
    lease: Span::seconds(120),
    permit_life: PermitLife::REAL,
    move_rest: Span::seconds(30),
};

fn raw(value: f64) -> Option<Raw> {
    let bounds = Bounds { min: -20.0, max: 200.0, age_max: Span::seconds(60), frozen_after: None };
    Some(Raw { value, age: Span::seconds(1), unchanged_for: Span::ZERO, bounds })
}

fn calm() -> Scene {
    Scene {
        clock: ClockTrust::Trusted,
        state: State {
            active: false,
            locked_out: false,
            latched: false,
            since_move: None,
            since_stop: None,
            starts_last_hour: 0,
            pump_runs: false,
            assisted_for: None,
        },
        position: raw(0.0),
        selector: Some(raw(0.0)),
        inner: [Some(raw(5.0)), Some(raw(5.02))],
        outer: Some(raw(1.0)),
        way: None,
    }
}

fn finds(scene: &Scene, id: Id) -> bool {
    let action = Action::Open(Percent::of(40.0));
    let wish = Wish { action, anchored_on_time: true, command: 1, term: 1, state_seq: 1 };
    match judge(&GATE, scene, &wish, Mono::ZERO) {
        Verdict::Permit(_) => false,
        Verdict::Deny(f) | Verdict::Force(f) => f.has(id),
    }
}

/// A way to make the calm scene wrong, and the interlock that must find it.
type Case = (&'static str, Id, fn(&mut Scene));

/// Each case makes one thing wrong with a scene that is otherwise permitted, and names the
/// interlock that must find it. The error names the first case that was not found.
pub fn self_test() -> Result<(), &'static str> {
    let cases: [Case; 7] = [
        ("lock-out", Id::LockedOut, |s| s.state.locked_out = true),
        ("local panel", Id::Local, |s| s.selector = Some(raw(1.0))),
        ("latch", Id::Latched, |s| s.state.latched = true),
        ("missing position", Id::SignalBad, |s| s.position = None),
        ("level not a number", Id::SignalBad, |s| s.inner = [Some(raw(f64::NAN)), Some(None)]),
        ("backflow", Id::Backflow, |s| s.outer = Some(raw(6.0))),
        ("distrusted clock", Id::ClockDistrusted, |s| s.clock = ClockTrust::Distrusted),
    ];
    if cases.iter().any(|(_, id, _)| finds(&calm(), *id)) {
        return Err("a calm scene is not permitted");
    }
    for (name, id, make_wrong) in cases {
        let mut scene = calm();
        make_wrong(&mut scene);
        if !finds(&scene, id) {
            return Err(name);
        }
    }
    Ok(())
}
