//! Quantities, levels, offsets and instants as a person writes them: a number, its unit, and for a
//! level its datum. One spelling each; another unit is refused with the figure worked out.

use units::{Level, Span, Utc};

use crate::codes;
use crate::names::nearest;
use crate::raw::Node;

/// A unit that the files use, and the ones that people write instead.
pub(crate) struct Unit {
    pub name: &'static str,
    pub what: &'static str,
    pub example: &'static str,
    /// (other unit, how many of ours one of it is).
    others: &'static [(&'static str, f64)],
}

pub(crate) const LENGTH: Unit = Unit {
    name: "m",
    what: "a length or height",
    example: "380 m",
    others: &[("km", 1000.0), ("mm", 0.001), ("cm", 0.01), ("ft", 0.3048)],
};
pub(crate) const FLOW: Unit = Unit {
    name: "m3/s",
    what: "a flow",
    example: "1.20 m3/s",
    others: &[
        ("l/s", 0.001),
        ("m3/h", 1.0 / 3600.0),
        ("m3/d", 1.0 / 86_400.0),
        ("Ml/d", 1000.0 / 86_400.0),
        ("m³/s", 1.0),
    ],
};
pub(crate) const VOLUME: Unit = Unit {
    name: "m3",
    what: "a volume",
    example: "9000 m3",
    others: &[("l", 0.001), ("Ml", 1000.0), ("Mm3", 1e6), ("m³", 1.0)],
};
pub(crate) const SPEED: Unit = Unit {
    name: "m/s",
    what: "a speed",
    example: "0.10 m/s",
    others: &[("km/h", 1.0 / 3.6), ("kn", 1852.0 / 3600.0), ("cm/s", 0.01)],
};
pub(crate) const POWER: Unit = Unit {
    name: "kW",
    what: "a power",
    example: "22 kW",
    others: &[("W", 0.001), ("MW", 1000.0), ("hp", 0.7457)],
};
pub(crate) const PERCENT: Unit =
    Unit { name: "%", what: "a share", example: "1 %", others: &[("percent", 1.0)] };
pub(crate) const ANGLE: Unit = Unit {
    name: "deg",
    what: "an angle",
    example: "170 deg",
    others: &[("rad", 57.295_779_513_082_32), ("°", 1.0)],
};

/// Units of time and their seconds.
const TIMES: [(&str, f64); 4] = [("s", 1.0), ("min", 60.0), ("h", 3600.0), ("d", 86_400.0)];

/// The number at the start of a text and what stands after it. The number is plain: digits with a
/// sign and a point, no exponent, no separators.
pub(crate) fn split_number(text: &str) -> Option<(f64, &str)> {
    let text = text.trim();
    let end = text.find(|c: char| !matches!(c, '0'..='9' | '.' | '+' | '-')).unwrap_or(text.len());
    let (number, rest) = text.split_at(end);
    let whole = number.trim_start_matches(['+', '-']);
    let ends_in_digits = whole.starts_with(|c: char| c.is_ascii_digit()) && !whole.ends_with('.');
    // An exponent or a thousands separator would leave a rest that begins with neither.
    let clean_cut = rest.is_empty()
        || rest.starts_with(' ')
        || rest.starts_with(char::is_alphabetic)
        || rest.starts_with(['%', '°']);
    let exponent = rest.starts_with(['e', 'E']);
    if !ends_in_digits || !clean_cut || exponent {
        return None;
    }
    Some((number.parse().ok().filter(|v: &f64| v.is_finite())?, rest.trim()))
}

