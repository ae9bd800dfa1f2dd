//! The calendar and both clock-change nights.

use super::*;

fn london_2027() -> ZoneRules {
    // Summer time 2027: 28 March 01:00 UTC to 31 October 01:00 UTC (Directive 2000/84/EC rule,
    // which UK law shares: last Sunday, 01:00 UTC).
    let at = |mo, d| Utc::from_civil(2027, mo, d, 1, 0, 0).unwrap();
    ZoneRules::new("Europe/London", "test", 0, vec![(at(3, 28), 3600), (at(10, 31), 0)])
}

#[test]
fn prop_calendar_round_trips_over_eight_centuries() {
    for days in days_from_civil(1600, 1, 1)..days_from_civil(2400, 1, 1) {
        let (y, m, d) = civil_from_days(days);
        assert_eq!(days_from_civil(y, m, d), days);
    }
}

#[test]
fn the_spring_gap_has_no_instant_and_the_autumn_fold_has_two() {
    let z = london_2027();
    let c = |mo, d, h, mi| Civil { year: 2027, month: mo, day: d, hour: h, minute: mi, second: 0 };
    let utc = |mo, d, h, mi| Utc::from_civil(2027, mo, d, h, mi, 0).unwrap();
    assert_eq!(z.from_local(c(3, 28, 1, 30)), LocalTime::Gap(utc(3, 28, 1, 0)));
    let fold = LocalTime::Fold { earlier: utc(10, 31, 0, 30), later: utc(10, 31, 1, 30) };
    assert_eq!(z.from_local(c(10, 31, 1, 30)), fold);
    assert_eq!(z.from_local(c(7, 1, 12, 0)), LocalTime::One(utc(7, 1, 11, 0)));
    assert_eq!(z.day_length(2027, 3, 28), Span::hours(23));
    assert_eq!(z.day_length(2027, 10, 31), Span::hours(25));
}

#[test]
fn a_local_month_is_an_hour_short_or_long_with_the_clocks() {
    let z = london_2027();
    let length = |mo| {
        let (a, b) = z.month_of(Utc::from_civil(2027, mo, 15, 12, 0, 0).unwrap());
        b - a
    };
    assert_eq!(length(3), Span::hours(31 * 24 - 1));
    assert_eq!(length(10), Span::hours(31 * 24 + 1));
    assert_eq!(length(7), Span::days(31));
}

#[test]
fn instants_are_read_strictly() {
    for bad in
        ["2027-02-29T00:00:00Z", "2027-03-01T24:00Z", "2027-03-01 06:30Z", "2027-03-01T06:30"]
    {
        assert!(Utc::parse(bad).is_err(), "{bad}");
    }
    let t = Utc::parse("2027-03-01T06:30:15.25Z").unwrap();
    assert_eq!(t.to_string(), "2027-03-01T06:30:15Z");
    assert_eq!(t.as_micros() % 1_000_000, 250_000);
}
