//! Each kind of clause, by the rule that it protects.

mod facts;
mod guarding;
mod looking_back;
mod sums;
mod windows;

use model::*;
use proptest::prelude::*;
use units::*;

use crate::fixture::{GATE, bands, clause, forecast, permit, site, t, window};
use crate::*;

fn bucket(at: Utc) -> Window {
    let start = at.floor_to(Span::minutes(5));
    Window::new(start, start + Span::minutes(5)).unwrap()
}

fn ammonia(value: f64, age: Span, now: Utc) -> Vec<Validated> {
    let good = Some(GoodValue { value, at: now - age, age });
    vec![Validated { quality: Quality::Good, good }]
}

fn guarded(site: &Site, f: &Forecast, tallies: &Tallies, now: Utc, nh4: &[Validated]) -> Guarded {
    let conditions = Conditions {
        now,
        signals: nh4,
        forecast: Some(f),
        lawful: None,
        tallies,
        recent_flow: &[],
    };
    guard(site, &conditions, GATE, Phase::Starting)
}

fn numbers(site: &Site, causes: &[Cause]) -> Vec<String> {
    let number = |c: &Cause| match c.by {
        By::Clause(id) => site.licence.clause(id).number.clone(),
        _ => panic!("a guard speaks for clauses only"),
    };
    causes.iter().map(number).collect()
}

#[test]
fn every_edge_names_its_clause_and_the_water_moves_no_predicted_edge() {
    let s = site(permit());
    let l = lawful(&s, &forecast(&[6.0, 6.0]), GATE);
    assert_eq!(l.windows.len(), 2);
    let w = &l.windows[0];
    // High water 03:00: 2.2 would open at 03:30, but the current runs seaward from about 03:36.
    assert_eq!(w.shuts.at, t(6.5));
    assert_eq!((w.shuts.clause, w.shuts.anchor), (Some(ClauseId(0)), EdgeAnchor::Predicted));
    assert_eq!((w.opens.clause, w.opens.anchor), (Some(ClauseId(1)), EdgeAnchor::Modelled));
    assert_eq!(w.opens.time_sd, Span::minutes(5));
    assert_eq!(w.volume_max, Some(Cap { max: CubicMetres::of(9000.0), clause: ClauseId(3) }));
}

#[test]
fn without_a_clause_the_windows_change() {
    let all = lawful(&site(permit()), &forecast(&[6.0]), GATE);
    for gone in [0, 1] {
        let clauses = permit().into_iter().filter(|c| c.id != ClauseId(gone)).collect::<Vec<_>>();
        let mut fewer = site(clauses);
        // Ids are indices: keep them so by an empty clause in its place.
        let nothing = ClauseKind::SignalGate { conditions: vec![], applies: Applies::ToStart };
        fewer.licence.clauses.insert(usize::from(gone), clause(gone, "none", nothing));
        assert_ne!(lawful(&fewer, &forecast(&[6.0]), GATE).windows, all.windows);
    }
}

#[test]
fn the_knife_edge_of_the_rounding_decides_a_tide() {
    let s = site(permit());
    // Rounded to 0.1 m, halves upward, as the scenario's clause 2.5 has it.
    let cases = [
        (2.128, None),
        (2.148, None),
        (2.149, None),
        (2.15, Some(4800.0)),
        (3.934, Some(4800.0)),
        (3.949, Some(4800.0)),
        (3.95, Some(9000.0)),
        (1.89, None),
    ];
    for (range, volume) in cases {
        let l = lawful(&s, &forecast(&[range]), GATE);
        let got = l.windows.first().and_then(|w| w.volume_max).map(|c| c.max.get());
        assert_eq!(got, volume, "range {range}");
        assert_eq!(l.nil.len(), usize::from(volume.is_none()));
    }
    let l = lawful(&s, &forecast(&[2.128]), GATE);
    assert_eq!(l.nil[0].range_rounded, Metres::of(2.1));
}

