//! Readings as they come, and as they are after validation.

use units::{Span, Utc};

use crate::SignalId;

/// One value from an adapter, as it came.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Reading {
    pub signal: SignalId,
    /// May be anything that a wire can carry; NaN is refused by validation.
    pub value: f64,
    /// What the source itself says of it.
    pub source_good: bool,
    /// When it was true, by the source.
    pub at: Utc,
}

/// A reading after range, rate, flat-line and age checks.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Validated {
    pub quality: Quality,
    /// The last value that was good, with its age.
    pub good: Option<GoodValue>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct GoodValue {
    pub value: f64,
    pub at: Utc,
    pub age: Span,
}

impl Validated {
    pub const NEVER: Self = Self { quality: Quality::Missing, good: None };

    /// The value if it is good now.
    pub fn now(&self) -> Option<f64> {
        if self.quality == Quality::Good { self.good.map(|g| g.value) } else { None }
    }
    /// The value if it was good within `age_max`.
    pub fn within(&self, age_max: Span) -> Option<f64> {
        match (self.quality, self.good) {
            (Quality::Good | Quality::Stale, Some(g)) if g.age <= age_max => Some(g.value),
            _ => None,
        }
    }
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Quality {
    Good,
    /// Never read.
    Missing,
    /// Older than its limit.
    Stale,
    NotANumber,
    OutOfRange,
    TooFast,
    Frozen,
    /// The source says so.
    BadAtSource,
    /// Stamped ahead of now.
    FromTheFuture,
}

impl Quality {
    pub const fn words(self) -> &'static str {
        match self {
            Self::Good => "good",
            Self::Missing => "never read",
            Self::Stale => "stale",
            Self::NotANumber => "not a number",
            Self::OutOfRange => "out of range",
            Self::TooFast => "changing faster than it can",
            Self::Frozen => "frozen",
            Self::BadAtSource => "bad at its source",
            Self::FromTheFuture => "stamped in the future",
        }
    }
}
