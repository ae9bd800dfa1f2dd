//! Nineteen years of high and low waters against the publisher's highest and lowest tide.

use tests::{column, csv, number};
use tide::{Nodal, Predictor};
use units::{Utc, Window};

use crate::validation::tide::noaa;

/// Source: NOAA CO-OPS accepted datums of 8454000, 8545240, 9414290 and 9447130; and an independent
/// hindcast from the same constants (computed).
/// Where in it: HAT and LAT, epoch 1983 to 2001.
/// Quantity and unit: level above station datum, metres.
/// Tolerance and why: 0.03 against the published figures, since constants were revised after the
/// datums were accepted; 0.005 against the hindcast, which took six-minute steps.
#[test]
fn val_noaa_highest_and_lowest_astronomical_tide() {
    let (header, rows) = csv("noaa-2026/hat_lat.csv");
    let start = |year| Utc::from_civil(year, 1, 1, 0, 0, 0).unwrap();
    let epoch = Window::new(start(1983), start(2002)).unwrap();
    assert_eq!(rows.len(), 4);
    for r in &rows {
        let of = |name: &str| number(r, column(&header, name));
        let predictor = Predictor::new(&noaa(&r[0], of("msl_m"), Nodal::MidYear));
        let levels: Vec<f64> = predictor.turns(&epoch).iter().map(|t| t.level_m).collect();
        let highest = levels.iter().copied().fold(f64::MIN, f64::max);
        let lowest = levels.iter().copied().fold(f64::MAX, f64::min);
        let published = [highest - of("hat_m"), lowest - of("lat_m")];
        let hindcast = [highest - of("hindcast_hat_m"), lowest - of("hindcast_lat_m")];
        println!(
            "{}: against NOAA {:+.3} {:+.3} m, against the hindcast {:+.4} {:+.4} m",
            r[0], published[0], published[1], hindcast[0], hindcast[1]
        );
        assert!(published.iter().all(|d| d.abs() <= 0.03), "{}: {published:?}", r[0]);
        assert!(hindcast.iter().all(|d| d.abs() <= 0.005), "{}: {hindcast:?}", r[0]);
    }
}
