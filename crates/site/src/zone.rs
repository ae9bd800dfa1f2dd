//! A named time zone as data: its changes of offset over the years that matter.

use chrono::{DateTime, Offset, TimeZone};
use chrono_tz::Tz;
use units::{Span, Utc, ZoneRules};

use crate::codes;
use crate::names::nearest;
use crate::raw::Node;

/// Changes are listed for the years [first, last).
const YEARS: (i64, i64) = (2000, 2051);

/// Twice a day: no zone has changed and changed back within half a day.
const STEP: Span = Span::hours(12);

/// The zone that this text names, as an IANA name.
pub(crate) fn zone(node: &Node<'_>) -> Option<ZoneRules> {
    let name = node.text("\"Europe/London\"")?;
    let Ok(tz) = name.parse::<Tz>() else {
        let remedy = match nearest(name, chrono_tz::TZ_VARIANTS.iter().map(|z| z.name())) {
            Some(n) => format!("did you mean {n:?}?"),
            None => "write an IANA name, like \"Europe/London\" or \"UTC\"".to_owned(),
        };
        return node.fault(
            codes::UNKNOWN_ZONE,
            "the zone must be a name of the IANA time zone database",
            remedy,
        );
    };
    Some(rules(tz))
}

/// All changes of offset: found by sampling, then by bisection to the second.
fn rules(tz: Tz) -> ZoneRules {
    let year = |y| Utc::from_civil(y, 1, 1, 0, 0, 0).expect("the first of January exists");
    let (start, end) = (year(YEARS.0), year(YEARS.1));
    let first = offset_s(tz, start);
    let mut changes = Vec::new();
    let (mut at, mut before) = (start, first);
    while at < end {
        let next = at + STEP;
        let after = offset_s(tz, next);
        if after != before {
            changes.push((change_between(tz, at, next, before), after));
        }
        (at, before) = (next, after);
    }
    ZoneRules::new(tz.name(), chrono_tz::IANA_TZDB_VERSION, first, changes)
}

fn change_between(tz: Tz, mut low: Utc, mut high: Utc, before: i32) -> Utc {
    while high - low > Span::seconds(1) {
        let middle = (low + (high - low).scaled(0.5)).floor_to(Span::seconds(1));
        if offset_s(tz, middle) == before { low = middle } else { high = middle }
    }
    high
}

/// Seconds east of UTC.
fn offset_s(tz: Tz, t: Utc) -> i32 {
    let utc = DateTime::from_timestamp(t.as_micros().div_euclid(1_000_000), 0)
        .expect("the years looked at lie far inside chrono's calendar")
        .naive_utc();
    tz.offset_from_utc_datetime(&utc).fix().local_minus_utc()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn utc(text: &str) -> Utc {
        Utc::parse(text).unwrap()
    }

    /// Source: Council Directive 2000/84/EC, articles 2 and 3 (and the UK Summer Time Order 2002).
    /// Where: last Sundays of March and October, 01:00 UTC.
    /// Quantity and unit: instants of change of Europe/London in 2027, s.
    /// Tolerance and why: exact; the rule is exact.
    #[test]
    fn val_eu_directive_2000_84_summer_time_2027() {
        let z = rules(chrono_tz::Europe::London);
        let in_2027: Vec<_> = z
            .changes()
            .iter()
            .filter(|c| c.0 > utc("2027-01-01T00:00Z") && c.0 < utc("2028-01-01T00:00Z"))
            .copied()
            .collect();
        let wanted = [(utc("2027-03-28T01:00:00Z"), 3600), (utc("2027-10-31T01:00:00Z"), 0)];
        assert_eq!(in_2027, wanted);
        assert_eq!(z.changes().len(), 2 * 51);
    }

    #[test]
    fn a_zone_of_the_south_starts_in_summer_time_and_utc_never_changes() {
        let z = rules(chrono_tz::Australia::Sydney);
        assert_eq!(z.offset_s(utc("2000-01-01T00:00Z")), 11 * 3600);
        assert_eq!(rules(chrono_tz::UTC).changes(), []);
    }
}
