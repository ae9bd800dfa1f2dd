//! How the truth differs from the plate figures, all from one seed.

use units::{Span, Utc};

/// A small generator of 64-bit numbers.
///
/// **Source**: G. L. Steele Jr., D. Lea, C. H. Flood (2014), "Fast splittable pseudorandom number
/// generators", OOPSLA '14, 453-472, figure 14 (the mix13 variant that is known as SplitMix64).
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct SplitMix64(u64);

impl SplitMix64 {
    pub const fn new(seed: u64) -> Self {
        Self(seed)
    }
    pub const fn next_u64(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let z = (self.0 ^ (self.0 >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        let z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }
    /// Evenly in [low, high).
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        let unit = (self.next_u64() >> 11) as f64 / (1u64 << 53) as f64;
        low + (high - low) * unit
    }
}

/// Grid of the sensors' noise.
const NOISE_GRID: Span = Span::seconds(30);

/// The drawn differences. Every factor is 1 and every error 0 in [`Truth::as_plated`].
#[derive(Clone, PartialEq, Debug)]
pub struct Truth {
    /// Seeds the events and the noise; zero factors below are not drawn from it again.
    pub seed: u64,
    /// +-15 % each on the plate's pipe friction, other losses, pump flow and spill coefficient.
    pub friction_factor: f64,
    pub loss_factor: f64,
    pub pump_factor: f64,
    pub spill_factor: f64,
    /// +-10 % on the dry-weather inflow.
    pub inflow_factor: f64,
    /// The water outside comes this much later than the series says, +-10 min.
    pub lag: Span,
    /// Inflow that nobody forecast: whether it happens.
    pub unmodelled_inflow: bool,
    /// Gain of the outfall meter, +-1 %.
    pub meter_factor: f64,
    /// Fixed errors of the two level sensors, +-5 mm.
    pub level_offset_m: [f64; 2],
    /// Half-width of the noise on levels, m; zero for none.
    pub level_noise_m: f64,
}

impl Truth {
    /// Differences drawn from a seed; the same seed gives the same truth for ever.
    pub fn drawn(seed: u64) -> Self {
        let mut r = SplitMix64::new(seed);
        Self {
            seed,
            friction_factor: r.between(0.85, 1.15),
            loss_factor: r.between(0.85, 1.15),
            pump_factor: r.between(0.85, 1.15),
            spill_factor: r.between(0.85, 1.15),
            inflow_factor: r.between(0.90, 1.10),
            lag: Span::from_seconds_f64(r.between(-600.0, 600.0)),
            unmodelled_inflow: true,
            meter_factor: r.between(0.99, 1.01),
            level_offset_m: [r.between(-0.005, 0.005), r.between(-0.005, 0.005)],
            level_noise_m: 0.003,
        }
    }
    /// No difference at all: the plant is as the plate says.
    pub const fn as_plated() -> Self {
        Self {
            seed: 0,
            friction_factor: 1.0,
            loss_factor: 1.0,
            pump_factor: 1.0,
            spill_factor: 1.0,
            inflow_factor: 1.0,
            lag: Span::ZERO,
            unmodelled_inflow: false,
            meter_factor: 1.0,
            level_offset_m: [0.0; 2],
            level_noise_m: 0.0,
        }
    }
    /// Inflow at `t` that nobody forecast, m3/s. Each UTC day has one chance in four of a shower
    /// of 100 to 900 m3 that rises and falls in straight lines over 2 to 8 h. A function of the
    /// seed and the day alone, so that it does not depend on how the time was cut up.
    pub fn unmodelled_m3_s(&self, t: Utc) -> f64 {
        if !self.unmodelled_inflow {
            return 0.0;
        }
        let today = t.floor_to(Span::days(1));
        self.shower_m3_s(today, t) + self.shower_m3_s(today - Span::days(1), t)
    }
    fn shower_m3_s(&self, day: Utc, t: Utc) -> f64 {
        let mut r = self.stream(day.as_micros() as u64, 1);
        if r.between(0.0, 1.0) >= 0.25 {
            return 0.0;
        }
        let start = day + Span::from_seconds_f64(r.between(0.0, 86_400.0));
        let length_s = r.between(2.0, 8.0) * 3_600.0;
        let volume_m3 = r.between(100.0, 900.0);
        let share = (t - start).as_seconds() / length_s;
        if !(0.0..1.0).contains(&share) {
            return 0.0;
        }
        // A triangle of that area: its peak is twice the mean.
        2.0 * volume_m3 / length_s * (1.0 - (2.0 * share - 1.0).abs())
    }
    /// Noise of one sensor at `t`, in [-1, 1): a function of seed, sensor and instant. It wanders
    /// in straight lines between values on a 30 s grid, as waves seen through a stilling well do,
    /// so that two readings close together agree.
    pub(crate) fn noise(&self, sensor: u64, t: Utc) -> f64 {
        let before = t.floor_to(NOISE_GRID);
        let value = |at: Utc| self.stream(at.as_micros() as u64, 1_000 + sensor).between(-1.0, 1.0);
        let share = (t - before).as_seconds() / NOISE_GRID.as_seconds();
        value(before) * (1.0 - share) + value(before + NOISE_GRID) * share
    }
    /// A generator for one purpose and one key, far from its neighbours.
    fn stream(&self, key: u64, purpose: u64) -> SplitMix64 {
        let mut mix = SplitMix64::new(self.seed ^ purpose.wrapping_mul(0xd6e8_feb8_6659_fd93));
        SplitMix64::new(mix.next_u64() ^ key)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source: outputs of the published reference code for seed 1234567 (from memory).
    /// Where in it: the first three.
    /// Quantity and unit: 64-bit numbers.
    /// Tolerance: none: integers.
    #[test]
    fn val_steele_splitmix64() {
        let mut r = SplitMix64::new(1_234_567);
        let first = [r.next_u64(), r.next_u64(), r.next_u64()];
        assert_eq!(
            first,
            [6_457_827_717_110_365_317, 3_203_168_211_198_807_973, 9_817_491_932_198_370_423]
        );
    }

    #[test]
    fn drawn_truths_keep_their_bounds_and_differ() {
        let mut lags = Vec::new();
        for seed in 0..500 {
            let t = Truth::drawn(seed);
            for f in [t.friction_factor, t.loss_factor, t.pump_factor, t.spill_factor] {
                assert!((0.85..1.15).contains(&f));
            }
            assert!((0.90..1.10).contains(&t.inflow_factor));
            assert!(t.lag.abs() <= Span::minutes(10));
            lags.push(t.lag);
        }
        lags.sort();
        lags.dedup();
        assert_eq!(lags.len(), 500);
        assert!(lags[0] < Span::minutes(-9) && lags[499] > Span::minutes(9));
    }

    #[test]
    fn noise_wanders_slowly_and_fills_its_band() {
        let truth = Truth::drawn(9);
        let at = |s| truth.noise(0, Utc::from_micros(1_800_000_000_000_000) + Span::seconds(s));
        let all: Vec<f64> = (0..20_000).map(at).collect();
        assert!(all.windows(2).all(|w| (w[1] - w[0]).abs() <= 2.0 / 30.0));
        assert!(all.iter().copied().fold(0.0, f64::max) > 0.9);
        assert!(all.iter().copied().fold(0.0, f64::min) < -0.9);
    }

    #[test]
    fn showers_come_on_about_a_quarter_of_days_and_within_their_volume() {
        let truth = Truth::drawn(3);
        let start = Utc::from_civil(2027, 1, 1, 0, 0, 0).unwrap();
        let mut volume_m3 = 0.0;
        for minute in 0..400 * 1440 {
            volume_m3 += truth.unmodelled_m3_s(start + Span::minutes(minute)) * 60.0;
        }
        // Expected 400 days x 1/4 x 500 m3 = 50,000 m3, with a standard deviation near 5,500.
        assert!((30_000.0..70_000.0).contains(&volume_m3), "{volume_m3}");
        assert_eq!(Truth::as_plated().unmodelled_m3_s(start), 0.0);
    }
}
