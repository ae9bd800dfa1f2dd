//! What plans come to, on tides and weather that a person can follow.

use model::*;
use units::*;

use super::fixture::*;
use super::greedy::greedy;
use crate::{PlanError, audit, plan};

fn made(case: &Case) -> (Site, PlanRequest, Plan) {
    let site = site();
    let request = request(&site, case);
    let plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    (site, request, plan)
}

fn tides(plan: &Plan) -> Vec<TideNumber> {
    plan.releases.iter().map(|r| r.tide).collect()
}

/// Neap tides at 4,800 m3 each: every tide's volume is used to the last, in one release.
#[test]
fn each_neap_tide_is_used_to_its_cap_in_one_release() {
    let site = site();
    let request = request(&site, &Case::dry(3.5, 5.0));
    let plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    assert_eq!(plan.releases.len(), 6);
    for r in &plan.releases {
        assert!((r.volume.get() - 4800.0).abs() < 1e-6, "{r:?}");
    }
    assert_eq!(plan.shortfalls, []);
}

/// A tide of 2.1 m after rounding is nil by 2.5; one of 2.2 is not.
#[test]
fn a_nil_tide_is_left_out_and_its_clause_named() {
    let mut case = Case::dry(3.0, 5.0);
    case.ranges[3] = 2.128;
    case.ranges[4] = 2.15;
    let (_, request, plan) = made(&case);
    assert_eq!(request.lawful.nil.len(), 1);
    assert_eq!(tides(&plan), [1, 2, 4, 5, 6]);
    let slot = plan.slot_at(GATE, t(high_h(3) + 2.0)).unwrap();
    assert_eq!(slot.why, SlotReason::OutsideWindow { clause: Some(TIDE_VOLUME) });
}

/// 32 mm on the smallest neaps: no lawful plan keeps it in, and the plan says when, how much and by
/// which clause. Inflow and room say the same: what is over is what cannot be kept or released.
#[test]
fn rain_on_neaps_tells_the_spill_and_the_clause() {
    let rain = Some((6.0, 32.0, 18.0));
    let (site, request, plan) = made(&Case { rain, ..Case::dry(3.2, 5.8) });
    let first = &plan.shortfalls[0];
    assert!(first.spill.start() > t(6.0) && first.spill.start() < t(30.0), "{first:?}");
    assert_eq!(first.clauses, [TIDE_VOLUME]);
    let spilled: f64 = plan.shortfalls.iter().map(|s| s.volume.get()).sum();
    let least = greedy(&site, &request).spilled_m3;
    assert!(spilled > 5_000.0 && spilled < least + 40.0, "{spilled} m3, least {least} m3");
}

/// Two full tides in 24 h are 9,000 and 7,500 by 2.6, exactly; the last tide's release is short of
/// nothing. A spill on such tides names both caps.
#[test]
fn the_rolling_cap_is_met_to_the_cubic_metre() {
    let rain = Some((0.0, 40.0, 12.0));
    let (_, _, plan) = made(&Case { rain, ..Case::dry(5.5, 6.3) });
    let volumes: Vec<f64> = plan.releases.iter().map(|r| r.volume.get()).collect();
    for (v, cap) in volumes.iter().zip([9000.0, 7500.0, 9000.0, 7500.0]) {
        assert!((v - cap).abs() < 1e-3, "{volumes:?}");
    }
    let last = plan.shortfalls.last().unwrap();
    assert!(last.clauses.contains(&TIDE_VOLUME) && last.clauses.contains(&ROLLING), "{last:?}");
}

/// Dry weather: at least 98 % of what anybody could release: all that was there or came in before
/// the last window shut, or every tide to its cap.
#[test]
fn dry_weather_leaves_next_to_nothing_behind() {
    for (range, level_m) in [(7.5, 5.0), (6.0, 4.2), (3.5, 5.0), (9.6, 4.6), (9.8, 6.0)] {
        let (_, request, plan) = made(&Case::dry(range, level_m));
        let last = request.lawful.windows.iter().rfind(|w| w.window.end() < t(72.0)).unwrap();
        let until = last.window.end() - Span::from_minutes_f64(6.5);
        let n = ((until - t(0.0)).as_minutes() / 5.0) as usize;
        let pairs = request.inflow.values()[..=n].windows(2);
        let inflow: f64 = pairs.map(|p| (p[0] + p[1]) / 2.0 * 300.0).sum();
        let there = (level_m - 3.70) * 7000.0 + inflow;
        let caps = if range < 4.0 { 6.0 * 4800.0 } else { 3.0 * 16_500.0 };
        let share = plan.volume_released.get() / there.min(caps);
        assert!(share >= 0.98, "range {range}: {share}");
        assert!(plan.releases.len() <= 6, "one release a tide: {:?}", plan.releases);
    }
}

