//! Tides numbered by the moon, so that caps and windows keep their tide through any re-forecast.

use units::Utc;

use crate::arguments::arguments;

/// How many tides of the mean moon have passed since noon of 31 December 1899, as a real number:
/// near k at high water k, near k + 1/2 at the low water that ends that tide.
///
/// `m2_phase_lag_deg` is the port's Greenwich phase lag of M2. For a port whose tide is mainly
/// semi-diurnal, high waters stay within a fifth of a tide of a whole number.
///
/// **Source**: common practice (lunar transits counted by 2 tau, the argument of M2).
pub fn number(t: Utc, m2_phase_lag_deg: f64) -> f64 {
    (2.0 * arguments(t).tau_deg - m2_phase_lag_deg) / 360.0
}
