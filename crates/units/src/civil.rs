//! Civil time as data: the calendar, and a zone as a list of offset changes that `site` resolved.
//! Used at two edges only: clauses written in local time, and showing a page.

use core::fmt;

use crate::time::{Span, Utc};

/// A date and time of day without a zone.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Debug)]
pub struct Civil {
    pub year: i64,
    pub month: u32,
    pub day: u32,
    pub hour: u32,
    pub minute: u32,
    pub second: u32,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Weekday {
    Monday,
    Tuesday,
    Wednesday,
    Thursday,
    Friday,
    Saturday,
    Sunday,
}

impl Civil {
    pub const fn midnight(year: i64, month: u32, day: u32) -> Self {
        Self { year, month, day, hour: 0, minute: 0, second: 0 }
    }
    pub(crate) fn of_micros(micros: i64) -> Self {
        let s = micros.div_euclid(1_000_000);
        let (year, month, day) = civil_from_days(s.div_euclid(86_400));
        let t = s.rem_euclid(86_400) as u32;
        Self { year, month, day, hour: t / 3600, minute: t / 60 % 60, second: t % 60 }
    }
    /// This civil time read as if the zone were UTC, in seconds.
    fn as_if_utc_s(&self) -> i64 {
        days_from_civil(self.year, self.month, self.day) * 86_400
            + i64::from(self.hour * 3600 + self.minute * 60 + self.second)
    }
    pub fn weekday(&self) -> Weekday {
        use Weekday::*;
        let days = days_from_civil(self.year, self.month, self.day);
        // 1970-01-01 was a Thursday.
        [Thursday, Friday, Saturday, Sunday, Monday, Tuesday, Wednesday]
            [days.rem_euclid(7) as usize]
    }
    /// Midnight of the first day of this month, and of the next.
    pub fn month_bounds(&self) -> (Self, Self) {
        let next = if self.month == 12 { (self.year + 1, 1) } else { (self.year, self.month + 1) };
        (Self::midnight(self.year, self.month, 1), Self::midnight(next.0, next.1, 1))
    }
}

impl fmt::Display for Civil {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self { year, month, day, hour, minute, second } = self;
        write!(f, "{year:04}-{month:02}-{day:02}T{hour:02}:{minute:02}:{second:02}")
    }
}

/// What instant a civil time is in a zone: one, none (the spring gap) or two (the autumn fold).
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum LocalTime {
    One(Utc),
    /// The civil time does not exist; the clocks went forward at this instant.
    Gap(Utc),
    Fold {
        earlier: Utc,
        later: Utc,
    },
}

impl LocalTime {
    /// The earliest instant at which this civil time has been reached.
    pub const fn earliest(self) -> Utc {
        match self {
            Self::One(t) | Self::Gap(t) | Self::Fold { earlier: t, .. } => t,
        }
    }
}

/// A time zone over the years that matter: name, version of the zone data, and offset changes.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ZoneRules {
    name: String,
    data_version: String,
    first_offset_s: i32,
    changes: Vec<(Utc, i32)>,
}

impl ZoneRules {
    pub fn utc() -> Self {
        Self::new("UTC", "-", 0, Vec::new())
    }
    /// `changes` are (instant, seconds east of UTC from then on); they are put in order.
    pub fn new(
        name: &str,
        data_version: &str,
        first_offset_s: i32,
        mut changes: Vec<(Utc, i32)>,
    ) -> Self {
        changes.sort();
        Self {
            name: name.to_owned(),
            data_version: data_version.to_owned(),
            first_offset_s,
            changes,
        }
    }
    pub fn name(&self) -> &str {
        &self.name
    }
    pub fn data_version(&self) -> &str {
        &self.data_version
    }
    pub fn changes(&self) -> &[(Utc, i32)] {
        &self.changes
    }
    /// Seconds east of UTC at `t`.
    pub fn offset_s(&self, t: Utc) -> i32 {
        let n = self.changes.partition_point(|(at, _)| *at <= t);
        if n == 0 { self.first_offset_s } else { self.changes[n - 1].1 }
    }
    pub fn to_local(&self, t: Utc) -> Civil {
        Civil::of_micros(t.as_micros() + i64::from(self.offset_s(t)) * 1_000_000)
    }
    pub fn from_local(&self, c: Civil) -> LocalTime {
        let naive = c.as_if_utc_s();
        let candidate = |offset: i32| Utc::from_micros((naive - i64::from(offset)) * 1_000_000);
        let mut hits: Vec<Utc> = core::iter::once(self.first_offset_s)
            .chain(self.changes.iter().map(|c| c.1))
            .map(|o| (candidate(o), o))
            .filter(|(t, o)| self.offset_s(*t) == *o)
            .map(|(t, _)| t)
            .collect();
        hits.sort();
        hits.dedup();
        match hits[..] {
            [one] => LocalTime::One(one),
            [earlier, later, ..] => LocalTime::Fold { earlier, later },
            [] => LocalTime::Gap(self.gap_for(naive)),
        }
    }
    /// The change whose jump swallowed this civil time.
    fn gap_for(&self, naive_s: i64) -> Utc {
        let mut before = self.first_offset_s;
        for (at, after) in &self.changes {
            let start = at.as_micros() / 1_000_000;
            if naive_s >= start + i64::from(before) && naive_s < start + i64::from(*after) {
                return *at;
            }
            before = *after;
        }
        Utc::from_micros((naive_s - i64::from(before)) * 1_000_000)
    }
    /// Start and end of the local calendar month that holds `t`.
    pub fn month_of(&self, t: Utc) -> (Utc, Utc) {
        let (a, b) = self.to_local(t).month_bounds();
        (self.from_local(a).earliest(), self.from_local(b).earliest())
    }
    /// `2027-03-01T06:30:00+01:00`.
    pub fn show(&self, t: Utc) -> String {
        let o = self.offset_s(t);
        let (sign, m) = if o < 0 { ('-', -o / 60) } else { ('+', o / 60) };
        format!("{}{sign}{:02}:{:02}", self.to_local(t), m / 60, m % 60)
    }
}

