//! The second site's port is NOAA's as published, and its differences are what the constants of both
//! stations give.

use std::path::PathBuf;

use model::{LowLevel, NeapSpring, Site};
use nowcast::{Station, differences_from_constants};
use tests::{column, csv, number};
use tide::{Constants, Nodal, Predictor};
use units::{Metres, MetresPerSecond, Span};

/// (constituent, amplitude in m, Greenwich phase lag in degrees).
type Constant = (String, f64, f64);

fn delaware() -> Site {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("sites/delaware");
    site::load(&folder).unwrap_or_else(|report| panic!("{report}"))
}

/// NOAA's constants of a station, without those that were not resolved.
fn published(station: &str) -> Vec<Constant> {
    let (header, rows) = csv(&format!("noaa-2026/constants-{station}.csv"));
    let names = ["constituent", "amplitude_m", "phase_deg_gmt"];
    let [name, amplitude, phase] = names.map(|n| column(&header, n));
    let all = rows.iter().map(|r| (r[name].clone(), number(r, amplitude), number(r, phase)));
    all.filter(|c| c.1 > 0.0).collect()
}

fn predictor(constants: &[Constant]) -> Predictor {
    let list: Vec<_> = constants.iter().map(|c| (c.0.as_str(), c.1, c.2)).collect();
    let port = Constants::new(0.0, Nodal::MidYear, &list);
    Predictor::new(&port.expect("published constants are sound"))
}

fn m2_phase_deg(constants: &[Constant]) -> f64 {
    constants.iter().find(|c| c.0 == "M2").expect("a published set has M2").2
}

/// Source: NOAA/NOS CO-OPS, accepted harmonic constants of station 8557380, Lewes, Delaware.
/// Where in it: all constituents with an amplitude above zero, 34 of 37.
/// Quantity and unit: amplitude, m; Greenwich phase lag, degrees.
/// Tolerance and why: exact; the figures are copied.
#[test]
fn val_noaa_lewes_constants_of_the_second_site() {
    let site = delaware();
    let ours: Vec<Constant> = site
        .port
        .constants
        .iter()
        .map(|c| (c.name.clone(), c.amplitude.get(), c.phase_lag_greenwich_deg))
        .collect();
    assert_eq!(ours, published("8557380"));
    assert_eq!(ours.len(), 34);
}

/// The figures of the file are our own fit, rounded: to half a minute and half a centimetre.
#[test]
fn regress_delaware_differences_are_the_fit_of_both_stations() {
    let site = delaware();
    let written = &site.places[0].differences;
    let (port, place) = (published("8557380"), published("8545240"));
    let (a, b) = (predictor(&port), predictor(&place));
    let fitted = differences_from_constants(
        Station { predictor: &a, m2_phase_lag_deg: m2_phase_deg(&port) },
        Station { predictor: &b, m2_phase_lag_deg: m2_phase_deg(&place) },
        &site.port.valid,
        written.range,
        Span::minutes(30),
        (MetresPerSecond::of(0.9), MetresPerSecond::of(1.0)),
    )
    .unwrap();
    let near_in_time = |a: NeapSpring<Span>, b: NeapSpring<Span>| {
        let half_a_minute = Span::seconds(30);
        (a.neap - b.neap).abs() <= half_a_minute && (a.spring - b.spring).abs() <= half_a_minute
    };
    let near = |a: f64, b: f64| (a - b).abs() <= 0.005_001;
    let near_in_height = |a: NeapSpring<Metres>, b: NeapSpring<Metres>| {
        near(a.neap.get(), b.neap.get()) && near(a.spring.get(), b.spring.get())
    };
    let rise = |l: LowLevel| match l {
        LowLevel::RiseOverPort(m) => m,
        LowLevel::At(level) => panic!("{level} is no rise over the port"),
    };
    let rises = |d: &model::Differences| NeapSpring {
        neap: rise(d.low_level.neap),
        spring: rise(d.low_level.spring),
    };
    assert!(near_in_time(written.high_lag, fitted.high_lag), "{fitted:?}");
    assert!(near_in_time(written.low_lag, fitted.low_lag), "{fitted:?}");
    assert!(near_in_height(written.high_rise, fitted.high_rise), "{fitted:?}");
    assert!(near_in_height(rises(written), rises(&fitted)), "{fitted:?}");
    assert!((written.time_sd - fitted.time_sd).abs() <= Span::seconds(30), "{fitted:?}");
    assert!(near(written.level_sd.get(), fitted.level_sd.get()), "{fitted:?}");
    let (ours, theirs) = (written.current.as_ref().unwrap(), fitted.current.as_ref().unwrap());
    // Built from rounded lags, so a minute.
    let minute = Span::seconds(61);
    let landward = ours.landward_after_port_low.spring - theirs.landward_after_port_low.spring;
    let seaward = ours.seaward_after_port_high.neap - theirs.seaward_after_port_high.neap;
    assert!(landward.abs() <= minute && seaward.abs() <= minute, "{theirs:?}");
}
