//! The reader finds what is wrong: each finding by a plan that was spoilt in one way.

use model::*;
use units::*;

use super::fixture::*;
use crate::{Finding, audit, plan};

fn spoilt(spoil: impl Fn(&mut Plan, &mut PlanRequest)) -> Vec<Finding> {
    let site = site();
    let mut request = request(&site, &Case::dry(9.6, 4.6));
    let mut plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    spoil(&mut plan, &mut request);
    audit(&site, &request, &plan)
}

fn first_release(plan: &Plan) -> usize {
    let slots = &plan.assets[0].slots;
    slots.iter().position(|s| s.setpoint.is_active()).unwrap()
}

#[test]
fn a_slot_left_out_is_a_gap() {
    let found = spoilt(|p, _| {
        p.assets[0].slots.remove(3);
    });
    assert!(matches!(found[..], [Finding::Gap { asset: GATE, .. }, ..]), "{found:?}");
}

#[test]
fn another_request_is_noticed() {
    let found = spoilt(|_, r| r.level_now = Level::of(4.7));
    assert!(found.contains(&Finding::OtherRequest { what: "request digest" }), "{found:?}");
}

#[test]
fn a_release_before_its_margin_is_outside() {
    let found = spoilt(|p, r| {
        let n = first_release(p);
        let slots = &mut p.assets[0].slots;
        let lawful = r.lawful.holding(slots[n].window.start()).unwrap();
        let early = lawful.window.start() + Span::minutes(1);
        slots[n].window = Window::new(early, slots[n].window.end()).unwrap();
    });
    assert!(found.iter().any(|f| matches!(f, Finding::OutsideWindow { .. })), "{found:?}");
}

#[test]
fn a_window_that_shuts_sooner_finds_the_release_too_late_to_drain() {
    let found = spoilt(|p, r| {
        let end = p.releases[0].window.end();
        let w = r.lawful.windows.iter_mut().find(|w| w.window.contains(end)).unwrap();
        w.window = Window::new(w.window.start(), end + Span::minutes(6)).unwrap();
    });
    assert!(found.iter().any(|f| matches!(f, Finding::OutsideWindow { .. })), "{found:?}");
}

#[test]
fn caps_that_are_smaller_than_what_is_planned() {
    let found = spoilt(|_, r| {
        for w in &mut r.lawful.windows {
            w.volume_max = w.volume_max.map(|c| Cap { max: CubicMetres::of(500.0), ..c });
            w.flow_max = w.flow_max.map(|c| Cap { max: CubicMetresPerSecond::of(0.7), ..c });
        }
        r.caps[0].volume_max = CubicMetres::of(3000.0);
    });
    assert!(found.iter().any(|f| matches!(f, Finding::OverTideCap { .. })), "{found:?}");
    assert!(found.iter().any(|f| matches!(f, Finding::OverFlowCap { .. })));
    assert!(found.iter().any(|f| matches!(f, Finding::OverLongCap { clause: ROLLING, .. })));
}

#[test]
fn a_ramp_cap_that_is_smaller_than_the_ramp() {
    let found = spoilt(|_, r| {
        for w in &mut r.lawful.windows {
            let tenth = |c: Cap<CubicMetresPerSecond>| Cap { max: c.max * 0.1, ..c };
            w.ramp_max_per_min = w.ramp_max_per_min.map(tenth);
        }
    });
    assert!(found.iter().any(|f| matches!(f, Finding::OverRamp { .. })), "{found:?}");
}

#[test]
fn a_higher_tide_than_planned_for_leaves_no_head() {
    let found = spoilt(|_, r| {
        let up: Vec<f64> = r.outer_level.values().iter().map(|l| l + 6.0).collect();
        r.outer_level = Series::new(r.outer_level.start(), r.outer_level.step(), up).unwrap();
    });
    assert!(found.iter().any(|f| matches!(f, Finding::HeadGone { .. })), "{found:?}");
}

#[test]
fn water_that_no_slot_explains_and_sums_that_do_not_add_up() {
    let found = spoilt(|p, _| {
        let mut levels = p.level.values().to_vec();
        levels[2] -= 0.05;
        p.level = Series::new(p.level.start(), p.level.step(), levels).unwrap();
        p.volume_released = p.volume_released + CubicMetres::of(1.0);
    });
    assert!(found.iter().any(|f| matches!(f, Finding::Unexplained { .. })), "{found:?}");
    let off = |f: &Finding| matches!(f, Finding::Unbalanced { what: "volume released", .. });
    assert!(found.iter().any(off), "{found:?}");
}

#[test]
fn a_pump_by_itself_and_a_pump_for_a_minute() {
    let found = spoilt(|p, _| {
        let start = p.span.start();
        let minute = Window::new(start, start + Span::minutes(1)).unwrap();
        let slots = &mut p.assets[1].slots;
        let rest = slots[0].clone();
        slots[0].window = Window::new(minute.end(), rest.window.end()).unwrap();
        let (setpoint, why) = (Setpoint::Running, SlotReason::Assisting);
        slots.insert(0, Slot { window: minute, setpoint, why, tide: Some(1) });
    });
    assert!(found.iter().any(|f| matches!(f, Finding::PumpWithoutGate { .. })), "{found:?}");
    assert!(found.iter().any(|f| matches!(f, Finding::TooShort { .. })), "{found:?}");
}

#[test]
fn an_asset_that_is_not_available_and_a_setpoint_that_does_not_fit() {
    let found = spoilt(|p, r| {
        r.available[0] = false;
        let n = first_release(p);
        p.assets[0].slots[n].why = SlotReason::StorageLow;
    });
    assert!(found.iter().any(|f| matches!(f, Finding::Unavailable { asset: GATE, .. })));
    assert!(found.iter().any(|f| matches!(f, Finding::WrongSetpoint { asset: GATE, .. })));
}
