//! What was done, against the clauses that cap a volume.

use super::*;

fn m3(v: f64) -> CubicMetres {
    CubicMetres::of(v)
}

fn rolling(max: f64) -> Site {
    let kind = ClauseKind::RollingVolume { span: Span::hours(24), volume_max: m3(max) };
    site(vec![clause(0, "1", kind)])
}

#[test]
fn the_third_of_three_is_a_breach_unless_it_was_cut() {
    // C13 again, from the other side: 400 + 400 + 400 is over 1,000; 400 + 400 + 200 is not.
    let done = |third: f64| {
        let each = [(1.0, 400.0), (9.0, 400.0), (17.0, third)];
        each.map(|(h, v)| (bucket(t(h)), m3(v), 0))
    };
    assert_eq!(audit(&rolling(1000.0), GATE, &done(200.0), &[]), []);
    let [b] = audit(&rolling(1000.0), GATE, &done(400.0), &[])[..] else { panic!("one breach") };
    assert_eq!(b.over, Over::SpanTo(bucket(t(17.0)).end()));
    assert_eq!((b.clause, b.used, b.max), (ClauseId(0), m3(1200.0), m3(1000.0)));
    assert_eq!(
        b.to_string(),
        "1200 m3 went where 1000 m3 may, in the span that ended at 2027-03-01T17:05:00Z"
    );
}

#[test]
fn each_tide_is_judged_by_its_own_range() {
    let s = site(vec![clause(0, "2.5", bands())]);
    let done = [(window(3.5, 6.5), m3(9000.0), 0), (window(16.0, 19.0), m3(4801.0), 1)].to_vec();
    let ranges = |second: f64| [(0, Metres::of(3.95)), (1, Metres::of(second))];
    assert_eq!(audit(&s, GATE, &done, &ranges(6.0)), []);
    let over = |second: f64| {
        let found = audit(&s, GATE, &done, &ranges(second));
        found.iter().map(|b| (b.over, b.max.get())).collect::<Vec<_>>()
    };
    assert_eq!(over(3.949), [(Over::Tide(1), 4800.0)]);
    assert_eq!(over(2.149), [(Over::Tide(1), 0.0)]);
    let unknown = audit(&s, GATE, &done, &ranges(6.0)[..1]);
    assert_eq!(unknown.len(), 1);
    assert_eq!(unknown[0].over, Over::TideOfUnknownRange(1));
}

#[test]
fn each_month_is_judged_and_other_assets_are_not() {
    let kind = ClauseKind::MonthVolume { volume_max: m3(1000.0) };
    let s = site(vec![clause(0, "2.7", kind)]);
    let at = |mo, d| Utc::from_civil(2027, mo, d, 12, 0, 0).unwrap();
    let days = [(3, 1, 600.0), (3, 31, 401.0), (4, 1, 1000.0), (6, 1, 1001.0)];
    let done = days.map(|(mo, d, v)| (bucket(at(mo, d)), m3(v), 0));
    let found = audit(&s, GATE, &done, &[]);
    let months: Vec<_> = found.iter().map(|b| (b.over, b.used.get())).collect();
    let month = |at| {
        let (start, end) = s.zone.month_of(at);
        Over::Month(Window::new(start, end).unwrap())
    };
    assert_eq!(months, [(month(at(3, 5)), 1001.0), (month(at(6, 5)), 1001.0)]);
    assert_eq!(audit(&s, AssetId(9), &done, &[]), []);
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    /// The worst instant that is found is the worst of all instants, minute by minute.
    #[test]
    fn prop_a_rolling_breach_is_found_exactly_where_there_is_one(
        list in prop::collection::vec((0..800_i64, 0.0..200.0_f64), 1..40),
        max in 200.0..2000.0_f64,
    ) {
        let five = Span::minutes(5);
        let mut volumes = vec![0.0_f64; 800];
        let mut done = Vec::new();
        for (slot, v) in list {
            volumes[slot as usize] += v;
            done.push((bucket(t(0.0) + five * slot), m3(v), 0));
        }
        // By the minute, and each bucket even in itself.
        let gone_by = |minute: i64| {
            let whole = (minute / 5) as usize;
            let part = volumes.get(whole).map_or(0.0, |v| v * (minute % 5) as f64 / 5.0);
            volumes[..whole.min(800)].iter().sum::<f64>() + part
        };
        // To the very end of the last bucket.
        let worst = (0..=4000_i64).map(|m| gone_by(m) - gone_by((m - 1440).max(0)));
        let worst = worst.fold(0.0, f64::max);
        let found = audit(&rolling(max), GATE, &done, &[]);
        prop_assume!((worst - max).abs() > 1e-3);
        prop_assert_eq!(found.len(), usize::from(worst > max));
        if let Some(b) = found.first() {
            prop_assert!((b.used.get() - worst).abs() < 1e-6, "{} {worst}", b.used);
        }
    }
}
