//! Each rule must be able to fail: one planted violation each, and nothing else found.

use units::{Span, Window};

use super::judge;
use crate::fixture::{boot, good_run, minute, plant, ramped, rules, run_with};
use crate::{Barred, EventKind, Finding, Foresight, Line, Run, Sample, foresight, lost};

fn findings(run: &Run) -> Vec<Finding> {
    judge(run, &rules()).findings
}

fn opened(at: i64) -> EventKind {
    let lease_end = boot(minute(at) + Span::seconds(120));
    EventKind::Driven { asset: 0, setting_percent: 60.0, lease_end }
}

#[test]
fn a_lawful_run_has_no_finding_and_its_sums_are_right() {
    let run = good_run();
    let report = judge(&run, &rules());
    assert_eq!(report.findings, []);
    let by_hand = 2.0 * (75.0 * 0.5 * 60.0);
    assert!((report.totals.released_m3 - by_hand).abs() < 1e-6, "{}", report.totals.released_m3);
    assert_eq!((report.totals.releases, report.totals.outside_window_m3), (2, 0.0));
    assert!((report.totals.inflow_m3 - 8_640.0).abs() < 1e-6);
    assert!((report.totals.flow_mean_max_m3_s - 0.5).abs() < 1e-9);
    assert!((report.totals.rolling_max_m3 - by_hand).abs() < 1e-6);
    assert!(report.to_string().contains("findings                           0"));
}

#[test]
fn flow_after_the_window_is_found_with_its_volume() {
    let run = run_with(|n| ramped(n, 310, 425, 0.4));
    let found = findings(&run);
    let [Finding::FlowOutsideWindow { from, to, volume_m3 }] = found[..] else {
        panic!("{found:?}")
    };
    assert_eq!((from, to), (minute(420), minute(425)));
    assert!((volume_m3 - (0.4 + 0.4 + 0.3 + 0.2 + 0.1) * 60.0).abs() < 1e-9, "{volume_m3}");
    // Five litres a second are still water.
    let drip = run_with(|n| if (500..510).contains(&n) { 0.004 } else { 0.0 });
    assert_eq!(findings(&drip), []);
}

#[test]
fn flow_without_any_event_is_found_too() {
    let mut run = run_with(|n| ramped(n, 500, 520, 0.3));
    run.events.clear();
    assert!(matches!(findings(&run)[..], [Finding::FlowOutsideWindow { .. }]));
}

#[test]
fn a_mean_over_the_flow_cap_is_found_and_a_short_peak_is_not() {
    let long = run_with(|n| ramped(n, 310, 360, 1.05));
    let found = findings(&long);
    assert!(!found.is_empty());
    assert!(found.iter().all(|f| matches!(f, Finding::FlowOverCap { .. })), "{found:?}");
    let short = run_with(|n| ramped(n, 310, 336, 1.3));
    assert_eq!(findings(&short), [], "the mean of 15 min stays under 1 m3/s");
}

#[test]
fn a_step_of_flow_is_found_but_not_while_it_goes_to_rest() {
    let step = |n: i64| if (320..360).contains(&n) { 0.3 } else { 0.0 };
    let mut run = run_with(step);
    let found = findings(&run);
    assert!(matches!(found[..], [Finding::RampOverCap { .. }, Finding::RampOverCap { .. }]));
    plant(&mut run, minute(359), EventKind::RestBegun { asset: 0 });
    plant(&mut run, minute(361), EventKind::RestDone { asset: 0 });
    let found = findings(&run);
    let [Finding::RampOverCap { at, .. }] = found[..] else { panic!("{found:?}") };
    assert_eq!(at, minute(320));
}

#[test]
fn volumes_over_the_caps_of_tide_span_and_month_are_found() {
    let one = run_with(|n| ramped(n, 310, 400, 0.7));
    let found = findings(&one);
    let [Finding::TideOverCap { tide: 0, volume_m3, .. }] = found[..] else { panic!("{found:?}") };
    assert!((volume_m3 - 83.0 * 0.7 * 60.0).abs() < 1e-6, "{volume_m3}");
    let both = run_with(|n| ramped(n, 310, 390, 0.665) + ramped(n, 1030, 1110, 0.665));
    let rolling = |f: &&Finding| matches!(f, Finding::RollingOverCap { .. });
    let found = findings(&both);
    assert_eq!(found.iter().filter(rolling).count(), found.len());
    assert!(!found.is_empty());
    let mut looser = rules();
    looser.rolling = None;
    looser.fixed[0].volume_max_m3 = 5_850.0;
    let found = judge(&both, &looser).findings;
    assert!(matches!(found[..], [Finding::FixedOverCap { .. }]), "{found:?}");
}

