//! Sums: which bucket, which tide, which day and month a volume belongs to.

use super::*;

fn m3(v: f64) -> CubicMetres {
    CubicMetres::of(v)
}

fn minutes(from: i64, to: i64) -> Window {
    Window::new(t(0.0) + Span::minutes(from), t(0.0) + Span::minutes(to)).unwrap()
}

#[test]
fn a_volume_is_spread_over_the_buckets_that_it_ran_through() {
    let mut sums = Tallies::default();
    // 03:00 to 12:00 is 2 + 5 + 2 minutes of three buckets.
    sums.add(minutes(3, 12), m3(90.0), 7);
    let parts = [minutes(0, 5), minutes(5, 10), minutes(10, 15)].map(|w| sums.in_window(&w).get());
    for (got, want) in parts.iter().zip([20.0, 50.0, 20.0]) {
        assert!((got - want).abs() < 1e-9, "{parts:?}");
    }
    assert_eq!(sums.last_tide(), Some(7));
}

#[test]
fn a_bucket_that_low_water_cuts_belongs_to_both_tides() {
    let mut sums = Tallies::default();
    sums.add(minutes(0, 2), m3(100.0), 1);
    sums.add(minutes(2, 5), m3(30.0), 2);
    sums.add(minutes(0, 2), m3(1.0), 1);
    assert_eq!((sums.in_tide(1), sums.in_tide(2)), (m3(101.0), m3(30.0)));
    assert_eq!(sums.in_window(&minutes(0, 5)), m3(131.0));
}

#[test]
fn backflow_earns_nothing_and_nothing_is_zero() {
    let mut sums = Tallies::default();
    sums.add(minutes(0, 5), m3(100.0), 1);
    sums.add(minutes(5, 10), m3(-60.0), 1);
    sums.add(minutes(8, 17), m3(-60.0), 1);
    assert_eq!(sums.in_tide(1), m3(100.0));
    assert!(sums.in_tide(99).get().is_sign_positive());
}

#[test]
fn pruning_keeps_what_ended_later() {
    let mut sums = Tallies::default();
    sums.add(minutes(0, 15), m3(30.0), 1);
    sums.prune(minutes(0, 5).end());
    assert!((sums.in_tide(1).get() - 20.0).abs() < 1e-9);
}

/// A bucket that had run for a minute was counted by a fifth, though all of its water had gone.
#[test]
fn regress_the_running_bucket_counts_whole() {
    let cap = ClauseKind::RollingVolume { span: Span::hours(24), volume_max: m3(1000.0) };
    let s = site(vec![clause(0, "1", cap)]);
    let mut sums = Tallies::default();
    sums.add(minutes(0, 5), m3(300.0), 0);
    let g = guarded(&s, &forecast(&[6.0]), &sums, t(0.0) + Span::minutes(1), &[]);
    assert_eq!(g.volume_left.map(|c| c.max), Some(m3(700.0)));
}

/// One stamp ten years ahead, from a clock that jumped, dropped every sum as old.
#[test]
fn regress_a_stamp_far_ahead_empties_no_sum() {
    let mut sums = Tallies::default();
    sums.add(minutes(0, 5), m3(300.0), 1);
    let far = Span::days(3650);
    sums.add(Window::new(t(0.0) + far, t(0.0) + far + Span::minutes(5)).unwrap(), m3(1.0), 2);
    assert_eq!(sums.in_tide(1), m3(300.0));
    // The clock is back, and what was stamped ahead still counts.
    assert_eq!(sums.gone_since(t(0.0)), m3(301.0));
}

#[test]
fn two_months_without_a_pause_are_kept_and_no_more() {
    let mut sums = Tallies::default();
    let five = Span::minutes(5);
    for n in 0..80 * 288_i64 {
        sums.add(bucket(t(0.0) + five * n), m3(1.0), n / 149);
    }
    let end = t(0.0) + five * (80 * 288);
    assert_eq!(sums.gone_since(end - Span::days(63)), m3(63.0 * 288.0));
    assert_eq!(sums.gone_since(t(0.0)), m3(63.0 * 288.0));
}

