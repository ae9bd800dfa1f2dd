//! The interpolation's own rules.

use super::*;

fn table() -> NeapSpring<Metres> {
    NeapSpring { neap: Metres::of(4.0), spring: Metres::of(8.2) }
}

#[test]
fn neap_and_spring_ranges_give_the_tabulated_figures() {
    let d = NeapSpring { neap: Span::minutes(46), spring: Span::minutes(117) };
    assert_eq!(Weight::of(Metres::of(4.0), &table()).span(&d), Span::minutes(46));
    assert_eq!(Weight::of(Metres::of(8.2), &table()).span(&d), Span::minutes(117));
    let half = Weight::of(Metres::of(6.1), &table());
    assert!((half.span(&d).as_minutes() - 81.5).abs() < 1e-6);
    assert_eq!(half.widen, 1.0);
}

#[test]
fn beyond_springs_and_neaps_it_extrapolates_and_is_less_sure() {
    let at = |r: f64| Weight::of(Metres::of(r), &table());
    // 10.3 m is 1.5 of the way, 2.3 m is -0.405; both are used as they are.
    assert!((at(10.3).w - 1.5).abs() < 1e-9 && (at(10.3).widen - 2.0).abs() < 1e-9);
    assert!((at(2.3).w + 0.404_761).abs() < 1e-5);
    // No further than -0.6 and 1.6.
    assert_eq!((at(12.0).w, at(0.5).w), (1.6, -0.6));
    assert!((at(12.0).widen - 2.2).abs() < 1e-9);
}

#[test]
fn a_speed_never_changes_sign_by_extrapolation() {
    let v = NeapSpring { neap: MetresPerSecond::of(0.2), spring: MetresPerSecond::of(1.2) };
    assert_eq!(Weight::of(Metres::of(0.5), &table()).speed(&v), 0.0);
}

/// Source: the secondary-port method of official tide tables, its height differences (a fictional
/// pair of ports; from memory), as the straight line on which the range-weighted form rests.
/// Where in it: mean high water neaps 4.6 m and springs 5.9 m, differences +0.2 and +0.4 m; low
/// waters 2.0 and 0.7 m, differences -0.1 and -0.2 m; the levels stand where a range stands here.
/// Quantity and unit: height difference, metres, inside and beyond the tabulated ends.
/// Tolerance and why: 5e-9, half the last digit of the figures.
#[test]
fn val_secondary_port_height_differences() {
    let pair = |neap, spring| NeapSpring { neap: Metres::of(neap), spring: Metres::of(spring) };
    let high = [
        (5.9, 0.4),
        (4.6, 0.2),
        (5.2, 0.292_307_692),
        (5.6, 0.353_846_154),
        (5.4, 0.323_076_923),
        (4.8, 0.230_769_231),
        (6.2, 0.446_153_846),
        (5.95, 0.407_692_308),
    ];
    let low = [
        (0.7, -0.2),
        (2.0, -0.1),
        (1.3, -0.153_846_154),
        (0.9, -0.184_615_385),
        (1.1, -0.169_230_769),
        (1.8, -0.115_384_615),
        (2.2, -0.084_615_384_6),
    ];
    let high = high.map(|h| (h, pair(4.6, 5.9), pair(0.2, 0.4)));
    let low = low.map(|h| (h, pair(2.0, 0.7), pair(-0.1, -0.2)));
    for ((at, expected), ends, differences) in high.into_iter().chain(low) {
        let ours = Weight::of(Metres::of(at), &ends).metres(&differences).get();
        assert!((ours - expected).abs() < 5e-9, "at {at}: {ours} {expected}");
    }
}

fn tabulated() -> model::Differences {
    let min =
        |neap, spring| NeapSpring { neap: Span::minutes(neap), spring: Span::minutes(spring) };
    let speed = |neap, spring| NeapSpring {
        neap: MetresPerSecond::of(neap),
        spring: MetresPerSecond::of(spring),
    };
    model::Differences {
        range: table(),
        high_lag: min(4, 6),
        high_rise: NeapSpring { neap: Metres::of(0.3), spring: Metres::of(0.5) },
        low_lag: min(46, 117),
        low_level: NeapSpring {
            neap: LowLevel::At(Level::of(-2.1)),
            spring: LowLevel::At(Level::of(-3.0)),
        },
        current: Some(model::CurrentDifferences {
            seaward_after_port_high: min(30, 37),
            landward_after_port_low: min(60, 130),
            peak_ebb: speed(0.8, 1.2),
            peak_flood: speed(1.0, 1.9),
        }),
        time_sd: Span::minutes(10),
        level_sd: Metres::of(0.2),
    }
}