fn against_the_head() -> Run {
    let mut run = good_run();
    run.samples.iter_mut().for_each(|s| s.outer_m = 5.5);
    run
}

#[test]
fn opening_against_the_head_is_found_unless_a_pump_helps_in_time() {
    let told = EventKind::RestTold { asset: 0 };
    let shut = |run: &mut Run| {
        plant(run, minute(201), told.clone());
        plant(run, minute(201), EventKind::RestBegun { asset: 0 });
        plant(run, minute(202), EventKind::RestDone { asset: 0 });
    };
    let mut run = against_the_head();
    plant(&mut run, minute(200), opened(200));
    shut(&mut run);
    let found = findings(&run);
    assert!(matches!(found[..], [Finding::PastInterlock { asset: 0, .. }]), "{found:?}");
    let mut late = run.clone();
    late.samples[204].pumps_run = 1;
    assert_eq!(findings(&late).len(), 1, "four minutes are too late");
    run.samples[203].pumps_run = 1;
    assert_eq!(findings(&run), []);
    let mut with_head = good_run();
    plant(&mut with_head, minute(200), opened(200));
    shut(&mut with_head);
    assert_eq!(findings(&with_head), []);
}

#[test]
fn a_command_under_a_lock_or_a_panel_or_without_feedback_is_found() {
    let mut barred = rules();
    let window = Window::new(minute(190), minute(210)).unwrap();
    barred.barred.push(Barred { asset: 0, window, why: "locked out".to_owned() });
    let mut run = good_run();
    plant(&mut run, minute(200), EventKind::DriveRefused { asset: 0 });
    let found = judge(&run, &barred).findings;
    assert!(matches!(&found[..], [Finding::PastInterlock { why, .. }] if why == "locked out"));
    assert_eq!(findings(&run), [], "refused by the plant, but nothing barred it");
    plant(&mut run, minute(195), EventKind::LocalTaken { asset: 0 });
    assert!(matches!(findings(&run)[..], [Finding::PastInterlock { .. }]));
    plant(&mut run, minute(198), EventKind::LocalGiven { asset: 0 });
    assert_eq!(findings(&run), []);
}

#[test]
fn a_pump_with_its_way_shut_or_no_water_is_found() {
    let runs = EventKind::Driven {
        asset: 1,
        setting_percent: 100.0,
        lease_end: boot(minute(350) + Span::seconds(120)),
    };
    let rested = |run: &mut Run| {
        plant(run, minute(351), EventKind::RestBegun { asset: 1 });
        plant(run, minute(351), EventKind::RestDone { asset: 1 });
    };
    let mut open = good_run();
    plant(&mut open, minute(350), runs.clone());
    rested(&mut open);
    assert_eq!(findings(&open), []);
    let mut dry = open.clone();
    dry.samples[350].level_m = 3.6;
    assert!(matches!(findings(&dry)[..], [Finding::PastInterlock { asset: 1, .. }]));
    let mut shut = open;
    shut.samples[350].gate_percent = 1.0;
    shut.samples[351].gate_percent = 1.0;
    assert!(matches!(findings(&shut)[..], [Finding::PastInterlock { asset: 1, .. }]));
}

