//! When a duty is due: cron expressions on the site's civil time.
//!
//! Expressions have six fields: second, minute, hour, day of month, month, day of week. The library
//! behind them drops what falls into spring's gap and counts autumn's hour by its civil name; here a
//! run in the gap comes at the gap's end, and one in the doubled hour once, in the first pass, unless
//! the duty says both.

use chrono::{DateTime, LocalResult, NaiveDateTime, TimeZone};
use chrono_tz::Tz;
use cron::Schedule as Cron;
use units::{Span, Utc};

/// The expression and the zone, ready to be asked.
#[derive(Clone, Debug)]
pub struct Schedule {
    cron: Cron,
    zone: Tz,
    in_both_passes: bool,
}

/// Civil times may lie this far out of order: no zone changes by more at once (from memory; the
/// largest of the years that matter is an hour, and 24 h where a country crossed the date line).
const DISORDER: Span = Span::hours(4);
/// A duty comes no more often than this.
pub(crate) const CLOSEST: Span = Span::minutes(1);

impl Schedule {
    /// `zone` is an IANA name. The error says what is wrong with the expression, in words for a
    /// person.
    pub fn new(expression: &str, zone: &str, in_both_passes: bool) -> Result<Self, String> {
        let zone = zone.parse::<Tz>().map_err(|_| format!("{zone:?} is no time zone"))?;
        let fields: Vec<&str> = expression.split_whitespace().collect();
        if fields.len() != 6 {
            return Err(format!("it has {} fields instead of six", fields.len()));
        }
        if fields[5].bytes().any(|b| b.is_ascii_digit()) {
            return Err("a day of the week is given by its name, as numbers differ".to_owned());
        }
        let cron = expression.parse::<Cron>().map_err(|e| e.to_string())?;
        let schedule = Self { cron, zone, in_both_passes };
        schedule.sparse()?;
        Ok(schedule)
    }

    /// Refuses what never comes, and what comes too often.
    fn sparse(&self) -> Result<(), String> {
        let epoch = DateTime::from_timestamp(0, 0).expect("1970 is in chrono's calendar");
        let first: Vec<_> = self.cron.after(&epoch).take(120).collect();
        if first.is_empty() {
            return Err("no day fits it".to_owned());
        }
        let close = |p: &[DateTime<chrono::Utc>]| {
            (p[1] - p[0]).num_microseconds().is_some_and(|us| us < CLOSEST.as_micros())
        };
        if first.windows(2).any(close) {
            return Err("it comes more than once a minute".to_owned());
        }
        Ok(())
    }

    /// The first instant after `now` at which it is due; none after the year 2100, where the
    /// expressions end.
    pub fn next(&self, now: Utc) -> Option<Utc> {
        let from = self.civil(now)? - chrono::Duration::microseconds(DISORDER.as_micros());
        let mut best: Option<(NaiveDateTime, Utc)> = None;
        for hit in self.cron.after(&from.and_utc()) {
            let hit = hit.naive_utc();
            if best.is_some_and(|(at, _)| hit > at + chrono::Duration::hours(4)) {
                break;
            }
            for due in self.instants(hit).into_iter().filter(|due| *due > now) {
                if best.is_none_or(|(_, earliest)| due < earliest) {
                    best = Some((hit, due));
                }
            }
        }
        best.map(|(_, due)| due)
    }

    fn civil(&self, at: Utc) -> Option<NaiveDateTime> {
        let utc = DateTime::from_timestamp_micros(at.as_micros())?;
        Some(utc.with_timezone(&self.zone).naive_local())
    }

    /// The instants that a civil time stands for here.
    fn instants(&self, civil: NaiveDateTime) -> Vec<Utc> {
        let utc = |t: DateTime<Tz>| Utc::from_micros(t.timestamp_micros());
        match self.zone.from_local_datetime(&civil) {
            LocalResult::Single(t) => vec![utc(t)],
            LocalResult::Ambiguous(first, second) if self.in_both_passes => {
                vec![utc(first), utc(second)]
            }
            LocalResult::Ambiguous(first, _) => vec![utc(first)],
            LocalResult::None => self.end_of_gap(civil).into_iter().collect(),
        }
    }