/// Port turns six hours apart at the levels given, beginning with a high water of tide 1.
fn port(levels_m: &[f64]) -> PortTide {
    let m2 = tide::Constants::new(0.0, tide::Nodal::Continuous, &[("M2", 1.0, 0.0)]).unwrap();
    let turn = |(n, level): (usize, &f64)| Turn {
        number: 1 + n as i64 / 2,
        kind: if n % 2 == 0 { TurnKind::High } else { TurnKind::Low },
        at: Utc::EPOCH + Span::hours(6) * n as i64,
        level: Level::of(*level),
        time_sd: Span::ZERO,
        level_sd: Metres::ZERO,
    };
    let turns = levels_m.iter().enumerate().map(turn).collect();
    PortTide { turns, predictor: tide::Predictor::new(&m2) }
}

#[test]
fn each_law_goes_by_its_own_range() {
    // Tide 2: flood before it 4.0 m, ebb 8.2 m, flood after it 6.1 m.
    let port = port(&[0.0, 0.0, 4.0, -4.2, 1.9, -2.1]);
    let d = tabulated();
    let turns = Differences(&d).turns(&port);
    let (high, low) = (turns[2], turns[3]);
    assert_eq!((high.number, low.number), (2, 2));
    assert_eq!(high.at - port.turns[2].at, Span::minutes(6));
    assert!((high.level.get() - 4.5).abs() < 1e-12);
    assert_eq!(low.at - port.turns[3].at, Span::minutes(117));
    assert!((low.level.get() + 3.0).abs() < 1e-12);
    let knots = Differences(&d).current_turns(&port);
    let of = |number, to_seaward| {
        *knots.iter().find(|k| k.turn.number == number && k.turn.to_seaward == to_seaward).unwrap()
    };
    let (seaward, landward) = (of(2, true), of(2, false));
    assert_eq!(seaward.turn.at - port.turns[2].at, Span::minutes(37));
    assert!((seaward.peak_m_s - 1.2).abs() < 1e-12);
    assert_eq!(landward.turn.at - port.turns[3].at, Span::minutes(130));
    // The flood's peak by the flood that begins there: half-way between neap and spring.
    assert!((landward.peak_m_s + 1.45).abs() < 1e-12);
}

#[test]
fn the_spread_is_wider_beyond_springs() {
    let port = port(&[5.0, -5.3, 5.0, -5.3]);
    let d = tabulated();
    let high = Differences(&d).turns(&port)[0];
    assert_eq!(high.time_sd, Span::minutes(20));
    assert!((high.level_sd.get() - 0.4).abs() < 1e-12);
}

#[test]
fn a_span_that_the_turns_do_not_reach_over_is_refused() {
    let port = port(&[3.0, -3.0, 3.0, -3.0, 3.0, -3.0, 3.0, -3.0]);
    let d = tabulated();
    let over = |from: i64, to: i64| {
        let span =
            Window::new(Utc::EPOCH + Span::hours(from), Utc::EPOCH + Span::hours(to)).unwrap();
        Differences(&d).place_forecast(&port, PlaceId(0), &span)
    };
    assert!(over(12, 30).is_ok());
    let words = over(12, 60).unwrap_err().to_string();
    assert!(
        words.contains("1970-01-02T19:19:48Z") && words.contains("1970-01-03T12:00:00Z"),
        "{words}"
    );
    let nothing = self::port(&[]);
    let span = Window::new(Utc::EPOCH, Utc::EPOCH + Span::hours(1)).unwrap();
    let words = Differences(&d).place_forecast(&nothing, PlaceId(0), &span).unwrap_err();
    assert!(words.to_string().contains("no turn at all"), "{words}");
}