/// Spans that a civil day of 24 hours at most differs by; kept here so that nobody writes 3600.
impl ZoneRules {
    pub fn day_length(&self, year: i64, month: u32, day: u32) -> Span {
        let start = self.from_local(Civil::midnight(year, month, day)).earliest();
        let (y, m, d) = civil_from_days(days_from_civil(year, month, day) + 1);
        self.from_local(Civil::midnight(y, m, d)).earliest() - start
    }
}

pub(crate) fn is_date(year: i64, month: u32, day: u32) -> bool {
    if !(1..=12).contains(&month) || day < 1 || !(1600..=2400).contains(&year) {
        return false;
    }
    civil_from_days(days_from_civil(year, month, day)) == (year, month, day)
}

/// Days from 1970-01-01 in the Gregorian calendar. Source: H. Hinnant (2014), "chrono-compatible
/// low-level date algorithms", days_from_civil.
pub(crate) fn days_from_civil(year: i64, month: u32, day: u32) -> i64 {
    let y = if month <= 2 { year - 1 } else { year };
    let era = y.div_euclid(400);
    let yoe = y.rem_euclid(400);
    let m = i64::from(month);
    let doy = (153 * (if m > 2 { m - 3 } else { m + 9 }) + 2) / 5 + i64::from(day) - 1;
    let doe = yoe * 365 + yoe / 4 - yoe / 100 + doy;
    era * 146_097 + doe - 719_468
}

/// The inverse. Source: the same, civil_from_days.
pub(crate) fn civil_from_days(days: i64) -> (i64, u32, u32) {
    let z = days + 719_468;
    let era = z.div_euclid(146_097);
    let doe = z.rem_euclid(146_097);
    let yoe = (doe - doe / 1460 + doe / 36_524 - doe / 146_096) / 365;
    let doy = doe - (365 * yoe + yoe / 4 - yoe / 100);
    let mp = (5 * doy + 2) / 153;
    let day = (doy - (153 * mp + 2) / 5 + 1) as u32;
    let month = if mp < 10 { mp + 3 } else { mp - 9 } as u32;
    (yoe + era * 400 + i64::from(month <= 2), month, day)
}

pub(crate) fn parse_utc(text: &str) -> Option<Utc> {
    let body = text.strip_suffix('Z')?;
    let (date, time) = body.split_once('T')?;
    let mut d = date.splitn(3, '-');
    let (y, mo, da) = (number(d.next()?, 4)?, number(d.next()?, 2)?, number(d.next()?, 2)?);
    let (hms, fraction) = time.split_once('.').unwrap_or((time, ""));
    let mut t = hms.split(':');
    let (h, mi) = (number(t.next()?, 2)?, number(t.next()?, 2)?);
    let s = t.next().map_or(Some(0), |s| number(s, 2))?;
    if t.next().is_some() || fraction.len() > 6 || !fraction.bytes().all(|b| b.is_ascii_digit()) {
        return None;
    }
    let whole = Utc::from_civil(y, mo as u32, da as u32, h as u32, mi as u32, s as u32).ok()?;
    let micros = format!("{fraction:0<6}").parse::<i64>().ok()?;
    Some(whole + Span::micros(micros))
}

fn number(text: &str, digits: usize) -> Option<i64> {
    let ok = text.len() == digits && text.bytes().all(|b| b.is_ascii_digit());
    ok.then(|| text.parse().ok()).flatten()
}

#[cfg(test)]
mod tests;
