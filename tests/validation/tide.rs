//! Astronomy and prediction against published figures.

use tests::{column, csv, number};
use tide::{Constants, Nodal, PortTurn, Predictor, arguments, node_factor, speed_deg_h};
use units::{Span, Utc, Window};

fn circle(d: f64) -> f64 {
    (d - 360.0 * (d / 360.0).round()).abs()
}

/// Constants of a station from the NOAA files.
pub fn noaa(station: &str, mean_level_m: f64, nodal: Nodal) -> Constants {
    let (header, rows) = csv(&format!("noaa-2026/constants-{station}.csv"));
    let (a, g) = (column(&header, "amplitude_m"), column(&header, "phase_deg_gmt"));
    let list: Vec<(&str, f64, f64)> =
        rows.iter().map(|r| (r[0].as_str(), number(r, a), number(r, g))).collect();
    Constants::new(mean_level_m, nodal, &list).unwrap()
}

/// Source: IERS Conventions (2010), Technical Note 36, eq. 5.43, through the library ERFA.
/// Where in it: mean longitudes at 22 instants, 1900 to 2100.
/// Quantity and unit: s, h, p, N, p1, degrees.
/// Tolerance and why: 0.04 (s), 0.006 (others), the differences of the two theories; and 1e-5
/// against Schureman's own formulas in the same file, the rounding of the table.
#[test]
fn val_iers_astronomical_arguments() {
    let (header, rows) = csv("iers-2010/fundamental_arguments.csv");
    assert_eq!(rows.len(), 22);
    let mut worst = [0.0_f64; 5];
    for r in &rows {
        let a = arguments(Utc::parse(&format!("{}Z", r[0])).unwrap());
        let ours = [a.s_deg, a.h_deg, a.p_deg, a.n_deg, a.p1_deg];
        for (n, name) in ["s", "h", "p", "N", "p1"].iter().enumerate() {
            let iers = number(r, column(&header, &format!("{name}_deg")));
            let book = number(r, column(&header, &format!("{name}_schureman_deg")));
            worst[n] = worst[n].max(circle(ours[n] - iers));
            assert!(circle(ours[n] - book) < 1e-5, "{name} {} {book}", r[0]);
        }
    }
    println!(
        "worst against IERS, degrees: s {:.4} h {:.4} p {:.4} N {:.4} p1 {:.4}",
        worst[0], worst[1], worst[2], worst[3], worst[4]
    );
    assert!(worst[0] <= 0.04 && worst[1..].iter().all(|w| *w <= 0.006), "{worst:?}");
}

/// Source: P. Schureman (1940), Special Publication 98.
/// Where in it: f and u in the middle of the year (like table 14), computed from its equations.
/// Quantity and unit: f, a ratio; u, degrees.
/// Tolerance and why: 0.001 in f and 0.1 degree in u, as the work order asks; the table's rounding
/// is far finer.
#[test]
fn val_schureman_node_factors_by_year() {
    let (header, rows) = csv("schureman-1940/nodal_by_year.csv");
    let (mut worst_f, mut worst_u) = (0.0_f64, 0.0_f64);
    for r in &rows {
        let at = Utc::parse(&format!("{}Z", r[1])).unwrap();
        for name in ["Mm", "Mf", "O1", "J1", "OO1", "M2", "M3", "K1", "K2", "M1", "L2"] {
            let ours = node_factor(name, at).unwrap();
            let f = number(r, column(&header, &format!("f_{name}")));
            let u = number(r, column(&header, &format!("u_{name}_deg")));
            worst_f = worst_f.max((ours.f - f).abs());
            worst_u = worst_u.max(circle(ours.u_deg - u));
            assert!((ours.f - f).abs() < 0.001, "f {name} {}: {} {f}", r[1], ours.f);
            assert!(circle(ours.u_deg - u) < 0.1, "u {name} {}: {} {u}", r[1], ours.u_deg);
        }
    }
    println!("{} years x 11 terms: worst f {worst_f:.6}, worst u {worst_u:.5} deg", rows.len());
    assert!(rows.len() > 20);
}

