//! Each rule, each finding, and the laws that hold over all scenes.

use proptest::prelude::*;

use super::*;
use crate::{Bounds, PermitLife, State};

/// An interlock, and a way to make a calm scene wrong that it must find.
type Case = (Id, fn(&mut Scene));

const NOW: Mono = Mono::from_nanos(1_000_000_000_000);

fn gate() -> Rules {
    Rules {
        site: 7,
        asset: 3,
        kind: Kind::Gate(GateRules {
            port_centre_m: -3.6,
            density_excess: 0.02,
            assist_grace: Span::seconds(60),
        }),
        lease: Span::seconds(120),
        permit_life: PermitLife::REAL,
        move_rest: Span::seconds(30),
    }
}

fn pump() -> Rules {
    let kind = Kind::Pump(PumpRules {
        starts_per_hour_max: 8,
        rest_min: Span::minutes(5),
        inner_m_min: 3.7,
        way_open_min: Percent::of(10.0),
    });
    Rules { kind, ..gate() }
}

fn raw(value: f64) -> Option<Raw> {
    let bounds = Bounds {
        min: -20.0,
        max: 200.0,
        age_max: Span::seconds(60),
        frozen_after: Some(Span::minutes(30)),
    };
    Some(Raw { value, age: Span::seconds(1), unchanged_for: Span::ZERO, bounds })
}

fn scene() -> Scene {
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
        way: raw(50.0),
    }
}

fn wish(action: Action) -> Wish {
    Wish { action, anchored_on_time: true, command: 42, term: 5, state_seq: 9 }
}

fn open() -> Wish {
    wish(Action::Open(Percent::of(40.0)))
}

fn found(rules: &Rules, scene: &Scene, wish: &Wish) -> Vec<Id> {
    match judge(rules, scene, wish, NOW) {
        Verdict::Permit(_) => Vec::new(),
        Verdict::Deny(f) | Verdict::Force(f) => f.iter().map(|x| x.id).collect(),
    }
}

#[test]
fn a_permit_says_what_where_and_until_when() {
    let Verdict::Permit(p) = judge(&gate(), &scene(), &open(), NOW) else { panic!("denied") };
    assert_eq!((p.site(), p.asset(), p.command(), p.term(), p.state_seq()), (7, 3, 42, 5, 9));
    assert_eq!(p.action(), Action::Open(Percent::of(40.0)));
    assert_eq!(p.not_after().since(NOW), Span::seconds(2));
    assert_eq!(p.lease_end().since(NOW), Span::seconds(120));
}

#[test]
fn each_wrong_thing_is_found_by_its_own_interlock() {
    let cases: [Case; 10] = [
        (Id::LockedOut, |s| s.state.locked_out = true),
        (Id::Local, |s| s.selector = Some(raw(1.0))),
        (Id::Local, |s| s.selector = Some(None)),
        (Id::Latched, |s| s.state.latched = true),
        (Id::SignalBad, |s| s.position = None),
        (Id::SignalBad, |s| s.outer = Some(None)),
        (Id::SignalsDisagree, |s| s.inner[1] = Some(raw(5.11))),
        (Id::Backflow, |s| s.outer = Some(raw(5.0))),
        (Id::ClockDistrusted, |s| s.clock = ClockTrust::Distrusted),
        (Id::MinimumRest, |s| s.state.since_move = Some(Span::seconds(29))),
    ];
    for (id, wrong) in cases {
        let mut s = scene();
        wrong(&mut s);
        assert_eq!(found(&gate(), &s, &open()), [id], "{id:?}");
    }
    assert_eq!(found(&gate(), &scene(), &wish(Action::Run)), [Id::BadSetting]);
    assert_eq!(found(&gate(), &scene(), &wish(Action::Open(Percent::ZERO))), [Id::BadSetting]);
    let long = Rules { lease: Span::minutes(11), ..gate() };
    assert_eq!(found(&long, &scene(), &open()), [Id::BadLease]);
}

