//! The laws of the plant: water is kept, leases end by themselves, the same seed is the same bits.

use units::Window;

use super::*;
use crate::example::small_works;
use crate::{Fault, SplitMix64, Truth};

/// A plant with its clocks, moved on by spans.
struct Run {
    plant: Plant,
}

impl Run {
    fn new(change: impl FnOnce(&mut PlantConfig)) -> Self {
        let mut config = small_works(Truth::as_plated());
        change(&mut config);
        Self { plant: Plant::new(config).unwrap() }
    }
    fn on(&mut self, span: Span) -> &mut Self {
        let (to, boot) = (self.plant.now() + span, self.plant.boot() + span);
        self.plant.advance(to, boot).unwrap();
        self
    }
    fn drive(&mut self, asset: usize, percent: f64, lease: Span) -> &mut Self {
        let end = self.plant.boot() + lease;
        self.plant.drive(asset, percent, end).unwrap();
        self
    }
    fn found(&self, wanted: impl Fn(&EventKind) -> bool) -> Vec<&Event> {
        self.plant.record().events.iter().filter(|e| wanted(&e.kind)).collect()
    }
}

const LONG: Span = Span::hours(8);

/// Drives gate and pumps at random for `days`, in stretches of random length.
fn shaken(config: PlantConfig, seed: u64, days: f64) -> Plant {
    let mut r = SplitMix64::new(seed);
    let end = config.start + Span::from_seconds_f64(days * 86_400.0);
    let mut plant = Plant::new(config).unwrap();
    while plant.now() < end {
        let span = Span::from_seconds_f64(r.between(0.5, 900.0));
        let lease = plant.boot() + Span::from_seconds_f64(r.between(5.0, 1_800.0));
        let asset = (r.next_u64() % 3) as usize;
        // A pump against a shut gate is refused: that is part of the shaking.
        let _ = plant.drive(asset, r.between(0.0, 100.0), lease);
        let (to, boot) = (plant.now() + span, plant.boot() + span);
        plant.advance(to, boot).unwrap();
    }
    plant
}

#[test]
fn prop_water_is_kept() {
    for seed in 0..8 {
        let mut config = small_works(Truth::drawn(seed));
        config.beginning.level_m = 6.5;
        let before = config.storage.volume_m3(6.5);
        let plant = shaken(config, seed, 10.0);
        let t = plant.totals();
        assert!(t.released_m3 > 1_000.0, "seed {seed} released {}", t.released_m3);
        let books = before + t.inflow_m3 - t.released_m3 - t.spilled_m3;
        let error = (plant.volume_m3() - books).abs() / t.inflow_m3;
        assert!(error < 1e-9, "seed {seed}: {error:e}");
        // Each sample keeps the same books: they are what a judge reads.
        for s in &plant.record().samples {
            let t = &s.totals;
            let books = before + t.inflow_m3 - t.released_m3 - t.spilled_m3;
            assert!((s.volume_m3 - books).abs() < 1e-9 * t.inflow_m3.max(before));
            assert!(s.volume_m3 > -1e-9, "dry is dry, to rounding");
        }
    }
}

#[test]
fn prop_the_same_seed_gives_the_same_bits() {
    let run = |seed| shaken(small_works(Truth::drawn(seed)), 11, 4.0);
    let (a, b) = (run(5), run(5));
    assert_eq!(a.record(), b.record());
    assert_eq!(a.sense(), b.sense());
    assert_ne!(a.totals(), run(6).totals());
}

#[test]
fn a_lease_that_runs_out_shuts_the_gate_within_lease_and_stroke() {
    let mut run = Run::new(|_| {});
    run.on(Span::hours(2)).drive(0, 60.0, Span::seconds(120));
    let (told, lease_end) = (run.plant.now(), run.plant.boot() + Span::seconds(120));
    // One long advance: the lease ends inside it, at its own instant.
    run.on(Span::minutes(30));
    let begun = run.found(|k| matches!(k, EventKind::RestBegun { asset: 0, .. }))[0];
    assert!(begun.boot <= lease_end, "begun within the lease");
    assert!((begun.utc - told).as_seconds() > 119.999);
    let done = run.found(|k| matches!(k, EventKind::RestDone { asset: 0 }))[0];
    assert!(done.boot <= lease_end + Span::minutes(8), "done within lease + stroke");
    // 120 s at 1/480 a second is 25 %: two minutes down again.
    assert!(((done.utc - begun.utc).as_seconds() - 120.0).abs() < 1e-3);
    assert_eq!(run.plant.gate_percent(), 0.0);
}