fn trim(value: f64) -> String {
    let text = format!("{value:.6}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

impl Node<'_> {
    /// A number with this unit, within the range.
    pub fn quantity(&self, unit: &Unit, min: f64, max: f64) -> Option<f64> {
        let text = self.text(&format!("{:?}", unit.example))?;
        let Some((value, said)) = split_number(text) else {
            return self.fault(
                codes::OUT_OF_RANGE,
                format!("{} must be one plain number and its unit", unit.what),
                format!("write digits and a point only, like {:?}", unit.example),
            );
        };
        if said == unit.name {
            return self.within(value, unit, min, max);
        }
        let remedy = match unit.others.iter().find(|o| o.0.eq_ignore_ascii_case(said)) {
            Some((_, k)) => format!("write \"{} {}\"", trim(value * k), unit.name),
            None => format!("write it like {:?}", unit.example),
        };
        let rule = format!("{} must be in `{}`, the only unit read here", unit.what, unit.name);
        self.fault(codes::UNIT, rule, remedy)
    }
    fn within(&self, value: f64, unit: &Unit, min: f64, max: f64) -> Option<f64> {
        if (min..=max).contains(&value) {
            return Some(value);
        }
        let rule = format!("{} here must be from {min} to {max} {}", unit.what, unit.name);
        // Litres written as cubic metres are the usual slip: a factor of a thousand too large.
        let litres = value > max && (min..=max).contains(&(value / 1000.0));
        let remedy = if litres && matches!(unit.name, "m3/s" | "m3") {
            format!("if litres were meant, write \"{} {}\"", trim(value / 1000.0), unit.name)
        } else {
            "check the figure and its unit".to_owned()
        };
        self.fault(codes::OUT_OF_RANGE, rule, remedy)
    }
    /// A length of time without a sign.
    pub fn duration(&self, min: Span, max: Span) -> Option<Span> {
        let text = self.text("\"8 min\"")?;
        let parsed = split_number(text).and_then(|(v, unit)| {
            let s = TIMES.iter().find(|t| t.0 == unit)?.1;
            Some(Span::from_seconds_f64(v * s))
        });
        let signed = text.trim_start().starts_with(['+', '-']);
        match parsed {
            Some(d) if !signed && d >= min && d <= max => Some(d),
            Some(_) => self.fault(
                codes::OUT_OF_RANGE,
                format!(
                    "this length of time must be from {min} to {max} (h:mm:ss), without a sign"
                ),
                "check the figure and its unit",
            ),
            None => self.fault(
                codes::UNIT,
                "a length of time must be a number with one of the units s, min, h, d",
                "write it like \"8 min\", \"120 s\" or \"72 h\"",
            ),
        }
    }
    /// A signed offset from an event: `+0:30`, `-1:00`, `+30 min`.
    pub fn offset(&self, most: Span) -> Option<Span> {
        let example = "\"+0:30\", \"-1:00\" or \"+30 min\"";
        let text = self.text_of_offset(example)?;
        let parsed = text.split_at_checked(1).and_then(|(sign, rest)| {
            let sign = match sign {
                "+" => 1,
                "-" => -1,
                _ => return None,
            };
            Some(unsigned_offset(rest)? * sign)
        });
        match parsed {
            Some(o) if o.abs() <= most => Some(o),
            Some(_) => self.fault(
                codes::OUT_OF_RANGE,
                format!("an offset here must be within {most} (h:mm:ss) of its event"),
                "check the figure and its unit",
            ),
            None => {
                let meant = unsigned_offset(text.trim_start_matches(['+', '-'])).is_some();
                let remedy = if meant {
                    format!("write \"+{text}\" for after the event or \"-{text}\" for before it")
                } else {
                    format!("write it like {example}")
                };
                self.fault(
                    codes::OFFSET,
                    "an offset of time must carry its sign (+ after, - before) and its unit",
                    remedy,
                )
            }
        }
    }
    /// The text of an offset; a bare number gets the offset's own fault, not one of its kind.
    fn text_of_offset(&self, example: &str) -> Option<String> {
        if self.is_number() {
            return self.fault(
                codes::OFFSET,
                "an offset of time must carry its sign (+ after, - before) and its unit",
                format!("write it like {example}"),
            );
        }
        self.text(example).map(|t| t.trim().to_owned())
    }
    /// An instant: ISO 8601 with `Z`.
    pub fn instant(&self) -> Option<Utc> {
        let example = "\"2027-03-01T06:30:00Z\"";
        let text = self.text_or_instant(example)?;
        if let Ok(t) = Utc::parse(&text) {
            return Some(t);
        }
        if Utc::parse(&format!("{text}Z")).is_ok() {
            return self.fault(
                codes::NO_ZONE,
                "a date with a time must say its zone",
                format!("write \"{text}Z\" if that is UTC, else work out the UTC time"),
            );
        }
        self.fault(
            codes::INSTANT,
            "an instant must be a date of the calendar and a time in UTC, with Z at its end",
            format!("write it like {example}"),
        )
    }
    /// A time of day in UTC, as hours.
    pub fn time_of_day_utc(&self) -> Option<f64> {
        let example = "\"10:00 UTC\"";
        let text = self.text(example)?;
        let (time, zone) = text.split_once(' ').unwrap_or((text, ""));
        let hours = unsigned_offset(time).filter(|s| time.contains(':') && *s < Span::hours(24));
        match (hours, zone.trim()) {
            (Some(h), "UTC") => Some(h.as_hours()),
            (Some(_), _) => self.fault(
                codes::NO_ZONE,
                "a time of day must say its zone, and here that zone must be UTC",
                format!("write \"{time} UTC\", after working out the UTC time"),
            ),
            _ => self.fault(
                codes::INSTANT,
                "a time of day must be hours and minutes from 00:00 to 23:59",
                format!("write it like {example}"),
            ),
        }
    }
}

/// `0:30`, `1:05:30` or `30 min`, without a sign.
fn unsigned_offset(text: &str) -> Option<Span> {
    if !text.starts_with(|c: char| c.is_ascii_digit()) {
        return None;
    }
    if text.contains(':') {
        let mut parts = text.split(':').map(|p| {
            let digits = (1..=2).contains(&p.len()) && p.bytes().all(|b| b.is_ascii_digit());
            digits.then(|| p.parse::<i64>().ok()).flatten()
        });
        let (h, m) = (parts.next()??, parts.next()??);
        let s = parts.next().unwrap_or(Some(0))?;
        let fits = m < 60 && s < 60 && parts.next().is_none();
        return fits.then(|| Span::hours(h) + Span::minutes(m) + Span::seconds(s));
    }
    let (value, unit) = split_number(text)?;
    let s = TIMES[..3].iter().find(|t| t.0 == unit)?.1;
    Some(Span::from_seconds_f64(value * s))
}

/// The datums of a site: zero of each, metres above the site datum.
pub(crate) struct Datums {
    pub list: Vec<(String, f64)>,
}

impl Datums {
    /// Lowest and highest level that a tidal site can mean.
    const RANGE: (f64, f64) = (-50.0, 200.0);

    pub fn offset_m(&self, name: &str) -> Option<f64> {
        self.list.iter().find(|d| d.0 == name).map(|d| d.1)
    }
    fn example(&self) -> String {
        format!("\"6.60 m {}\"", self.list.first().map_or("HD", |d| &d.0))
    }
    /// A level, put on the site datum.
    pub fn level(&self, node: &Node<'_>) -> Option<Level> {
        let text = node.text(&self.example())?;
        let Some((value, rest)) = split_number(text) else {
            return node.fault(
                codes::OUT_OF_RANGE,
                "a level must be one plain number, its unit and its datum",
                format!("write it like {}", self.example()),
            );
        };
        let (unit, datum) = rest.split_once(' ').unwrap_or((rest, ""));
        if unit != "m" {
            return node.fault(
                codes::UNIT,
                "a level must be in `m`, the only unit read here, and name its datum",
                format!("write it like {}", self.example()),
            );
        }
        let offset_m = self.datum(node, datum.trim(), &trim(value))?;
        let level_m = value + offset_m;
        if !(Self::RANGE.0..=Self::RANGE.1).contains(&level_m) {
            let (low, high) = Self::RANGE;
            return node.fault(
                codes::OUT_OF_RANGE,
                format!("a level must be from {low} to {high} m above the site datum"),
                "check the figure, its unit and its datum",
            );
        }
        Some(Level::of(level_m))
    }
    fn datum(&self, node: &Node<'_>, datum: &str, figure: &str) -> Option<f64> {
        let known = || self.list.iter().map(|d| d.0.as_str());
        let all = known().collect::<Vec<_>>().join(", ");
        if datum.is_empty() {
            return node.fault(
                codes::NO_DATUM,
                "a level must name the datum that it is measured from",
                format!("write \"{figure} m DATUM\" with one of: {all}"),
            );
        }
        self.offset_m(datum).or_else(|| {
            let remedy = match nearest(datum, known()) {
                Some(n) => format!("did you mean {n:?}?"),
                None => format!("known datums: {all}; add it to [datums] with its height"),
            };
            node.fault(codes::UNKNOWN_DATUM, "a level must name a datum of [datums]", remedy)
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_plain() {
        assert_eq!(split_number("1.20 m3/s"), Some((1.2, "m3/s")));
        assert_eq!(split_number("-3.60 m HD"), Some((-3.6, "m HD")));
        assert_eq!(split_number("9000"), Some((9000.0, "")));
        for wrong in ["9,000 m3", "1e3 m", "nan m", "inf m", "", ".5 m", "5. m", "--1 m", "m"] {
            assert_eq!(split_number(wrong), None, "{wrong}");
        }
    }

    #[test]
    fn offsets_in_both_spellings() {
        assert_eq!(unsigned_offset("3:30"), Some(Span::minutes(210)));
        assert_eq!(unsigned_offset("1:05:30"), Some(Span::seconds(3930)));
        assert_eq!(unsigned_offset("30 min"), Some(Span::minutes(30)));
        for wrong in ["30", "3:60", "+1:00", "1:2:3:4", "1:", "5 weeks", "2 d"] {
            assert_eq!(unsigned_offset(wrong), None, "{wrong}");
        }
    }
}