#[test]
fn a_small_tide_has_its_own_flow_cap() {
    let l = lawful(&site(permit()), &forecast(&[3.0, 5.0]), GATE);
    let flow = |n: usize| l.windows[n].flow_max.map(|c| (c.max.get(), c.clause));
    assert_eq!(flow(0), Some((0.9, ClauseId(3))));
    assert_eq!(flow(1), Some((1.2, ClauseId(2))));
}

#[test]
fn windows_are_half_open_for_the_guard() {
    let (s, f) = (site(permit()), forecast(&[6.0, 6.0]));
    let none = Tallies::default();
    let holds = |at: Utc| {
        let nh4 = ammonia(2.0, Span::minutes(1), at);
        numbers(&s, &guarded(&s, &f, &none, at, &nh4).causes)
    };
    assert_eq!(holds(t(5.0)), Vec::<String>::new());
    assert_eq!(holds(t(6.5) - Span::micros(1)), Vec::<String>::new());
    assert_eq!(holds(t(6.5)), ["2.2"]);
    assert_eq!(holds(t(3.2)), ["2.2", "2.3"]);
}

#[test]
fn a_stale_or_high_reading_holds_and_says_so() {
    let (mut s, f) = (site(permit()), forecast(&[6.0]));
    let none = Tallies::default();
    let holds = |s: &Site, value: f64, age: i64| {
        let nh4 = ammonia(value, Span::minutes(age), t(5.0));
        guarded(s, &f, &none, t(5.0), &nh4)
    };
    assert!(holds(&s, 5.0, 30).causes.is_empty());
    assert_eq!(numbers(&s, &holds(&s, 5.1, 1).causes), ["2.10"]);
    assert_eq!(numbers(&s, &holds(&s, 2.0, 31).causes), ["2.10"]);
    s.licence.clauses[6].governs[0].on_stale = OnStale::Allow;
    assert!(holds(&s, 2.0, 31).causes.is_empty());
    let reduced = CubicMetresPerSecond::of(0.3);
    s.licence.clauses[6].governs[0].on_stale = OnStale::Reduced(reduced);
    let g = holds(&s, 2.0, 31);
    assert_eq!(g.flow_max, Some(Cap { max: reduced, clause: ClauseId(6) }));
}

#[test]
fn the_third_of_three_releases_is_cut_by_any_24_hours() {
    // C13: three windows of 400 m3 in 24 h under a rolling cap of 1,000: 200 are left.
    let cap =
        ClauseKind::RollingVolume { span: Span::hours(24), volume_max: CubicMetres::of(1000.0) };
    let s = site(vec![clause(0, "1", cap)]);
    let mut sums = Tallies::default();
    sums.add(bucket(t(1.0)), CubicMetres::of(400.0), 0);
    sums.add(bucket(t(9.0)), CubicMetres::of(400.0), 1);
    let left = |at: f64| {
        let g = guarded(&s, &forecast(&[6.0]), &sums, t(at), &[]);
        g.volume_left.map(|c| c.max.get())
    };
    assert_eq!(left(17.0), Some(200.0));
    assert_eq!(left(25.0), Some(200.0));
    assert_eq!(left(25.1), Some(600.0));
}

#[test]
fn a_calendar_month_is_counted_in_local_time() {
    let at = |mo, d, h| Utc::from_civil(2027, mo, d, h, 0, 0).unwrap();
    let changes = vec![(at(3, 28, 1), 3600), (at(10, 31, 1), 0)];
    let cap = ClauseKind::MonthVolume { volume_max: CubicMetres::of(1000.0) };
    let mut s = site(vec![clause(0, "1", cap)]);
    s.zone = ZoneRules::new("Europe/London", "test", 0, changes);
    let mut sums = Tallies::default();
    // 23:30 UTC on 30 June is 00:30 on 1 July by the local clock.
    sums.add(bucket(at(6, 30, 23) + Span::minutes(30)), CubicMetres::of(300.0), 0);
    let used = |now| {
        let g = guarded(&s, &forecast(&[6.0]), &sums, now, &[]);
        g.volume_left.map(|c| 1000.0 - c.max.get())
    };
    assert_eq!(used(at(6, 30, 22)), Some(0.0));
    assert_eq!(used(at(7, 2, 12)), Some(300.0));
}