#[test]
fn renewals_keep_it_open_and_shut_leases_are_refused() {
    let mut run = Run::new(|_| {});
    run.on(Span::hours(2)).drive(0, 30.0, Span::seconds(120));
    for _ in 0..20 {
        run.on(Span::seconds(60));
        let end = run.plant.boot() + Span::seconds(120);
        run.plant.renew(0, end).unwrap();
    }
    assert_eq!(run.plant.gate_percent(), 30.0);
    assert!(!run.plant.is_quiet());
    let boot = run.plant.boot();
    assert_eq!(run.plant.drive(0, 40.0, boot), Err(PlantError::LeasePast { asset: 0 }));
    let out = run.plant.drive(0, 100.1, boot + LONG);
    assert!(matches!(out, Err(PlantError::SettingOutOfRange { .. })));
    let nan = run.plant.drive(0, f64::NAN, boot + LONG);
    assert!(matches!(nan, Err(PlantError::SettingOutOfRange { .. })));
    assert_eq!(run.plant.drive(7, 0.0, boot + LONG), Err(PlantError::NoSuchAsset { asset: 7 }));
    assert_eq!(run.plant.renew(1, boot + LONG), Err(PlantError::NothingToRenew { asset: 1 }));
    let other = run.plant.renew_as(9, 0, boot + LONG);
    assert_eq!(other, Err(PlantError::NothingToRenew { asset: 0 }), "another command drives it");
    assert_eq!(run.found(|k| matches!(k, EventKind::DriveRefused { .. })).len(), 4);
    assert_eq!(run.plant.gate_percent(), 30.0, "nothing moved");
}

#[test]
fn a_jammed_gate_stands_still_until_the_fault_ends() {
    let mut run = Run::new(|c| {
        let from = c.start + Span::minutes(124);
        let window = Window::new(from, from + Span::minutes(30)).unwrap();
        c.faults = vec![Fault { kind: FaultKind::GateJam, window }];
    });
    run.on(Span::hours(2)).drive(0, 100.0, LONG).on(Span::minutes(10));
    // Four minutes of an eight-minute stroke.
    assert!((run.plant.gate_percent() - 50.0).abs() < 1e-6);
    run.drive(0, 0.0, Span::minutes(5)).on(Span::minutes(15));
    assert!((run.plant.gate_percent() - 50.0).abs() < 1e-6, "commands do nothing");
    let begun = run.found(|k| matches!(k, EventKind::RestBegun { .. }));
    assert_eq!(begun.len(), 1, "the controller did begin its rest");
    assert!(run.found(|k| matches!(k, EventKind::RestDone { .. })).is_empty());
    assert!(run.plant.ports_m3_s() > 0.1, "water runs on through a jammed gate");
    run.on(Span::minutes(20));
    assert_eq!(run.plant.gate_percent(), 0.0, "freed, it goes to rest");
    assert_eq!(run.found(|k| matches!(k, EventKind::FaultEnded { .. })).len(), 1);
}

#[test]
fn flow_at_the_ports_dies_away_within_drain_down() {
    let mut run = Run::new(|_| {});
    run.on(Span::hours(3)).drive(0, 100.0, LONG).on(Span::minutes(20));
    assert!(run.plant.ports_m3_s() > 1.0);
    run.drive(0, 0.0, LONG).on(Span::minutes(20));
    let still = run.found(|k| *k == EventKind::PortsStill);
    assert_eq!(still.len(), 1);
    let shut = run.plant.record().samples.iter().rfind(|s| s.gate_percent > 0.0).unwrap().utc;
    let tail = still[0].utc - shut;
    assert!(tail > Span::minutes(1) && tail < Span::minutes(7), "{tail}");
}