/// On a high spring the tide stands over the lagoon as the window opens: pumps help only when the
/// water could not leave otherwise.
#[test]
fn pumps_help_when_gravity_cannot_do_it_and_not_else() {
    let rain = Some((0.0, 45.0, 10.0));
    let wet = Case { rain, surge_m: 1.1, ..Case::dry(10.2, 6.2) };
    let (_, _, with) = made(&wet);
    let (_, _, without) = made(&Case { available: [true, false, false], ..wet });
    assert!(with.energy_kwh > 10.0, "{}", with.energy_kwh);
    assert!(with.cost > 0.0 && without.energy_kwh == 0.0);
    let spill = |p: &Plan| p.shortfalls.iter().map(|s| s.volume.get()).sum::<f64>();
    assert!(spill(&with) < spill(&without) - 100.0, "{} {}", spill(&with), spill(&without));
    let (_, _, dry) = made(&Case::dry(10.2, 4.6));
    assert_eq!(dry.energy_kwh, 0.0);
    let pump = &without.assets[1].slots;
    assert!(pump.len() == 1 && pump[0].why == SlotReason::Unavailable);
}

/// A release that runs goes on: no second stroke, and the tide's volume counts what went before.
#[test]
fn a_running_release_is_carried_on() {
    let case =
        Case { start_h: 4.5, flow_now: 0.855, used: vec![(1, 2000.0)], ..Case::dry(3.5, 5.5) };
    let (_, _, plan) = made(&case);
    let first = &plan.releases[0];
    assert_eq!(first.window.start(), t(4.5));
    assert!((first.volume.get() - 2800.0).abs() < 1e-6, "{first:?}");
    assert_eq!(plan.releases.iter().filter(|r| r.tide == 1).count(), 1);
    let Setpoint::Release { target, .. } = plan.assets[0].slots[0].setpoint else { panic!() };
    assert_eq!(target.get(), 0.855);
}

/// A release that ended is not begun again on its tide for the little that is left of its cap.
#[test]
fn no_second_stroke_for_a_remnant() {
    let case = Case { start_h: 5.0, used: vec![(1, 4760.0)], ..Case::dry(3.5, 4.5) };
    let (_, _, plan) = made(&case);
    assert_eq!(tides(&plan)[0], 2);
    let slot = plan.slot_at(GATE, t(5.2)).unwrap();
    assert_eq!(slot.why, SlotReason::CapReached { clause: TIDE_VOLUME });
}

#[test]
fn a_gate_that_is_not_available_stays_shut_and_says_so() {
    let (_, _, plan) = made(&Case { available: [false, true, true], ..Case::dry(3.5, 6.4) });
    assert_eq!((plan.releases.len(), plan.energy_kwh), (0, 0.0));
    let [slot] = &plan.assets[0].slots[..] else { panic!() };
    assert_eq!((slot.setpoint, &slot.why), (Setpoint::Shut, &SlotReason::Unavailable));
    assert!(!plan.shortfalls.is_empty());
}

/// The month's cap: what is left of it is released and no more, and the next month's begins anew.
#[test]
fn a_month_that_is_nearly_used_up_holds_water_back() {
    let site = site();
    let mut request = request(&site, &Case::dry(3.5, 5.0));
    let month = |from: f64, to: f64| LongCapKind::Fixed(window(from, to));
    let cap = |kind, volume_max: f64, past: f64| LongCap {
        clause: ClauseId(5),
        kind,
        volume_max: CubicMetres::of(volume_max),
        past: vec![(window(-100.0, -98.0), CubicMetres::of(past))],
    };
    request.caps =
        vec![cap(month(-700.0, 36.0), 20_000.0, 12_000.0), cap(month(36.0, 800.0), 20_000.0, 0.0)];
    let plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    let before: f64 =
        plan.releases.iter().filter(|r| r.window.start() < t(36.0)).map(|r| r.volume.get()).sum();
    assert!((before - 8000.0).abs() < 1e-3, "{before}");
    assert!(plan.releases.iter().filter(|r| r.window.start() > t(36.0)).count() == 3);
    let slot = plan.slot_at(GATE, t(high_h(3) + 2.0)).unwrap();
    assert_eq!(slot.why, SlotReason::CapReached { clause: ClauseId(5) });
}

/// The ramp is in the targets: 0.08 m3/s a minute, up from the opening and down to the end.
#[test]
fn the_first_slots_carry_the_ramp() {
    let (_, _, plan) = made(&Case::dry(7.5, 5.5));
    let of = |s: &Slot| match s.setpoint {
        Setpoint::Release { target, openings } => Some((target.get(), openings)),
        _ => None,
    };
    let first: Vec<_> = plan.assets[0].slots.iter().filter_map(of).take(4).collect();
    // From 03:42:51 to 03:45 are 2.15 minutes, then 5 each.
    let wanted = [0.172, 0.572, 0.972, 1.14];
    for ((target, openings), wanted) in first.iter().zip(wanted) {
        assert!((target - wanted).abs() < 1.5e-3, "{first:?}");
        assert!(openings.windows(2).all(|p| p[0] <= p[1]), "{openings:?}");
    }
}

