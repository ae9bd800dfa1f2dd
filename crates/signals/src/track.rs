//! One signal through time.

use model::{GoodValue, Quality, Reading, Signal, Validated};
use units::{Span, Utc};

/// A clock a little ahead of ours is forgiven; more is a reading from the future.
const AHEAD_MAX: Span = Span::seconds(5);
/// A jump that stands for this many readings is real and not a spike.
const SPIKE_READINGS: u32 = 3;

#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub(crate) struct Track {
    last_at: Option<Utc>,
    fault: Option<Quality>,
    good: Option<Good>,
    jump: Option<Jump>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
struct Good {
    value: f64,
    at: Utc,
    /// Since when the value has been exactly this.
    since: Utc,
}

/// Readings that jumped and agree with each other.
#[derive(Clone, Copy, PartialEq, Debug)]
struct Jump {
    value: f64,
    at: Utc,
    count: u32,
}

impl Track {
    pub(crate) fn take(&mut self, spec: &Signal, r: &Reading, now: Utc) {
        if r.at > now + AHEAD_MAX {
            self.fault = Some(Quality::FromTheFuture);
            return;
        }
        if self.last_at.is_some_and(|last| r.at <= last) {
            return;
        }
        self.last_at = Some(r.at);
        self.fault = fault_of(spec, r);
        if self.fault.is_none() {
            self.accept(spec, r);
        }
    }

    fn accept(&mut self, spec: &Signal, r: &Reading) {
        if let (Some(good), Some(rate)) = (self.good, spec.rate_max_per_s)
            && too_fast(good.value, good.at, r, rate)
            && !self.jump_stands(r, rate)
        {
            self.fault = Some(Quality::TooFast);
            return;
        }
        self.jump = None;
        let same = self.good.filter(|g| g.value.to_bits() == r.value.to_bits());
        let since = same.map_or(r.at, |g| g.since);
        self.good = Some(Good { value: r.value, at: r.at, since });
    }

    /// Counts readings that agree with each other at the new level.
    fn jump_stands(&mut self, r: &Reading, rate_max_per_s: f64) -> bool {
        let agrees = self.jump.filter(|j| !too_fast(j.value, j.at, r, rate_max_per_s));
        let count = agrees.map_or(1, |j| j.count + 1);
        self.jump = Some(Jump { value: r.value, at: r.at, count });
        count >= SPIKE_READINGS
    }

    pub(crate) fn state(&self, spec: &Signal, now: Utc) -> Validated {
        let good = self.good.map(|g| GoodValue { value: g.value, at: g.at, age: now - g.at });
        let quality = match (self.fault, self.good) {
            (Some(fault), _) => fault,
            (None, None) => Quality::Missing,
            (None, Some(g)) if now - g.at > spec.age_max => Quality::Stale,
            (None, Some(g)) if spec.frozen_after.is_some_and(|f| g.at - g.since > f) => {
                Quality::Frozen
            }
            (None, Some(_)) => Quality::Good,
        };
        Validated { quality, good }
    }
}

fn fault_of(spec: &Signal, r: &Reading) -> Option<Quality> {
    if !r.source_good {
        Some(Quality::BadAtSource)
    } else if !r.value.is_finite() {
        Some(Quality::NotANumber)
    } else if r.value < spec.value_min || r.value > spec.value_max {
        Some(Quality::OutOfRange)
    } else {
        None
    }
}

fn too_fast(from: f64, at: Utc, r: &Reading, rate_max_per_s: f64) -> bool {
    (r.value - from).abs() > rate_max_per_s * (r.at - at).as_seconds()
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::Validator;
    use model::{AdapterId, SignalId};

    fn level() -> Signal {
        Signal {
            id: SignalId(0),
            name: "level".to_owned(),
            adapter: AdapterId(0),
            point: "level".to_owned(),
            unit: "m".to_owned(),
            value_min: 0.0,
            value_max: 10.0,
            rate_max_per_s: Some(0.01),
            age_max: Span::seconds(60),
            frozen_after: Some(Span::minutes(30)),
        }
    }

    fn at(s: i64) -> Utc {
        Utc::EPOCH + Span::seconds(s)
    }

    fn fed(list: &[(i64, f64)]) -> Validator {
        let mut v = Validator::for_signals(vec![level()]);
        for (s, value) in list {
            let r = Reading { signal: SignalId(0), value: *value, source_good: true, at: at(*s) };
            v.take(&r, at(*s));
        }
        v
    }

    fn quality(v: &Validator, s: i64) -> Quality {
        v.state(SignalId(0), at(s)).quality
    }

    #[test]
    fn each_fault_has_its_own_name() {
        assert_eq!(quality(&fed(&[]), 0), Quality::Missing);
        assert_eq!(quality(&fed(&[(0, f64::NAN)]), 0), Quality::NotANumber);
        assert_eq!(quality(&fed(&[(0, 10.1)]), 0), Quality::OutOfRange);
        assert_eq!(quality(&fed(&[(0, 5.0)]), 60), Quality::Good);
        assert_eq!(quality(&fed(&[(0, 5.0)]), 61), Quality::Stale);
        let mut v = fed(&[(0, 5.0)]);
        let bad = Reading { signal: SignalId(0), value: 5.0, source_good: false, at: at(10) };
        v.take(&bad, at(10));
        assert_eq!(quality(&v, 10), Quality::BadAtSource);
        v.take(&Reading { at: at(100), source_good: true, ..bad }, at(20));
        assert_eq!(quality(&v, 20), Quality::FromTheFuture);
    }

    #[test]
    fn a_value_that_never_moves_is_frozen_and_one_that_moves_a_little_is_not() {
        let flat: Vec<_> = (0..62).map(|n| (n * 30, 5.0)).collect();
        assert_eq!(quality(&fed(&flat), 61 * 30), Quality::Frozen);
        let alive: Vec<_> = (0..62).map(|n| (n * 30, 5.0 + 1e-6 * n as f64)).collect();
        assert_eq!(quality(&fed(&alive), 61 * 30), Quality::Good);
    }

    #[test]
    fn a_spike_is_held_back_and_a_step_that_stands_is_believed() {
        let spike = fed(&[(0, 5.0), (10, 7.0)]);
        assert_eq!(quality(&spike, 10), Quality::TooFast);
        assert_eq!(quality(&fed(&[(0, 5.0), (10, 7.0), (20, 5.05)]), 20), Quality::Good);
        let step = fed(&[(0, 5.0), (10, 7.0), (20, 7.01), (30, 7.02)]);
        assert_eq!(step.state(SignalId(0), at(30)).now(), Some(7.02));
    }

    #[test]
    fn an_older_or_repeated_reading_changes_nothing() {
        let v = fed(&[(20, 5.0), (10, 5.05), (20, 5.1)]);
        assert_eq!(v.state(SignalId(0), at(20)).now(), Some(5.0));
    }

    proptest! {
        #![proptest_config(ProptestConfig {
            failure_persistence: None, ..ProptestConfig::default()
        })]
        #[test]
        fn prop_nothing_but_a_number_in_range_is_ever_good(
            list in prop::collection::vec((0..4000_i64, prop_oneof![
                -5.0..15.0_f64, Just(f64::NAN), Just(f64::NEG_INFINITY)
            ]), 0..60),
            ask in 0..5000_i64,
        ) {
            let v = fed(&list);
            if let Some(value) = v.state(SignalId(0), at(ask)).good.map(|g| g.value) {
                prop_assert!((0.0..=10.0).contains(&value));
            }
        }
    }
}
