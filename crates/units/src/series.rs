//! A quantity on a regular grid of instants.

use core::fmt;

use crate::time::{Span, Utc};
use crate::window::{Window, Windows};

/// Values at `start`, `start + step`, ... as plain finite numbers; the unit is in the name of what
/// holds the series.
#[derive(Clone, PartialEq, Debug)]
pub struct Series {
    start: Utc,
    step: Span,
    values: Vec<f64>,
}

/// Why a series cannot be made.
#[derive(Clone, PartialEq, Debug)]
pub enum BadSeries {
    StepNotPositive(Span),
    TooShort(usize),
    NotFinite { index: usize, value: f64 },
}

impl fmt::Display for BadSeries {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::StepNotPositive(s) => {
                write!(f, "the step of a series must be over zero, not {s}")
            }
            Self::TooShort(n) => write!(f, "a series needs two values or more, not {n}"),
            Self::NotFinite { index, value } => write!(f, "value {index} of a series is {value}"),
        }
    }
}
impl std::error::Error for BadSeries {}

impl Series {
    pub fn new(start: Utc, step: Span, values: Vec<f64>) -> Result<Self, BadSeries> {
        if step <= Span::ZERO {
            return Err(BadSeries::StepNotPositive(step));
        }
        if values.len() < 2 {
            return Err(BadSeries::TooShort(values.len()));
        }
        if let Some(index) = values.iter().position(|v| !v.is_finite()) {
            return Err(BadSeries::NotFinite { index, value: values[index] });
        }
        Ok(Self { start, step, values })
    }
    /// The value of `f` at each grid instant of `span`, one past the end included.
    pub fn sampled(
        span: &Window,
        step: Span,
        f: impl FnMut(Utc) -> f64,
    ) -> Result<Self, BadSeries> {
        if step <= Span::ZERO {
            return Err(BadSeries::StepNotPositive(step));
        }
        let n = (span.length().as_micros() + step.as_micros() - 1) / step.as_micros() + 1;
        let values = (0..n).map(|i| span.start() + step * i).map(f).collect();
        Self::new(span.start(), step, values)
    }
    pub const fn start(&self) -> Utc {
        self.start
    }
    pub const fn step(&self) -> Span {
        self.step
    }
    pub fn values(&self) -> &[f64] {
        &self.values
    }
    pub fn instant(&self, index: usize) -> Utc {
        self.start + self.step * index as i64
    }
    /// The last instant that has a value.
    pub fn last_instant(&self) -> Utc {
        self.instant(self.values.len() - 1)
    }
    /// Linear between neighbours; `None` outside the grid.
    pub fn at(&self, t: Utc) -> Option<f64> {
        let offset = (t - self.start).as_micros();
        if offset < 0 || t > self.last_instant() {
            return None;
        }
        let i = (offset / self.step.as_micros()) as usize;
        let frac = (offset % self.step.as_micros()) as f64 / self.step.as_micros() as f64;
        let a = self.values[i];
        let b = self.values.get(i + 1).copied().unwrap_or(a);
        Some(a + (b - a) * frac)
    }
    /// Where the linear curve is at `limit` or above, edges to the microsecond.
    pub fn at_least(&self, limit: f64) -> Windows {
        let last = self.values.len() - 1;
        (0..last).filter_map(|i| self.piece_at_least(i, limit)).collect()
    }
    fn piece_at_least(&self, i: usize, limit: f64) -> Option<Window> {
        let (a, b) = (self.values[i], self.values[i + 1]);
        let (t0, t1) = (self.instant(i), self.instant(i + 1));
        let crossing = || t0 + self.step.scaled((limit - a) / (b - a));
        match (a >= limit, b >= limit) {
            (true, true) => Window::new(t0, t1).ok(),
            (false, false) => None,
            (true, false) => Window::new(t0, crossing()).ok(),
            (false, true) => Window::new(crossing(), t1).ok(),
        }
    }
}
