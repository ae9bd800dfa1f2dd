//! Each rule can fail: a calm run has no finding, and each planted fault has its own.

use units::{Mono, Span, Utc, Window};

use crate::*;

fn t(minute: i64) -> Utc {
    Utc::EPOCH + Span::minutes(minute)
}

fn boot(minute: i64) -> Mono {
    Mono::ZERO + Span::minutes(minute)
}

fn rules() -> Rules {
    Rules {
        allowed: vec![Allowed {
            window: Window::new(t(30), t(210)).unwrap(),
            flow_max_m3_s: 1.2,
            volume_max_m3: 9000.0,
        }],
        current_min_m_s: 0.1,
        averaging: Span::minutes(15),
        rolling: Span::hours(24),
        rolling_max_m3: 16_500.0,
        months: vec![(Window::new(t(0), t(100_000)).unwrap(), 380_000.0)],
        level_low_m: 3.7,
        stroke: Span::minutes(8),
        port_centre_m: -3.6,
        density_excess: 0.02,
    }
}

/// 400 minutes: 1 m3/s from minute 60 to 160.
fn calm() -> Vec<Sample> {
    flow(|m| if (60..160).contains(&m) { 1.0 } else { 0.0 })
}

fn flow(q: impl Fn(i64) -> f64) -> Vec<Sample> {
    let mut released_m3 = 0.0;
    (0..400)
        .map(|m| {
            let s = Sample {
                utc: t(m),
                level_m: 5.0,
                volume_m3: 11_200.0,
                outer_m: 1.0,
                gate_percent: if q(m) > 0.0 { 20.0 } else { 0.0 },
                pump_runs: false,
                ports_m3_s: q(m),
                spill_m3_s: 0.0,
                inflow_m3_s: 0.1,
                current_m_s: 1.0,
                released_m3,
                spilled_m3: 0.0,
            };
            released_m3 += q(m) * 60.0;
            s
        })
        .collect()
}

fn events() -> Vec<Event> {
    let e = |m, kind| Event { utc: t(m), boot: boot(m), asset: 0, kind };
    vec![
        e(59, Kind::Driven { setting_percent: 20.0, lease_end: boot(160) }),
        e(160, Kind::LeaseOut { lease_end: boot(160) }),
        e(160, Kind::RestBegun),
        e(162, Kind::RestDone),
    ]
}

#[test]
fn a_calm_run_has_no_finding_and_its_sums() {
    let j = judge(&calm(), &events(), &rules());
    assert_eq!(j.findings, []);
    assert_eq!((j.releases, j.released_m3, j.outside_m3), (1, 6000.0, 0.0));
}

#[test]
fn water_outside_the_window_or_against_the_current_is_found() {
    let late = flow(|m| if (60..212).contains(&m) { 0.5 } else { 0.0 });
    let j = judge(&late, &[], &rules());
    assert_eq!(j.of(Rule::OutsideWindow), 2);
    assert_eq!(j.outside_m3, 60.0);
    let mut turned = calm();
    turned[100].current_m_s = 0.09;
    assert_eq!(judge(&turned, &events(), &rules()).of(Rule::OutsideWindow), 1);
}

#[test]
fn each_cap_on_flow_and_volume_is_judged() {
    let fast = flow(|m| if (60..160).contains(&m) { 1.21 } else { 0.0 });
    assert!(judge(&fast, &events(), &rules()).of(Rule::Flow) > 0);
    let mut small = rules();
    small.allowed[0].volume_max_m3 = 5_990.0;
    assert_eq!(judge(&calm(), &events(), &small).of(Rule::TideVolume), 1);
    let rolling = Rules { rolling_max_m3: 5_000.0, ..rules() };
    assert!(judge(&calm(), &events(), &rolling).of(Rule::RollingVolume) > 0);
    let mut month = rules();
    month.months[0].1 = 5_000.0;
    assert_eq!(judge(&calm(), &events(), &month).of(Rule::MonthVolume), 1);
}

#[test]
fn an_opening_against_the_head_is_found_unless_a_pump_follows() {
    let mut high = calm();
    high.iter_mut().for_each(|s| s.outer_m = 5.5);
    high[59].gate_percent = 0.0;
    assert_eq!(judge(&high, &events(), &rules()).of(Rule::PastInterlock), 1);
    high[61].pump_runs = true;
    assert_eq!(judge(&high, &events(), &rules()).of(Rule::PastInterlock), 0);
}

#[test]
fn a_rest_that_is_late_or_never_done_is_found_unless_the_gate_is_jammed() {
    let mut late = events();
    late[2].boot = boot(161);
    assert_eq!(judge(&calm(), &late, &rules()).of(Rule::RestLate), 1);
    let mut undone = events();
    undone.pop();
    assert_eq!(judge(&calm(), &undone, &rules()).of(Rule::RestNotDone), 1);
    let jam = Event { utc: t(150), boot: boot(150), asset: 0, kind: Kind::JamBegun };
    undone.insert(1, jam);
    assert_eq!(judge(&calm(), &undone, &rules()).of(Rule::RestNotDone), 0);
}

#[test]
fn a_gate_that_opens_without_a_lease_is_found() {
    assert_eq!(judge(&calm(), &[], &rules()).of(Rule::NoLease), 1);
}

#[test]
fn a_spill_is_avoidable_where_a_lawful_way_was_left_unused() {
    let spill = |mut run: Vec<Sample>| {
        for (n, s) in run.iter_mut().enumerate() {
            s.spilled_m3 = if n > 300 { 50.0 } else { 0.0 };
        }
        judge(&run, &[], &rules()).avoidable_spill_m3
    };
    assert_eq!(spill(flow(|_| 0.0)), 50.0);
    // The whole allotment was used: nobody could have done more.
    assert_eq!(spill(flow(|m| if (30..210).contains(&m) { 0.83 } else { 0.0 })), 0.0);
}

#[test]
fn foresight_moves_what_caps_and_head_allow_and_no_more() {
    let run = flow(|_| 0.0);
    let level = |v: f64| 3.4 + v / 7000.0;
    let most = |capacity: f64| {
        most_movable_m3(&run, &rules(), &|_, _| capacity, &level, 2_100.0, 22_400.0)
    };
    assert_eq!(most(0.5), 0.5 * 180.0 * 60.0);
    assert_eq!(most(9.0), 9_000.0);
}