/// Source: constituents of NOAA and TICON-4 station files; speeds computed from Doodson numbers.
/// Where in it: 102 of 129; the rest are compounds of one Alaskan station that the table lacks.
/// Quantity and unit: speed, degrees per hour.
/// Tolerance and why: 1e-6 against the file's seven decimals. (The IHO's own list is checked beside
/// the table, in the tide crate.)
#[test]
fn val_noaa_constituent_speeds() {
    let (_, rows) = csv("noaa-2026/speeds.csv");
    let (mut seen, mut unknown, mut worst) = (0, Vec::new(), 0.0_f64);
    for r in &rows {
        let Some(ours) = speed_deg_h(&r[0]) else {
            unknown.push(r[0].as_str());
            continue;
        };
        worst = worst.max((ours - number(r, 1)).abs());
        assert!((ours - number(r, 1)).abs() < 1e-6, "{}: {ours} {}", r[0], r[1]);
        seen += 1;
    }
    println!("{seen} speeds, worst {worst:.1e} degrees per hour; not known: {unknown:?}");
    assert_eq!((seen, unknown.len()), (102, 27), "{unknown:?}");
}

fn hilo(file: &str, msl_above_mllw_m: f64) -> Vec<(Utc, bool, f64)> {
    let (header, rows) = csv(file);
    let (t, k) = (column(&header, "time_utc"), column(&header, "type"));
    let h = column(&header, "height_m_mllw");
    let row = |r: &Vec<String>| {
        (Utc::parse(&r[t]).unwrap(), r[k] == "H", number(r, h) - msl_above_mllw_m)
    };
    rows.iter().map(row).collect()
}

fn nearest(turns: &[PortTurn], at: Utc, high: bool) -> PortTurn {
    *turns.iter().filter(|t| t.high == high).min_by_key(|t| (t.at - at).abs()).unwrap()
}

/// Source: NOAA CO-OPS predictions for 9446705, 1 to 8 October 2017.
/// Where in it: all 31 high and low waters as served.
/// Quantity and unit: time, minutes; height above MLLW, metres.
/// Tolerance and why: time within max(1 min, the time in which the level moves 3 mm), since the
/// service rounds to 1 min and turns are flat; height within 0.01 m.
#[test]
fn val_noaa_9446705_high_and_low_waters() {
    let events = hilo("noaa-2026/9446705_yoman_point_hilo_2017-10-01.csv", 2.351);
    assert_eq!(events.len(), 31);
    let predictor = Predictor::new(&noaa("9446705", 0.0, Nodal::MidYear));
    let span = Window::new(events[0].0 - Span::days(1), events[30].0 + Span::days(1)).unwrap();
    let turns = predictor.turns(&span);
    let (mut times_s, mut heights_m, mut sum_s) = (Vec::new(), Vec::new(), 0.0);
    for (at, high, height) in events {
        let t = nearest(&turns, at, high);
        let dt = t.at - at;
        // How far from the turn the level has moved 3 mm.
        let mut flat = Span::ZERO;
        while (predictor.level_m(t.at + flat) - t.level_m).abs() < 0.003 {
            flat += Span::seconds(1);
        }
        let allowed = Span::minutes(1).max(flat);
        assert!(dt.abs() <= allowed, "{at}: {dt} of {allowed}");
        assert!((t.level_m - height).abs() <= 0.01, "{at}: {} {height}", t.level_m);
        times_s.push(dt.abs().as_seconds());
        sum_s += dt.as_seconds();
        heights_m.push((t.level_m - height).abs());
    }
    println!("31 waters: mean {:.1} s", sum_s / 31.0);
    for (unit, mut errors) in [("s", times_s), ("m", heights_m)] {
        errors.sort_by(f64::total_cmp);
        let [median, p95, worst] = [15, 29, 30].map(|i| errors[i]);
        println!("median {median:.4} {unit}, 95 % {p95:.4} {unit}, worst {worst:.4} {unit}");
    }
}

/// Source: NOAA CO-OPS predictions for 9447130, 30 August 2019.
/// Where in it: 3 high and low waters as served.
/// Quantity and unit: time, minutes; height above MLLW, metres.
/// Tolerance and why: 3 min and 0.03 m: the publisher has revised the constants a little since.
#[test]
fn val_noaa_9447130_high_and_low_waters() {
    let events = hilo("noaa-2026/9447130_seattle_hilo_2019-08-30.csv", 2.024);
    let predictor = Predictor::new(&noaa("9447130", 0.0, Nodal::MidYear));
    for (at, high, height) in events {
        let span = Window::new(at - Span::hours(10), at + Span::hours(10)).unwrap();
        let t = nearest(&predictor.turns(&span), at, high);
        assert!((t.at - at).abs() <= Span::minutes(3), "{at} {}", t.at);
        assert!((t.level_m - height).abs() <= 0.03, "{at} {} {height}", t.level_m);
    }
}

