//! Dry-weather inflow to a storage: a mean with one swing a day.

/// Inflow, m3/s: mean (1 + swing cos(2 pi (hour - peak)/24)), never below zero.
///
/// `hour_utc` and `peak_hour_utc` in hours of the UTC day, any real number; `swing` is a share of
/// the mean, over 1 the night flow is cut off at zero.
///
/// **Source**: first harmonic of the daily pattern of sewage flow (common practice).
pub fn daily_inflow_m3_s(mean_m3_s: f64, swing: f64, peak_hour_utc: f64, hour_utc: f64) -> f64 {
    let turn = core::f64::consts::TAU * (hour_utc - peak_hour_utc) / 24.0;
    (mean_m3_s * (1.0 + swing * libm::cos(turn))).max(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The invented works: 0.133 m3/s mean, swing 0.35, peak at 10 h.
    #[test]
    fn a_day_has_one_peak_and_keeps_its_mean() {
        let at = |h| daily_inflow_m3_s(0.133, 0.35, 10.0, h);
        assert!((at(10.0) - 0.133 * 1.35).abs() < 1e-12);
        assert!((at(22.0) - 0.133 * 0.65).abs() < 1e-12);
        let mean = (0..24).map(|h| at(f64::from(h))).sum::<f64>() / 24.0;
        assert!((mean - 0.133).abs() < 1e-12);
    }
}