#[test]
fn a_rest_that_begins_after_the_lease_or_never_is_found() {
    let mut run = good_run();
    plant(&mut run, minute(320), opened(320));
    let end = minute(322);
    assert!(matches!(findings(&run)[..], [Finding::RestNotBegun { asset: 0, .. }]), "never");
    let mut in_time = run.clone();
    plant(&mut in_time, end, EventKind::RestBegun { asset: 0 });
    plant(&mut in_time, end + Span::minutes(5), EventKind::RestDone { asset: 0 });
    let report = judge(&in_time, &rules());
    assert_eq!((report.findings, report.totals.leases_run_out), (Vec::new(), 1));
    // A controller whose timer is read to the microsecond is a hair early, and has run out still.
    let mut early = run.clone();
    plant(&mut early, end, EventKind::RestBegun { asset: 0 });
    plant(&mut early, end + Span::minutes(5), EventKind::RestDone { asset: 0 });
    let begun = early.events.iter_mut().find(|e| e.kind == EventKind::RestBegun { asset: 0 });
    begun.unwrap().boot = units::Mono::from_nanos(boot(end).as_nanos() - 900);
    assert_eq!(judge(&early, &rules()).totals.leases_run_out, 1);
    let mut late = run.clone();
    plant(&mut late, end + Span::seconds(2), EventKind::RestBegun { asset: 0 });
    plant(&mut late, end + Span::minutes(5), EventKind::RestDone { asset: 0 });
    let found = findings(&late);
    let [Finding::RestNotBegun { late, .. }] = found[..] else { panic!("{found:?}") };
    assert_eq!(late, Span::seconds(2));
    // A renewal moves the end.
    let lease_end = boot(minute(325));
    plant(&mut run, minute(321), EventKind::Renewed { asset: 0, lease_end });
    plant(&mut run, minute(325), EventKind::RestBegun { asset: 0 });
    plant(&mut run, minute(330), EventKind::RestDone { asset: 0 });
    assert_eq!(findings(&run), []);
}

#[test]
fn a_rest_that_takes_longer_than_the_stroke_is_found_but_for_a_jam() {
    let mut run = good_run();
    plant(&mut run, minute(320), EventKind::RestBegun { asset: 0 });
    assert!(matches!(findings(&run)[..], [Finding::RestNotDone { .. }]), "never done");
    plant(&mut run, minute(329), EventKind::RestDone { asset: 0 });
    let found = findings(&run);
    let [Finding::RestNotDone { late, .. }] = found[..] else { panic!("{found:?}") };
    assert_eq!(late, Span::minutes(1));
    plant(&mut run, minute(322), EventKind::JamBegun);
    plant(&mut run, minute(325), EventKind::JamEnded);
    let report = judge(&run, &rules());
    assert_eq!((report.findings, report.totals.rests_behind_jam), (Vec::new(), 1));
}

#[test]
fn a_jam_that_is_over_excuses_no_longer_than_a_stroke() {
    let mut run = good_run();
    plant(&mut run, minute(320), EventKind::RestBegun { asset: 0 });
    plant(&mut run, minute(322), EventKind::JamBegun);
    assert_eq!(findings(&run), [], "while it stands nothing can move");
    plant(&mut run, minute(340), EventKind::JamEnded);
    let found = findings(&run);
    let [Finding::RestNotDone { at, .. }] = found[..] else { panic!("never done: {found:?}") };
    assert_eq!(at, minute(348));
    plant(&mut run, minute(349), EventKind::RestDone { asset: 0 });
    let report = judge(&run, &rules());
    let [Finding::RestNotDone { late, .. }] = report.findings[..] else { panic!("{report}") };
    assert_eq!((late, report.totals.rests_behind_jam), (Span::minutes(1), 1));
    // A rest that begins behind a jam is excused alike.
    let mut behind = good_run();
    plant(&mut behind, minute(320), EventKind::JamBegun);
    plant(&mut behind, minute(330), EventKind::RestBegun { asset: 0 });
    plant(&mut behind, minute(340), EventKind::JamEnded);
    plant(&mut behind, minute(348), EventKind::RestDone { asset: 0 });
    assert_eq!(findings(&behind), []);
}