/// October 2027 by the London clock: from 30 September 23:00 UTC to 1 November 00:00 UTC.
#[test]
fn a_month_with_the_autumn_clock_change_is_an_hour_longer() {
    let at = |mo, d, h, mi| Utc::from_civil(2027, mo, d, h, mi, 0).unwrap();
    let changes = vec![(at(3, 28, 1, 0), 3600), (at(10, 31, 1, 0), 0)];
    let mut s = site(vec![clause(0, "1", ClauseKind::MonthVolume { volume_max: m3(1000.0) })]);
    s.zone = ZoneRules::new("Europe/London", "test", 0, changes);
    let mut sums = Tallies::default();
    let each = [
        // 23:55 on 30 September, local.
        (at(9, 30, 22, 55), 1.0),
        // Midnight, the first of October.
        (at(9, 30, 23, 0), 10.0),
        // Both hours that are called 01:30 on the night of the change.
        (at(10, 31, 0, 30), 100.0),
        (at(10, 31, 1, 30), 200.0),
        // 23:55 on 31 October, local: winter time by now.
        (at(10, 31, 23, 55), 400.0),
        (at(11, 1, 0, 0), 7.0),
    ];
    each.iter().for_each(|(at, v)| sums.add(bucket(*at), m3(*v), 0));
    let used = |now| {
        let g = guarded(&s, &forecast(&[6.0]), &sums, now, &[]);
        g.volume_left.map(|c| 1000.0 - c.max.get())
    };
    assert_eq!(used(at(9, 30, 22, 59)), Some(1.0));
    assert_eq!(used(at(9, 30, 23, 0)), Some(710.0));
    assert_eq!(used(at(10, 31, 23, 59)), Some(710.0));
    assert_eq!(used(at(11, 1, 0, 0)), Some(7.0));
    let caps = long_caps(&s, &sums, at(10, 31, 12, 0), GATE);
    let month = |n: usize| caps[n].kind;
    let fixed = |a, b| LongCapKind::Fixed(Window::new(a, b).unwrap());
    assert_eq!(month(0), fixed(at(9, 30, 23, 0), at(11, 1, 0, 0)));
    assert_eq!(month(1), fixed(at(11, 1, 0, 0), at(12, 1, 0, 0)));
}

#[test]
fn long_caps_carry_what_has_gone_into_each() {
    let mut sums = Tallies::default();
    sums.add(bucket(t(1.0)), m3(400.0), 0);
    sums.add(bucket(t(30.0)), m3(500.0), 2);
    let caps = long_caps(&site(permit()), &sums, t(31.0), GATE);
    let clauses: Vec<u16> = caps.iter().map(|c| c.clause.0).collect();
    assert_eq!(clauses, [4, 5, 5]);
    assert_eq!(caps[0].kind, LongCapKind::Rolling(Span::hours(24)));
    assert_eq!(caps[0].past, [(bucket(t(30.0)), m3(500.0))]);
    assert_eq!(caps[1].past.len(), 2);
    assert!(caps[2].past.is_empty());
    assert!(long_caps(&site(permit()), &sums, t(31.0), AssetId(9)).is_empty());
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    /// Second by second over any pieces and any instant, off the grid too.
    #[test]
    fn prop_sums_equal_brute_force_by_the_second(
        list in prop::collection::vec((0..7200_i64, 1..1500_i64, 0.0..500.0_f64, 0..3_i64), 0..20),
        ask in 0..9000_i64, span in 1..4000_i64,
    ) {
        let at = |s: i64| t(0.0) + Span::seconds(s);
        let mut sums = Tallies::default();
        // Within a bucket the water is taken as even: so does the brute force, bucket by bucket.
        let mut buckets = vec![[0.0_f64; 3]; 40];
        for (from, long, volume, tide) in list {
            sums.add(Window::new(at(from), at(from + long)).unwrap(), m3(volume), tide);
            for s in from..from + long {
                buckets[(s / 300) as usize][tide as usize] += volume / long as f64;
            }
        }
        let per_s = |s: i64| buckets[(s / 300) as usize].iter().sum::<f64>() / 300.0;
        let brute: f64 = ((ask - span).max(0)..ask).map(per_s).sum();
        let got = sums.rolling(Span::seconds(span), at(ask)).get();
        prop_assert!((got - brute).abs() < 1e-6, "rolling {got} {brute}");
        let brute: f64 = ((ask - span).max(0)..12_000).map(per_s).sum();
        let got = sums.gone_since(at(ask - span)).get();
        prop_assert!((got - brute).abs() < 1e-6, "since {got} {brute}");
        for tide in 0..3 {
            let brute: f64 = buckets.iter().map(|b| b[tide]).sum();
            prop_assert!((sums.in_tide(tide as i64).get() - brute).abs() < 1e-6);
        }
    }
}