#[test]
fn a_signal_is_bad_when_stale_frozen_out_of_range_or_no_number() {
    let spoil: [fn(&mut Raw); 5] = [
        |r| r.age = Span::seconds(61),
        |r| r.unchanged_for = Span::minutes(31),
        |r| r.value = 201.0,
        |r| r.value = f64::NAN,
        |r| r.value = f64::INFINITY,
    ];
    for wrong in spoil {
        let mut s = scene();
        wrong(s.position.as_mut().unwrap());
        assert_eq!(found(&gate(), &s, &open()), [Id::SignalBad]);
    }
}

#[test]
fn one_good_level_of_two_is_enough_and_none_is_not() {
    let mut s = scene();
    s.inner[0] = Some(None);
    assert_eq!(found(&gate(), &s, &open()), []);
    s.inner[1] = Some(None);
    assert_eq!(found(&gate(), &s, &open()), [Id::SignalBad, Id::SignalBad]);
    s.inner = [None, None];
    assert_eq!(found(&gate(), &s, &open()), [Id::SignalBad]);
}

#[test]
fn salt_water_outside_weighs_more_than_its_level() {
    // Inner 5.0 (the lower of two); outer 4.85: 0.15 m of head, less 0.02 x (4.85 + 3.6) = 0.169.
    let mut s = scene();
    s.outer = Some(raw(4.85));
    assert_eq!(found(&gate(), &s, &open()), [Id::Backflow]);
    s.outer = Some(raw(4.80));
    assert_eq!(found(&gate(), &s, &open()), []);
}

#[test]
fn a_way_may_stand_open_against_the_head_only_for_pumps() {
    let mut s = scene();
    s.outer = Some(raw(5.5));
    s.state.assisted_for = Some(Span::seconds(60));
    assert_eq!(found(&gate(), &s, &open()), []);
    s.state.assisted_for = Some(Span::seconds(61));
    assert_eq!(found(&gate(), &s, &open()), [Id::Backflow]);
    s.state.pump_runs = true;
    assert_eq!(found(&gate(), &s, &open()), []);
}

#[test]
fn a_pump_needs_an_open_way_water_rest_and_starts_to_spare() {
    let run = wish(Action::Run);
    assert_eq!(found(&pump(), &scene(), &run), []);
    let cases: [Case; 5] = [
        (Id::NoOpenWay, |s| s.way = raw(9.0)),
        (Id::SignalBad, |s| s.way = None),
        (Id::DryRun, |s| s.inner = [Some(raw(3.7)), Some(raw(3.7))]),
        (Id::TooManyStarts, |s| s.state.starts_last_hour = 8),
        (Id::MinimumRest, |s| s.state.since_stop = Some(Span::seconds(299))),
    ];
    for (id, wrong) in cases {
        let mut s = scene();
        wrong(&mut s);
        assert_eq!(found(&pump(), &s, &run), [id], "{id:?}");
    }
}

#[test]
fn what_bars_a_start_does_not_end_a_run_and_what_must_stay_does() {
    let mut s = scene();
    s.state.active = true;
    s.clock = ClockTrust::Distrusted;
    s.state.since_move = Some(Span::ZERO);
    assert!(matches!(judge(&gate(), &s, &open(), NOW), Verdict::Permit(_)));
    assert!(matches!(renew(&gate(), &s, 42, NOW), Renewed::Renewal(_)));
    s.outer = Some(raw(6.0));
    assert!(matches!(judge(&gate(), &s, &open(), NOW), Verdict::Force(_)));
    assert!(matches!(renew(&gate(), &s, 42, NOW), Renewed::Force(_)));
}

#[test]
fn the_self_test_passes_and_its_cases_are_not_vacuous() {
    assert_eq!(crate::self_test(), Ok(()));
}

