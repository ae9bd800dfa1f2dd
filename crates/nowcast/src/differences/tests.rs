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
