//! The fit on water whose differences are known.

use super::*;
use tide::{Constants, Nodal};
use units::Utc;

fn station(scale: f64, g_deg: f64) -> Predictor {
    let list = [("M2", 3.0 * scale, g_deg), ("S2", scale, g_deg + 45.0)];
    Predictor::new(&Constants::new(0.0, Nodal::Continuous, &list).unwrap())
}

fn fitted(port_g: f64, place_g: f64, scale: f64) -> Result<model::Differences, FitError> {
    let (port, place) = (station(1.0, port_g), station(scale, place_g));
    let start = Utc::from_civil(2027, 1, 1, 0, 0, 0).unwrap();
    differences_from_constants(
        Station { predictor: &port, m2_phase_lag_deg: port_g },
        Station { predictor: &place, m2_phase_lag_deg: place_g },
        &Window::new(start, start + Span::days(90)).unwrap(),
        NeapSpring { neap: Metres::of(4.0), spring: Metres::of(8.0) },
        Span::minutes(30),
        (MetresPerSecond::of(0.9), MetresPerSecond::of(1.0)),
    )
}

#[test]
fn a_place_is_paired_with_its_own_tide_wherever_the_circle_is_cut() {
    // (port, place, lag of M2 in degrees): later, across 360 degrees, and a little earlier.
    for (port_g, place_g, later) in
        [(30.0, 190.0, 160.0), (200.0, 20.0, 180.0), (350.0, 10.0, 20.0), (5.0, 355.0, -10.0)]
    {
        let d = fitted(port_g, place_g, 1.2).unwrap();
        let minutes = later / 28.984_104 * 60.0;
        for lag in [d.high_lag, d.low_lag] {
            for lag in [lag.neap, lag.spring] {
                // S2 is quicker, so that the same angle is up to one part in thirty less time.
                let off = (lag.as_minutes() - minutes).abs();
                assert!(off < 1.0 + minutes.abs() / 30.0, "{port_g} {place_g}: {lag}");
            }
        }
    }
}

#[test]
fn a_tide_a_fifth_greater_rises_a_tenth_of_the_range_more() {
    let d = fitted(30.0, 30.0, 1.2).unwrap();
    // High water stands half the range over the mean: a fifth of it is 0.4 and 0.8 m.
    assert!(
        (d.high_rise.neap.get() - 0.4).abs() < 0.01
            && (d.high_rise.spring.get() - 0.8).abs() < 0.01
    );
    let LowLevel::RiseOverPort(spring) = d.low_level.spring else { panic!("a rise was asked for") };
    assert!((spring.get() + 0.8).abs() < 0.01);
    assert!(d.high_lag.neap.abs() < Span::seconds(1) && d.time_sd < Span::seconds(1));
    let current = d.current.unwrap();
    assert!((current.landward_after_port_low.neap - Span::minutes(30)).abs() < Span::seconds(1));
}

#[test]
fn too_little_water_to_draw_a_line_is_refused() {
    let predictor = station(1.0, 30.0);
    let station = Station { predictor: &predictor, m2_phase_lag_deg: 30.0 };
    let start = Utc::from_civil(2027, 1, 1, 0, 0, 0).unwrap();
    let refused = differences_from_constants(
        station,
        station,
        &Window::new(start, start + Span::days(3)).unwrap(),
        NeapSpring { neap: Metres::of(4.0), spring: Metres::of(8.0) },
        Span::ZERO,
        (MetresPerSecond::ZERO, MetresPerSecond::ZERO),
    );
    assert!(matches!(refused, Err(FitError::TooFew(n)) if n < 10), "{refused:?}");
}
