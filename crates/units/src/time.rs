//! Instants and spans. `Utc` is for tide, licence and journal; `Mono` is the boot clock, for
//! leases, timeouts and hold times. There is no conversion between them.

use core::fmt;
use core::ops::{Add, AddAssign, Mul, Neg, Sub};

use crate::civil;

/// A signed span of time in whole microseconds.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug, Default)]
pub struct Span {
    micros: i64,
}

impl Span {
    pub const ZERO: Self = Self { micros: 0 };

    pub const fn micros(micros: i64) -> Self {
        Self { micros }
    }
    pub const fn millis(n: i64) -> Self {
        Self { micros: n * 1_000 }
    }
    pub const fn seconds(n: i64) -> Self {
        Self { micros: n * 1_000_000 }
    }
    pub const fn minutes(n: i64) -> Self {
        Self::seconds(n * 60)
    }
    pub const fn hours(n: i64) -> Self {
        Self::seconds(n * 3600)
    }
    pub const fn days(n: i64) -> Self {
        Self::seconds(n * 86_400)
    }
    /// The nearest span to `s` seconds; half a microsecond goes away from zero. A value that is
    /// not finite or over 292 thousand years saturates, and NaN gives zero.
    pub fn from_seconds_f64(s: f64) -> Self {
        Self { micros: (s * 1e6).round() as i64 }
    }
    pub fn from_minutes_f64(m: f64) -> Self {
        Self::from_seconds_f64(m * 60.0)
    }
    pub const fn as_micros(self) -> i64 {
        self.micros
    }
    pub fn as_seconds(self) -> f64 {
        self.micros as f64 / 1e6
    }
    pub fn as_minutes(self) -> f64 {
        self.as_seconds() / 60.0
    }
    pub fn as_hours(self) -> f64 {
        self.as_seconds() / 3600.0
    }
    pub const fn abs(self) -> Self {
        Self { micros: self.micros.abs() }
    }
    /// This span times a factor, to the nearest microsecond.
    pub fn scaled(self, factor: f64) -> Self {
        Self::from_seconds_f64(self.as_seconds() * factor)
    }
}

impl fmt::Display for Span {
    /// `-1:05:30` as hours, minutes, seconds.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let s = self.micros.abs() / 1_000_000;
        let sign = if self.micros < 0 { "-" } else { "" };
        write!(f, "{sign}{}:{:02}:{:02}", s / 3600, s / 60 % 60, s % 60)
    }
}

impl Add for Span {
    type Output = Self;
    fn add(self, o: Self) -> Self {
        Self { micros: self.micros.saturating_add(o.micros) }
    }
}
impl AddAssign for Span {
    fn add_assign(&mut self, o: Self) {
        *self = *self + o;
    }
}
impl Sub for Span {
    type Output = Self;
    fn sub(self, o: Self) -> Self {
        Self { micros: self.micros.saturating_sub(o.micros) }
    }
}
impl Neg for Span {
    type Output = Self;
    fn neg(self) -> Self {
        Self { micros: -self.micros }
    }
}
impl Mul<i64> for Span {
    type Output = Self;
    fn mul(self, n: i64) -> Self {
        Self { micros: self.micros.saturating_mul(n) }
    }
}

/// An instant of civil time: microseconds since 1970-01-01T00:00Z, POSIX, no leap seconds.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Utc {
    micros: i64,
}

/// Text or a date that is no instant.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct BadInstant(pub String);

impl fmt::Display for BadInstant {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{:?} is no UTC instant; write it like 2027-03-01T06:30:00Z", self.0)
    }
}
impl std::error::Error for BadInstant {}

impl Utc {
    pub const EPOCH: Self = Self { micros: 0 };

    pub const fn from_micros(micros: i64) -> Self {
        Self { micros }
    }
    pub const fn as_micros(self) -> i64 {
        self.micros
    }
    pub fn as_seconds(self) -> f64 {
        self.micros as f64 / 1e6
    }
    /// Midnight-based civil date and time in UTC. Refuses a date that the calendar does not have.
    pub fn from_civil(
        year: i64,
        month: u32,
        day: u32,
        hour: u32,
        minute: u32,
        second: u32,
    ) -> Result<Self, BadInstant> {
        let text = || format!("{year:04}-{month:02}-{day:02}T{hour:02}:{minute:02}:{second:02}Z");
        if !civil::is_date(year, month, day) || hour > 23 || minute > 59 || second > 59 {
            return Err(BadInstant(text()));
        }
        let days = civil::days_from_civil(year, month, day);
        let s = days * 86_400 + i64::from(hour * 3600 + minute * 60 + second);
        Ok(Self { micros: s * 1_000_000 })
    }
    /// Reads `2027-03-01T06:30:00Z`, `2027-03-01T06:30Z` or with a fraction of a second.
    pub fn parse(text: &str) -> Result<Self, BadInstant> {
        civil::parse_utc(text).ok_or_else(|| BadInstant(text.to_owned()))
    }
    /// The last multiple of `step` (counted from 1970) at or before this instant.
    pub const fn floor_to(self, step: Span) -> Self {
        let r = self.micros.rem_euclid(step.as_micros());
        Self { micros: self.micros - r }
    }
    /// The first multiple of `step` (counted from 1970) at or after this instant.
    pub const fn ceil_to(self, step: Span) -> Self {
        let r = self.micros.rem_euclid(step.as_micros());
        if r == 0 { self } else { Self { micros: self.micros - r + step.as_micros() } }
    }
}

impl fmt::Display for Utc {
    /// ISO 8601 to the second, with `Z`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let c = civil::Civil::of_micros(self.micros);
        write!(f, "{c}Z")
    }
}

impl Add<Span> for Utc {
    type Output = Self;
    fn add(self, s: Span) -> Self {
        Self { micros: self.micros.saturating_add(s.micros) }
    }
}
impl Sub<Span> for Utc {
    type Output = Self;
    fn sub(self, s: Span) -> Self {
        Self { micros: self.micros.saturating_sub(s.micros) }
    }
}
impl Sub for Utc {
    type Output = Span;
    fn sub(self, o: Self) -> Span {
        Span { micros: self.micros.saturating_sub(o.micros) }
    }
}

/// An instant of the boot clock: nanoseconds, counts suspend, never steps. Meaningful only within
/// one boot of one host.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug, Default)]
pub struct Mono {
    nanos: u64,
}

impl Mono {
    pub const ZERO: Self = Self { nanos: 0 };

    pub const fn from_nanos(nanos: u64) -> Self {
        Self { nanos }
    }
    pub const fn as_nanos(self) -> u64 {
        self.nanos
    }
    /// How long ago `earlier` was; zero if it lies ahead.
    pub const fn since(self, earlier: Self) -> Span {
        Span { micros: (self.nanos.saturating_sub(earlier.nanos) / 1_000) as i64 }
    }
}

impl Add<Span> for Mono {
    type Output = Self;
    fn add(self, s: Span) -> Self {
        let d = s.micros.unsigned_abs().saturating_mul(1_000);
        let nanos =
            if s.micros >= 0 { self.nanos.saturating_add(d) } else { self.nanos.saturating_sub(d) };
        Self { nanos }
    }
}