fn any_raw() -> impl Strategy<Value = Option<Raw>> {
    let value = prop_oneof![
        8 => -30.0..210.0_f64,
        1 => Just(f64::NAN),
        1 => Just(f64::INFINITY),
    ];
    prop::option::weighted(0.9, (value, -5..120_i64, 0..4000_i64)).prop_map(|r| {
        r.map(|(value, age_s, flat_s)| Raw {
            value,
            age: Span::seconds(age_s),
            unchanged_for: Span::seconds(flat_s),
            bounds: raw(0.0).unwrap().bounds,
        })
    })
}

prop_compose! {
    fn any_scene()(
        position in any_raw(), selector in any_raw(), a in any_raw(), b in any_raw(),
        outer in any_raw(), way in any_raw(), bits in 0..128_u32, since in 0..400_i64,
    ) -> Scene {
        let bit = |n: u32| bits >> n & 1 == 1;
        Scene {
            clock: if bit(0) { ClockTrust::Trusted } else { ClockTrust::Distrusted },
            state: State {
                active: bit(1),
                locked_out: bit(2),
                latched: bit(3),
                since_move: bit(4).then_some(Span::seconds(since)),
                since_stop: bit(5).then_some(Span::seconds(since)),
                starts_last_hour: since as u32 % 12,
                pump_runs: bit(6),
                assisted_for: bit(4).then_some(Span::seconds(since)),
            },
            position, selector: Some(selector), inner: [Some(a), Some(b)], outer: Some(outer), way,
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig {
        failure_persistence: None, cases: 4000, ..ProptestConfig::default()
    })]

    /// Written a second time, as one condition, apart from the code above.
    #[test]
    fn prop_gate_opens_only_when_everything_is_right(s in any_scene()) {
        let ok = |r: Option<Raw>| r.filter(|r| r.value.is_finite()
            && (-20.0..=200.0).contains(&r.value)
            && r.age >= Span::ZERO && r.age <= Span::seconds(60)
            && r.unchanged_for <= Span::minutes(30)).map(|r| r.value);
        let inner = match (ok(s.inner[0].unwrap()), ok(s.inner[1].unwrap())) {
            (Some(a), Some(b)) => ((a - b).abs() <= 0.10).then(|| a.min(b)),
            (a, b) => a.or(b),
        };
        let net = inner.zip(ok(s.outer.unwrap())).map(|(i, o)| {
            if o > -3.6 { i - o - 0.02 * (o + 3.6) } else { i + 3.6 }
        });
        let assisted = s.state.pump_runs
            || s.state.assisted_for.is_some_and(|t| t <= Span::seconds(60));
        let start_ok = s.state.active
            || (s.clock == ClockTrust::Trusted
                && s.state.since_move.is_none_or(|t| t >= Span::seconds(30)));
        let right = !s.state.locked_out && !s.state.latched && start_ok
            && ok(s.selector.unwrap()).is_some_and(|v| v < 0.5)
            && ok(s.position).is_some()
            && net.is_some_and(|n| n > 0.0 || assisted);
        let permitted = matches!(judge(&gate(), &s, &open(), NOW), Verdict::Permit(_));
        prop_assert_eq!(permitted, right);
    }

    #[test]
    fn prop_rest_is_barred_by_lock_and_local_only(s in any_scene()) {
        for (rules, action) in [(gate(), Action::Shut), (pump(), Action::Stop)] {
            let ids = found(&rules, &s, &wish(action));
            prop_assert!(ids.iter().all(|i| matches!(i, Id::LockedOut | Id::Local)), "{ids:?}");
        }
    }

    #[test]
    fn prop_no_finding_no_force_and_every_force_has_a_cause(s in any_scene()) {
        for (rules, w) in [(gate(), open()), (pump(), wish(Action::Run))] {
            match judge(&rules, &s, &w, NOW) {
                Verdict::Force(f) => prop_assert!(s.state.active && f.any_must_stay()),
                Verdict::Deny(f) => prop_assert!(!f.is_empty()),
                Verdict::Permit(p) => prop_assert_eq!(p.action(), w.action),
            }
        }
    }
}