#[test]
fn the_mean_over_any_fifteen_minutes_is_held() {
    let s = site(permit());
    let f = forecast(&[6.0]);
    let nh4 = ammonia(2.0, Span::ZERO, t(5.0));
    let mean = |flow: f64| {
        let pieces = [(window(4.5, 5.0), flow)];
        let tallies = Tallies::default();
        let c = Conditions {
            now: t(5.0),
            signals: &nh4,
            forecast: Some(&f),
            lawful: None,
            tallies: &tallies,
            recent_flow: &pieces,
        };
        numbers(&s, &guard(&s, &c, GATE, Phase::Running).causes)
    };
    assert_eq!(mean(1.2), Vec::<String>::new());
    assert_eq!(mean(1.21), ["2.4"]);
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn prop_rolling_sum_equals_brute_force(
        list in prop::collection::vec((0..600_i64, 0.0..500.0_f64), 0..60),
        ask in 0..800_i64,
    ) {
        let five = Span::minutes(5);
        let mut sums = Tallies::default();
        let mut slots = vec![0.0; 800];
        for (slot, v) in list {
            sums.add(bucket(t(0.0) + five * slot), CubicMetres::of(v), 0);
            slots[slot as usize] += v;
        }
        let from = (ask - 288).max(0) as usize;
        let brute: f64 = slots[from..ask as usize].iter().sum();
        let got = sums.rolling(Span::hours(24), t(0.0) + five * ask).get();
        prop_assert!((got - brute).abs() < 1e-6, "{got} {brute}");
    }

    /// Minute by minute, a window is lawful exactly where each clause by itself says so.
    #[test]
    fn prop_windows_equal_each_clause_minute_by_minute(
        ranges in prop::collection::vec(1.5..8.0_f64, 2..5), offset in -60..60_i64,
    ) {
        let mut clauses = permit();
        let ClauseKind::TideWindow { from, to, .. } = &mut clauses[0].kind else { panic!() };
        *from = Span::minutes(30 + offset);
        *to = Span::minutes(210 + offset);
        let (from, to) = (*from, *to);
        let s = site(clauses);
        let f = forecast(&ranges);
        let l = lawful(&s, &f, GATE);
        let minutes = f.span.length().as_minutes() as i64;
        for m in 0..minutes {
            let at = f.span.start() + Span::minutes(m);
            let mut highs = f.places[0].turns.iter().filter(|h| h.kind == TurnKind::High);
            let by_hw = highs.any(|h| h.at + from <= at && at < h.at + to);
            let seaward = f.places[0].current.as_ref().unwrap().at(at).unwrap() >= 0.1;
            let tide = f.tide_at(at);
            // Half up to 0.1 m, written another way: 2.15 and over is 2.2.
            let some = tide.is_some_and(|t| t.ebb_range.get() >= 2.15 - 1e-9);
            prop_assert_eq!(l.holding(at).is_some(), by_hw && seaward && some, "{}", at);
        }
    }

    #[test]
    fn prop_bands_agree_with_text_rounding(range in 0.0..12.0_f64) {
        let ClauseKind::VolumePerTide { rounding, .. } = bands() else { panic!() };
        // Away from exact halves, rounding by text formatting must agree.
        prop_assume!(((range * 10.0).fract() - 0.5).abs() > 1e-6);
        let text: f64 = format!("{range:.1}").parse().unwrap();
        prop_assert_eq!(rounded(Metres::of(range), rounding.step), (text * 10.0).round() as i64);
    }
}