/// Source: the mean lunar half-day, 12.4206012 h (IERS rates; common practice).
/// Where in it: M2 alone, ten days.
/// Quantity and unit: spacing of high waters, hours; height, metres.
/// Tolerance and why: 1 s and 1 mm (the node factor is held, f x H known).
#[test]
fn val_lunar_half_day_spacing() {
    let m2 = Constants::new(0.3, Nodal::MidYear, &[("M2", 2.0, 0.0)]).unwrap();
    let day = Utc::from_civil(2027, 3, 1, 0, 0, 0).unwrap();
    let turns = Predictor::new(&m2).turns(&Window::new(day, day + Span::days(10)).unwrap());
    let highs: Vec<_> = turns.iter().filter(|t| t.high).collect();
    let f = node_factor("M2", Utc::from_civil(2027, 7, 2, 12, 0, 0).unwrap()).unwrap().f;
    for pair in highs.windows(2) {
        let gap = pair[1].at - pair[0].at;
        assert!((gap.as_seconds() - 12.420_601_2 * 3600.0).abs() < 1.0, "{gap}");
        assert!((pair[0].level_m - (0.3 + 2.0 * f)).abs() < 0.001);
    }
    assert!(highs.len() >= 19);
}

#[test]
fn prop_constants_superpose() {
    let t = Utc::from_civil(2027, 9, 2, 18, 0, 0).unwrap();
    for nodal in [Nodal::Continuous, Nodal::MidYear] {
        let list = [("M2", 3.05, 170.0), ("K1", 0.08, 120.0), ("L2", 0.06, 140.0)];
        let whole = Constants::new(0.3, nodal, &list).unwrap();
        let parts: f64 = list
            .iter()
            .map(|c| Predictor::new(&Constants::new(0.0, nodal, &[*c]).unwrap()).level_m(t))
            .sum();
        assert!((Predictor::new(&whole).level_m(t) - 0.3 - parts).abs() < 1e-12);
    }
}

#[test]
fn a_prediction_runs_on_smoothly_over_midnight() {
    let port = noaa("8557380", 0.0, Nodal::Continuous);
    let predictor = Predictor::new(&port);
    let midnight = Utc::from_civil(2027, 3, 2, 0, 0, 0).unwrap();
    for day in 0..400 {
        let m = midnight + Span::days(day);
        let before = predictor.level_m(m - Span::micros(1));
        let jump = (predictor.level_m(m) - before).abs();
        assert!(jump < 1e-6, "{m}: {jump}");
    }
}

#[test]
fn nineteen_years_of_high_waters_are_numbered_one_by_one() {
    for (station, g) in [("8557380", 31.2), ("8545240", 184.2)] {
        let predictor = Predictor::new(&noaa(station, 0.0, Nodal::MidYear));
        let start = Utc::from_civil(2020, 1, 1, 0, 0, 0).unwrap();
        let turns = predictor.turns(&Window::new(start, start + Span::days(19 * 365)).unwrap());
        let mut last: Option<i64> = None;
        let mut worst = 0.0_f64;
        for t in turns.iter().filter(|t| t.high) {
            let x = tide::number(t.at, g);
            worst = worst.max((x - x.round()).abs());
            let n = x.round() as i64;
            assert!(last.is_none_or(|l| n == l + 1), "{station} {}", t.at);
            last = Some(n);
        }
        println!("{station}: high waters lie within {worst:.3} of a tide of their number");
    }
}

#[test]
fn wrong_constants_are_refused_by_name() {
    let refused = |list: &[(&str, f64, f64)]| {
        Constants::new(0.0, Nodal::MidYear, list).unwrap_err().to_string()
    };
    assert!(refused(&[("MX9", 1.0, 0.0)]).contains("MX9"));
    assert!(refused(&[("LAM2", 1.0, 0.0), ("LAMBDA2", 1.0, 0.0)]).contains("twice"));
    assert!(refused(&[("M2", f64::NAN, 0.0)]).contains("M2"));
}
