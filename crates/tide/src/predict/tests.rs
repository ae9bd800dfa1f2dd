//! Laws of prediction over drawn constants and instants.

use proptest::prelude::*;

use super::*;

fn instant() -> impl Strategy<Value = Utc> {
    // 1950 to 2090, to the second.
    (-631_152_000_i64..3_786_912_000).prop_map(|s| Utc::from_micros(s * 1_000_000))
}

fn nodal() -> impl Strategy<Value = Nodal> {
    prop_oneof![Just(Nodal::Continuous), Just(Nodal::MidYear)]
}

/// A semi-diurnal port: M2 greatest by far, and what goes with it.
fn port() -> impl Strategy<Value = [(&'static str, f64, f64); 6]> {
    let share = |most: f64| (0.0..most, 0.0..360.0);
    (0.5..3.0_f64, 0.0..360.0, [share(0.3), share(0.2), share(0.1), share(0.1), share(0.05)])
        .prop_map(|(m2, g, rest)| {
            let of = |name, (a, g): (f64, f64)| (name, m2 * a, g);
            [
                ("M2", m2, g),
                of("S2", rest[0]),
                of("N2", rest[1]),
                of("K1", rest[2]),
                of("O1", rest[3]),
                of("M4", rest[4]),
            ]
        })
}

fn predictor(mean_level_m: f64, nodal: Nodal, list: &[(&str, f64, f64)]) -> Predictor {
    Predictor::new(&Constants::new(mean_level_m, nodal, list).unwrap())
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(64) })]

    #[test]
    fn prop_constants_superpose(list in port(), nodal in nodal(), t in instant(), z0 in -5.0..5.0) {
        let whole = predictor(z0, nodal, &list).level_m(t);
        let parts: f64 = list.iter().map(|c| predictor(0.0, nodal, &[*c]).level_m(t)).sum();
        prop_assert!((whole - z0 - parts).abs() < 1e-9, "{whole} {parts}");
    }

    #[test]
    fn prop_order_of_constants_changes_no_bit(list in port(), nodal in nodal(), t in instant()) {
        let mut other = list;
        other.reverse();
        let (a, b) = (predictor(0.1, nodal, &list), predictor(0.1, nodal, &other));
        prop_assert_eq!(a.level_m(t).to_bits(), b.level_m(t).to_bits());
    }

    #[test]
    fn prop_a_series_is_the_level_at_each_instant(list in port(), nodal in nodal(), t in instant()) {
        let predictor = predictor(0.0, nodal, &list);
        let window = Window::new(t, t + Span::days(2)).unwrap();
        let series = predictor.series(&window, Span::minutes(37)).unwrap();
        for (i, v) in series.values().iter().enumerate() {
            prop_assert_eq!(v.to_bits(), predictor.level_m(series.instant(i)).to_bits());
        }
    }

    #[test]
    fn prop_turns_alternate_and_are_turns(list in port(), nodal in nodal(), t in instant()) {
        let predictor = predictor(0.0, nodal, &list);
        let turns = predictor.turns(&Window::new(t, t + Span::days(15)).unwrap());
        prop_assert!(turns.len() >= 56, "{}", turns.len());
        prop_assert!(turns.windows(2).all(|w| w[0].at < w[1].at && w[0].high != w[1].high));
        for turn in turns {
            prop_assert_eq!(turn.level_m, predictor.level_m(turn.at));
            // A minute to either side the water is lower than at high water, higher than at low.
            for aside in [Span::minutes(-1), Span::minutes(1)] {
                let rise = predictor.level_m(turn.at + aside) - turn.level_m;
                // Held node factors change at new year by a step, which no turn can be asked about.
                let year = |t| ZoneRules::utc().to_local(t).year;
                let steps = nodal == Nodal::MidYear && year(turn.at) != year(turn.at + aside);
                prop_assert!(steps || (rise < 0.0) == turn.high, "{} {rise}", turn.at);
            }
        }
    }

    #[test]
    fn prop_high_waters_are_numbered_one_by_one(list in port(), nodal in nodal(), t in instant()) {
        let predictor = predictor(0.0, nodal, &list);
        let turns = predictor.turns(&Window::new(t, t + Span::days(120)).unwrap());
        let mut last: Option<i64> = None;
        for high in turns.iter().filter(|t| t.high) {
            let n = crate::number(high.at, list[0].2).round() as i64;
            prop_assert!(last.is_none_or(|l| n == l + 1), "{}", high.at);
            last = Some(n);
        }
    }
}

/// The turns are where an independent search, that of golden sections on the level itself, finds
/// the summit, to a second: the derivative is the derivative of the level.
#[test]
fn turns_agree_with_a_search_that_knows_no_derivative() {
    let list = [("M2", 3.05, 170.0), ("S2", 1.06, 215.0), ("M4", 0.26, 250.0), ("K1", 0.3, 120.0)];
    let predictor = predictor(0.3, Nodal::Continuous, &list);
    let start = Utc::from_civil(2027, 3, 1, 0, 0, 0).unwrap();
    let turns = predictor.turns(&Window::new(start, start + Span::days(60)).unwrap());
    for turn in turns {
        let sign = if turn.high { 1.0 } else { -1.0 };
        let (mut a, mut b) = (turn.at - Span::minutes(60), turn.at + Span::minutes(60));
        while b - a > Span::millis(200) {
            let inner = (b - a).scaled(0.381_966);
            let (c, d) = (a + inner, b - inner);
            if sign * (predictor.level_m(c) - predictor.level_m(d)) > 0.0 {
                b = d;
            } else {
                a = c;
            }
        }
        assert!((turn.at - a).abs() < Span::seconds(1), "{} {a}", turn.at);
    }
}