#[test]
fn pumps_push_against_the_tide_and_stop_with_the_gate() {
    // At the start it is high water, 4.3 m outside; the storage stands lower.
    let mut run = Run::new(|c| c.beginning.level_m = 4.2);
    let end = run.plant.boot() + LONG;
    assert_eq!(run.plant.drive(1, 100.0, end), Err(PlantError::WayShut { asset: 1 }));
    run.drive(0, 50.0, LONG).on(Span::minutes(5));
    assert_eq!(run.plant.ports_m3_s(), 0.0, "gravity has no head, and nothing comes in");
    run.drive(1, 100.0, LONG).drive(2, 100.0, LONG).on(Span::minutes(1));
    assert!((run.plant.ports_m3_s() - 0.5).abs() < 1e-12);
    assert!(run.plant.totals().pump_kwh > 0.7);
    run.drive(0, 0.0, LONG).on(Span::minutes(10));
    assert_eq!((run.plant.pump_runs(1), run.plant.pump_runs(3)), (Some(false), None));
    assert_eq!(run.found(|k| matches!(k, EventKind::ProtectionStopped { .. })).len(), 2);
}

#[test]
fn sensors_freeze_and_go_missing_in_their_windows() {
    let mut run = Run::new(|c| {
        let window = |a, b| Window::new(c.start + Span::hours(a), c.start + Span::hours(b));
        let frozen = FaultKind::SignalFrozen(Point::Level(0));
        let missing = FaultKind::SignalMissing(Point::Outer);
        c.faults = vec![
            Fault { kind: frozen, window: window(1, 3).unwrap() },
            Fault { kind: missing, window: window(2, 3).unwrap() },
        ];
    });
    let at_first = run.plant.sense().get(Point::Level(0)).unwrap();
    assert!((at_first - 5.0).abs() < 1e-12);
    run.on(Span::hours(1));
    let frozen = run.plant.sense().get(Point::Level(0));
    run.on(Span::minutes(90));
    let now = run.plant.sense();
    assert_eq!(now.get(Point::Level(0)), frozen);
    assert_ne!(now.get(Point::Level(1)), frozen);
    assert_eq!(now.get(Point::Outer), None);
    run.on(Span::hours(1));
    let after = run.plant.sense();
    assert!(after.get(Point::Outer).is_some() && after.get(Point::Level(0)) != frozen);
    assert_eq!(after.get(Point::Constant(0)), Some(2.0));
}

#[test]
fn a_full_storage_spills_by_itself() {
    let mut run = Run::new(|c| c.beginning.level_m = 6.59);
    run.on(Span::hours(6));
    assert_eq!(run.found(|k| *k == EventKind::SpillBegun).len(), 1);
    assert!(run.plant.totals().spilled_m3 > 1_000.0);
    // At rest the weir passes just what comes in: 0.16 m3/s stands 6 cm over the crest.
    assert!((6.60..6.70).contains(&run.plant.level_m()), "{}", run.plant.level_m());
}

#[test]
fn a_person_at_the_panel_beats_the_program() {
    let mut run = Run::new(|_| {});
    run.on(Span::hours(2)).drive(0, 40.0, Span::minutes(10)).on(Span::minutes(5));
    run.plant.set_local(0, true).unwrap();
    let end = run.plant.boot() + LONG;
    assert_eq!(run.plant.drive(0, 0.0, end), Err(PlantError::InLocal { asset: 0 }));
    assert_eq!(run.plant.rest(0, "stop"), Err(PlantError::InLocal { asset: 0 }));
    assert_eq!(run.plant.sense().get(Point::Local(0)), Some(1.0));
    run.on(Span::minutes(30));
    assert!((run.plant.gate_percent() - 40.0).abs() < 1e-6, "left where the person has it");
    run.plant.set_local(0, false).unwrap();
    run.plant.rest(0, "handed back").unwrap();
    run.on(Span::minutes(30));
    assert_eq!(run.plant.gate_percent(), 0.0);
}

#[test]
fn water_must_be_known_as_far_as_time_goes() {
    let mut run = Run::new(|_| {});
    let (to, boot) = (run.plant.now() + Span::days(41), run.plant.boot());
    let refused = run.plant.advance(to, boot);
    assert!(matches!(refused, Err(PlantError::NoWater { .. })));
    assert_eq!(run.plant.now(), run.plant.config().start);
}

#[test]
fn the_water_outside_is_late_by_the_drawn_lag() {
    let lag = Span::minutes(8);
    let mut late = Run::new(|c| c.truth.lag = lag);
    let mut plain = Run::new(|_| {});
    late.on(Span::hours(3));
    plain.on(Span::hours(3) - lag);
    assert!((late.plant.outer_m() - plain.plant.outer_m()).abs() < 1e-9);
}