    /// The first minute that exists after a civil time that does not.
    fn end_of_gap(&self, civil: NaiveDateTime) -> Option<Utc> {
        let minute = |t: NaiveDateTime| t - chrono::Duration::seconds(t.and_utc().timestamp() % 60);
        let later = (1..=24 * 60).map(|n| minute(civil) + chrono::Duration::minutes(n));
        let first = later.filter_map(|t| self.zone.from_local_datetime(&t).earliest()).next()?;
        Some(Utc::from_micros(first.timestamp_micros()))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn utc(text: &str) -> Utc {
        Utc::parse(text).unwrap()
    }

    fn runs(expression: &str, zone: &str, both: bool, from: &str, to: &str) -> Vec<String> {
        let schedule = Schedule::new(expression, zone, both).unwrap();
        let (mut at, to) = (utc(from), utc(to));
        let mut all = Vec::new();
        while let Some(next) = schedule.next(at).filter(|n| *n < to) {
            assert!(next > at, "time runs on");
            all.push(next.to_string());
            at = next;
        }
        all
    }

    /// Source: the IANA time zone database (as compiled into chrono-tz), Europe/London, 2027.
    /// Where: clocks go forward at 01:00 UTC on 28 March.
    /// Quantity: instants of a daily 01:30.
    /// Tolerance: none; a run in the gap comes at its end.
    #[test]
    fn val_iana_nothing_is_dropped_in_the_spring_gap() {
        let all =
            runs("0 30 1 * * *", "Europe/London", false, "2027-03-27T00:00Z", "2027-03-30T00:00Z");
        assert_eq!(all, ["2027-03-27T01:30:00Z", "2027-03-28T01:00:00Z", "2027-03-29T00:30:00Z"]);
        // Both half hours of the gap come to one instant, and are one run.
        let half = runs(
            "0 */30 * * * *",
            "Europe/London",
            false,
            "2027-03-28T00:00Z",
            "2027-03-28T02:31Z",
        );
        let wanted = ["00:30", "01:00", "01:30", "02:00", "02:30"];
        assert_eq!(half, wanted.map(|t| format!("2027-03-28T{t}:00Z")));
    }

    /// Source: the IANA time zone database (as compiled into chrono-tz), Europe/London, 2027.
    /// Where: clocks go back at 01:00 UTC on 31 October.
    /// Quantity: instants of a daily 01:30 and of each half hour.
    /// Tolerance: none; once unless the duty says both.
    #[test]
    fn val_iana_nothing_comes_twice_in_autumn_unless_it_says_so() {
        let (from, to) = ("2027-10-31T00:00Z", "2027-11-01T00:00Z");
        let once = runs("0 30 1 * * *", "Europe/London", false, from, to);
        assert_eq!(once, ["2027-10-31T00:30:00Z"]);
        let both = runs("0 30 1 * * *", "Europe/London", true, from, to);
        assert_eq!(both, ["2027-10-31T00:30:00Z", "2027-10-31T01:30:00Z"]);
        let all =
            runs("0 */30 * * * *", "Europe/London", true, "2027-10-30T23:59Z", "2027-10-31T03:01Z");
        let wanted = ["00:00", "00:30", "01:00", "01:30", "02:00", "02:30", "03:00"];
        assert_eq!(all, wanted.map(|t| format!("2027-10-31T{t}:00Z")));
    }

    /// Source: the IANA time zone database (as compiled into chrono-tz), Australia/Lord_Howe, 2027.
    /// Where: summer time there is half an hour; clocks go back at 15:00 UTC on 3 April.
    /// Quantity: instants of 01:45, which that night has twice.
    /// Tolerance: none.
    #[test]
    fn val_iana_a_zone_of_half_hours() {
        let night = ("2027-04-03T12:00Z", "2027-04-04T12:00Z");
        let zone = "Australia/Lord_Howe";
        let once = runs("0 45 1 * * *", zone, false, night.0, night.1);
        assert_eq!(once, ["2027-04-03T14:45:00Z"]);
        let both = runs("0 45 1 * * *", zone, true, night.0, night.1);
        assert_eq!(both, ["2027-04-03T14:45:00Z", "2027-04-03T15:15:00Z"]);
    }

    #[test]
    fn asked_in_the_second_pass_it_never_answers_with_the_past() {
        let schedule = Schedule::new("0 30 1 * * *", "Europe/London", false).unwrap();
        let second_pass = utc("2027-10-31T01:10Z");
        assert_eq!(schedule.next(second_pass), Some(utc("2027-11-01T01:30Z")));
    }

    #[test]
    fn an_expression_that_cannot_be_meant_is_refused_in_words() {
        let why = |e: &str| Schedule::new(e, "UTC", false).unwrap_err();
        assert!(why("30 1 * * *").contains("5 fields instead of six"));
        assert!(why("0 0 0 * * 1").contains("by its name"));
        assert!(why("* * * * * *").contains("more than once a minute"));
        assert!(why("0 0 0 30 2 *").contains("no day fits"));
        assert!(!why("0 0 25 * * *").is_empty());
        assert!(Schedule::new("0 0 0 * * MON", "UTC", false).is_ok());
    }
}
