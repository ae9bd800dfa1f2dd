//! One signal through time.
//!
//! A reading is looked at in this order; the first thing that is wrong names it:
//! not a number, bad at its source, stamped ahead, not younger than the last (dropped in silence),
//! out of range, too fast. Frozen and stale are seen when the signal is asked for.
//!
//! The first two count whatever the stamp says: a source may repeat its last time with a worse
//! quality, and that must not be lost as a repetition.

use model::{GoodValue, Quality, Reading, Signal, Validated};
use units::{Span, Utc};

/// A clock a little ahead of ours is forgiven; more is a reading from the future.
const AHEAD_MAX: Span = Span::seconds(5);
/// A jump that stands for this many readings, one after the other, is real and not a spike.
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
        if self.last_at.is_some_and(|last| is_ahead(last, now)) {
            // Our own clock went back: what was known is of a time that has not come. Without this,
            // every true reading would be dropped as older until that time is reached again.
            *self = Self::default();
        }
        match bad_in_itself(r).or(is_ahead(r.at, now).then_some(Quality::FromTheFuture)) {
            Some(fault) => {
                // A stamp ahead is not taken in, or it would make all that follow look old.
                let taken = Some(r.at).filter(|at| !is_ahead(*at, now));
                self.last_at = self.last_at.max(taken);
                self.fail(fault);
            }
            None if self.last_at.is_some_and(|last| r.at <= last) => {}
            None => {
                self.last_at = Some(r.at);
                self.judge(spec, r);
            }
        }
    }

    fn fail(&mut self, fault: Quality) {
        self.fault = Some(fault);
        self.jump = None;
    }

    fn judge(&mut self, spec: &Signal, r: &Reading) {
        if !(spec.value_min..=spec.value_max).contains(&r.value) {
            return self.fail(Quality::OutOfRange);
        }
        self.fault = None;
        if let (Some(good), Some(rate)) = (self.good, spec.rate_max_per_s)
            && too_fast(good.value, good.at, r, rate)
            && !self.jump_stands(r, rate)
        {
            self.fault = Some(Quality::TooFast);
            return;
        }
        self.jump = None;
        let same = self.good.filter(|g| g.value == r.value);
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
            // Our clock went back: how old it is cannot be said, and so it is not good.
            (None, Some(g)) if is_ahead(g.at, now) => Quality::FromTheFuture,
            (None, Some(g)) if now - g.at > spec.age_max => Quality::Stale,
            (None, Some(g)) if spec.frozen_after.is_some_and(|f| g.at - g.since >= f) => {
                Quality::Frozen
            }
            (None, Some(_)) => Quality::Good,
        };
        Validated { quality, good }
    }
}

fn is_ahead(at: Utc, now: Utc) -> bool {
    at > now + AHEAD_MAX
}

/// What is wrong with a reading whenever it was true.
fn bad_in_itself(r: &Reading) -> Option<Quality> {
    if !r.value.is_finite() {
        Some(Quality::NotANumber)
    } else if !r.source_good {
        Some(Quality::BadAtSource)
    } else {
        None
    }
}

fn too_fast(from: f64, at: Utc, r: &Reading, rate_max_per_s: f64) -> bool {
    (r.value - from).abs() > rate_max_per_s * (r.at - at).as_seconds()
}

#[cfg(test)]
mod tests;