#[test]
fn what_cannot_be_planned_is_refused_by_name() {
    let site = site();
    let good = request(&site, &Case::dry(5.0, 5.0));
    let refused = |spoil: &dyn Fn(&mut PlanRequest, &mut Site)| {
        let (mut request, mut site) = (good.clone(), site.clone());
        spoil(&mut request, &mut site);
        plan(&site, &request).unwrap_err()
    };
    let e = refused(&|r, _| r.outlet = 4);
    assert_eq!(e, PlanError::NoSuchOutlet { outlet: 4, outlets: 1 });
    let e = refused(&|r, _| r.span = window(0.01, 72.0));
    assert!(matches!(e, PlanError::OffGrid { .. }));
    let e = refused(&|r, _| r.span = window(0.0, 0.05));
    assert!(matches!(e, PlanError::TooShort { .. }));
    let e = refused(&|r, _| r.span = window(0.0, 200.0));
    assert!(matches!(e, PlanError::Uncovered { what: "inflow", .. }));
    let e = refused(&|r, _| r.available.clear());
    assert_eq!(e, PlanError::AvailableCount { given: 0, assets: 3 });
    let e = refused(&|r, _| r.level_now = Level::of(3.0));
    assert_eq!(e, PlanError::LevelOutside { level_m: 3.0 });
    let e = refused(&|_, s| s.outlets[0].gate = PUMPS[0]);
    assert!(matches!(e, PlanError::WrongKind { must_be: "gate", .. }));
    let e = refused(&|_, s| s.outlets[0].pumps.push(GATE));
    assert!(matches!(e, PlanError::WrongKind { must_be: "pump", .. }));
    let e = refused(&|_, s| s.storages[0].level_spill = Level::of(3.0));
    assert!(matches!(e, PlanError::LevelsOutOfOrder { .. }));
    let e = refused(&|_, s| s.settings.flow_aim = f64::NAN);
    assert!(matches!(e, PlanError::BadShare { setting: "flow_aim", .. }));
    let e = refused(&|_, s| s.outlets[0].pipe.diameter = Metres::of(0.0));
    assert!(matches!(e, PlanError::Structure { part: "outfall pipe", .. }));
    let e = refused(&|_, s| s.storages[0].curve.truncate(1));
    assert!(matches!(e, PlanError::Structure { part: "storage curve", .. }));
}

/// Pumps with longer runs and few starts change seldom enough, or not at all.
#[test]
fn slow_pumps_keep_their_run_and_their_starts() {
    let mut site = site();
    for asset in &mut site.assets {
        if let AssetKind::Pump(p) = &mut asset.kind {
            (p.run_min, p.rest_min) = (Span::minutes(10), Span::minutes(10));
            p.starts_per_hour_max = 2;
        }
    }
    let rain = Some((0.0, 45.0, 10.0));
    let case = Case { rain, surge_m: 1.1, ..Case::dry(10.2, 6.2) };
    let request = request(&site, &case);
    let plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    assert!(plan.energy_kwh > 10.0, "{}", plan.energy_kwh);
}

#[test]
fn usable_is_where_a_full_storage_has_head_or_pumps_have_lift() {
    let mut site = site();
    let case = Case { surge_m: 1.0, ..Case::dry(10.2, 5.0) };
    let forecast = forecast(&case);
    // High water at 0.7 + 1.0 + 5.1 = 6.8 m; 6.30 m inside balances 6.106 m outside.
    site.outlets[0].pumps.clear();
    let gravity = crate::usable(&site, 0, &forecast);
    assert!(gravity.windows.len() > 6);
    for w in gravity.windows.iter().filter(|w| w.opens == UsableEdge::Head) {
        let level = forecast.places[0].level.at(w.window.start()).unwrap();
        assert!((level - (6.30 - 0.02 * 3.60) / 1.02).abs() < 1e-6, "{level}");
    }
    site.outlets[0].pumps = PUMPS.to_vec();
    let pumped = crate::usable(&site, 0, &forecast);
    assert_eq!(pumped.windows.len(), 1);
    assert_eq!(pumped.windows[0].window, forecast.span);
    assert_eq!(crate::usable(&site, 9, &forecast).windows, []);
}

/// Without 2.5 the first tide after the storm used 2.6 up, and the next could not let out what then
/// spilled: 481 m3, though a plan that keeps 2.5 as well spilled nothing. Found by the law over caps
/// taken away; the repair now tries to hold tides back. A tide held back names the longer cap.
#[test]
fn regress_2_a_tide_is_held_back_for_the_next() {
    let case = Case {
        ranges: (0..10)
            .map(|k| (8.335246838855674 + 0.2843611777 * f64::from(k)).min(10.2))
            .collect(),
        level_m: 4.166094793737051,
        rain: Some((24.4943750879109, 37.97851405055599, 15.478067687344035)),
        surge_m: 0.06276074265060366,
        start_h: 4.5,
        used: vec![(1, 7542.660260163422)],
        past: vec![(window(-6.5, -4.5), CubicMetres::of(10_809.435440672532))],
        available: [true, false, false],
        ..Case::dry(8.3, 4.2)
    };
    let site = site_without(&[TIDE_VOLUME]);
    let request = request(&site, &case);
    let plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    assert_eq!(plan.shortfalls, []);
    let by_rolling = |s: &&Slot| s.why == SlotReason::CapReached { clause: ROLLING };
    assert!(plan.assets[0].slots.iter().any(|s| by_rolling(&s)));
}