#[test]
fn a_record_that_cannot_be_judged_never_passes() {
    let refused = |why: &str, spoil: &dyn Fn(&mut Run)| {
        let mut run = good_run();
        spoil(&mut run);
        let found = findings(&run);
        assert!(!found.is_empty(), "{why}: passed");
        let all =
            found.iter().all(|f| matches!(f, Finding::Unjudgeable { why: w } if w.contains(why)));
        assert!(all, "{why}: {found:?}");
    };
    refused("0 samples", &|run| *run = Run::default());
    refused("1 samples", &|run| run.samples.truncate(1));
    let spoils: [fn(&mut Sample) -> &mut f64; 7] = [
        |s| &mut s.level_m,
        |s| &mut s.outer_m,
        |s| &mut s.gate_percent,
        |s| &mut s.ports_m3_s,
        |s| &mut s.inflow_m3_s,
        |s| &mut s.released_m3,
        |s| &mut s.spilled_m3,
    ];
    for of in spoils {
        refused("no number", &|run| *of(&mut run.samples[500]) = f64::NAN);
    }
    refused("sample of 2027-05-01T00:01", &|run| run.samples.swap(1, 2));
    refused("a total falls", &|run| run.samples[1440].released_m3 = 0.0);
    refused("a total falls", &|run| run.samples[3].spilled_m3 = 1.0);
    refused("the event of", &|run| run.events.reverse());
    refused("an unknown asset", &|run| plant(run, minute(9), EventKind::RestTold { asset: 2 }));
    let mut crossed = rules();
    crossed.lawful.swap(0, 1);
    let found = judge(&good_run(), &crossed).findings;
    assert!(matches!(&found[..], [Finding::Unjudgeable { why }] if why.contains("cross")));
}

#[test]
fn a_spill_is_avoidable_only_where_a_lawful_minute_went_unused() {
    let spill = |run: &mut Run| {
        run.samples.iter_mut().skip(600).for_each(|s| s.spilled_m3 = 7.0);
    };
    let mut idle = run_with(|_| 0.0);
    spill(&mut idle);
    let found = findings(&idle);
    let [Finding::AvoidableSpill { at, volume_m3, unused }] = found[..] else {
        panic!("{found:?}")
    };
    assert_eq!((at, volume_m3, unused), (minute(599), 7.0, minute(300)));
    // The whole cap of the tide was used: nothing more could be done.
    let mut used = run_with(|n| ramped(n, 302, 414, 0.466));
    spill(&mut used);
    let report = judge(&used, &rules());
    assert!(report.totals.released_m3 > 2_990.0, "{}", report.totals.released_m3);
    assert_eq!((report.findings, report.totals.spilled_m3), (Vec::new(), 7.0));
    // No head: nothing could be done either.
    let mut tide_too_high = idle;
    tide_too_high.samples.iter_mut().for_each(|s| s.outer_m = 6.0);
    assert_eq!(findings(&tide_too_high), []);
}

/// By hand: 5 m to 3.7 m of a storage of 1,000 m2 and 0.1 m3/s of inflow.
#[test]
fn foresight_takes_all_that_caps_and_water_allow() {
    let run = good_run();
    let wide = |_: f64, _: f64| 9.0;
    let storage = [(3.0, 0.0), (8.0, 50_000.0)];
    let works = Foresight { storage: &storage, capacity_m3_s: &wide };
    // 3,000 m3 on each tide, but 5,800 m3 in any 24 h.
    assert!((foresight(&run, &rules(), &works) - 5_800.0).abs() < 1e-6);
    // Little water: 1,300 m3 and 0.1 m3/s up to the end of the second window, minute 1140.
    let small = [(3.0, 0.0), (8.0, 5_000.0)];
    let works = Foresight { storage: &small, capacity_m3_s: &wide };
    let by_hand = 1_300.0 + 1140.0 * 6.0;
    let mut free = rules();
    (free.rolling, free.fixed) = (None, Vec::new());
    free.tides.iter_mut().for_each(|t| t.volume_max_m3 = 9_000.0);
    assert!((foresight(&run, &free, &works) - by_hand).abs() < 1e-6);
    // A narrow pipe: 0.2 m3/s for two windows of two hours.
    let narrow = |_: f64, _: f64| 0.2;
    let works = Foresight { storage: &storage, capacity_m3_s: &narrow };
    assert!((foresight(&run, &free, &works) - 0.2 * 14_400.0).abs() < 1e-6);
}

#[test]
fn a_row_that_is_missing_or_changed_is_lost() {
    let line = |seq, text| Line { seq, text };
    let kept = [line(1, "a"), line(2, "b"), line(3, "c")];
    assert_eq!(lost(&[line(1, "a"), line(3, "c")], &kept), Vec::<u64>::new());
    assert_eq!(lost(&[line(2, "x"), line(4, "d")], &kept), [2, 4]);
}
