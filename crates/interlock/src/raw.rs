//! Raw readings with the checks that this crate makes by itself, whatever others made before.

use units::Span;

/// What a reading must keep to.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Bounds {
    pub min: f64,
    pub max: f64,
    pub age_max: Span,
    /// `None` where flat is healthy.
    pub frozen_after: Option<Span>,
}

/// A reading as it came. `age` and `unchanged_for` are by the boot clock.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Raw {
    pub value: f64,
    pub age: Span,
    pub unchanged_for: Span,
    pub bounds: Bounds,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum RawFault {
    NotANumber,
    OutOfRange,
    Stale,
    Frozen,
}

impl RawFault {
    pub const fn words(self) -> &'static str {
        match self {
            Self::NotANumber => "not a number",
            Self::OutOfRange => "out of range",
            Self::Stale => "stale",
            Self::Frozen => "frozen",
        }
    }
}

impl Raw {
    /// The value, if it is a number within range, young enough and alive.
    pub fn checked(&self) -> Result<f64, RawFault> {
        if !self.value.is_finite() {
            Err(RawFault::NotANumber)
        } else if self.value < self.bounds.min || self.value > self.bounds.max {
            Err(RawFault::OutOfRange)
        } else if self.age > self.bounds.age_max || self.age < Span::ZERO {
            Err(RawFault::Stale)
        } else if self.bounds.frozen_after.is_some_and(|limit| self.unchanged_for > limit) {
            Err(RawFault::Frozen)
        } else {
            Ok(self.value)
        }
    }
}
