//! Differences worked out from two sets of published constants: a year of both predictions, paired
//! tide by tide, with straight lines on the range. Arithmetic without weather.

use core::fmt;
use std::collections::BTreeMap;

use model::{CurrentDifferences, LowLevel, NeapSpring, TideNumber, Turn, TurnKind};
use tide::Predictor;
use units::{Metres, MetresPerSecond, Span, Window};

use crate::port::numbered;

#[derive(Clone, PartialEq, Eq, Debug)]
pub enum FitError {
    /// Fewer pairs of turns than a straight line with a spread needs.
    TooFew(usize),
    /// All tides have the same range: no line can be drawn.
    OneRange,
}

impl fmt::Display for FitError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::TooFew(n) => write!(f, "only {n} tides pair; give a span of a month or more"),
            Self::OneRange => write!(f, "all tides have one range; a line on range needs two"),
        }
    }
}
impl std::error::Error for FitError {}

/// A port or place for the fit: its predictor and its phase lag of M2.
#[derive(Clone, Copy, Debug)]
pub struct Station<'a> {
    pub predictor: &'a Predictor,
    pub m2_phase_lag_deg: f64,
}

/// Fits high- and low-water differences of `place` on the ebb range of `port` over `span`, read off
/// at the ranges `at` (usually the mean neap and spring range, 2(M2 - S2) and 2(M2 + S2)). The
/// spreads are those that the lines leave, the greater of high and low water; they know no weather.
///
/// Turns are paired by tide number, for a place that is up to an hour before or eleven hours after
/// the port by its M2. Currents are not in constants of levels: they are assumed to turn
/// `turn_after` the place's own high and low water, with the peaks given for neap and spring alike.
///
/// Refused: fewer than ten tides, or tides that all have one range.
///
/// **Source**: least squares; the form of the table is the secondary-port method (common practice).
pub fn differences_from_constants(
    port: Station,
    place: Station,
    span: &Window,
    at: NeapSpring<Metres>,
    turn_after: Span,
    peaks: (MetresPerSecond, MetresPerSecond),
) -> Result<model::Differences, FitError> {
    let pairs = pairs(port, place, span);
    let of = |kind| pairs.iter().filter(move |p| p.port.kind == kind);
    let minutes = |p: &Pair| (p.place.at - p.port.at).as_minutes();
    let rise = |p: &Pair| (p.place.level - p.port.level).get();
    let high_min = line(of(TurnKind::High), &minutes)?;
    let low_min = line(of(TurnKind::Low), &minutes)?;
    let high_m = line(of(TurnKind::High), &rise)?;
    let low_m = line(of(TurnKind::Low), &rise)?;
    let ends = |l: &Line| (l.at(at.neap.get()), l.at(at.spring.get()));
    let lag = |l: &Line| {
        let (neap, spring) = ends(l);
        NeapSpring { neap: Span::from_minutes_f64(neap), spring: Span::from_minutes_f64(spring) }
    };
    let metres = |l: &Line| {
        let (neap, spring) = ends(l);
        NeapSpring { neap: Metres::of(neap), spring: Metres::of(spring) }
    };
    let after = |d: NeapSpring<Span>| NeapSpring {
        neap: d.neap + turn_after,
        spring: d.spring + turn_after,
    };
    let low = metres(&low_m);
    let both = |v| NeapSpring { neap: v, spring: v };
    Ok(model::Differences {
        range: at,
        high_lag: lag(&high_min),
        high_rise: metres(&high_m),
        low_lag: lag(&low_min),
        low_level: NeapSpring {
            neap: LowLevel::RiseOverPort(low.neap),
            spring: LowLevel::RiseOverPort(low.spring),
        },
        current: Some(CurrentDifferences {
            seaward_after_port_high: after(lag(&high_min)),
            landward_after_port_low: after(lag(&low_min)),
            peak_ebb: both(peaks.0),
            peak_flood: both(peaks.1),
        }),
        time_sd: Span::from_minutes_f64(high_min.sd.max(low_min.sd)),
        level_sd: Metres::of(high_m.sd.max(low_m.sd)),
    })
}

struct Pair {
    port: Turn,
    place: Turn,
    ebb_range_m: f64,
}

/// Turns of one kind and one tide at both, with the port's ebb range of that tide.
fn pairs(port: Station, place: Station, span: &Window) -> Vec<Pair> {
    let carry = number_carry(port.m2_phase_lag_deg, place.m2_phase_lag_deg);
    let wide = Window::new(span.start() - Span::days(1), span.end() + Span::days(1))
        .expect("a span stays a span when it is widened");
    let a = numbered(&port.predictor.turns(span), port.m2_phase_lag_deg);
    let b = numbered(&place.predictor.turns(&wide), place.m2_phase_lag_deg);
    let by_tide: BTreeMap<(TideNumber, bool), &Turn> =
        b.iter().map(|t| ((t.number, t.kind == TurnKind::High), t)).collect();
    let mut list = Vec::new();
    for ebb in a.windows(2) {
        let [high, low] = ebb else { continue };
        if high.kind != TurnKind::High || low.number != high.number {
            continue;
        }
        let ebb_range_m = (high.level - low.level).get();
        for turn in [high, low] {
            let mate = by_tide.get(&(turn.number + carry, turn.kind == TurnKind::High));
            list.extend(mate.map(|m| Pair { port: *turn, place: **m, ebb_range_m }));
        }
    }
    list
}

/// A place whose M2 comes up to so much before the port's is taken as early, not as eleven hours
/// late. 30 degrees are one hour.
const EARLY_DEG: f64 = 30.0;

/// What to add to the port's tide number for the same wave at the place: each counts from its own
/// phase lag, and a wave that passes 360 degrees on its way gets one more there.
fn number_carry(port_lag_deg: f64, place_lag_deg: f64) -> TideNumber {
    let later = (place_lag_deg - port_lag_deg).rem_euclid(360.0);
    let later = if later > 360.0 - EARLY_DEG { later - 360.0 } else { later };
    ((port_lag_deg + later - place_lag_deg) / 360.0).round() as TideNumber
}

struct Line {
    offset: f64,
    slope: f64,
    sd: f64,
}

impl Line {
    fn at(&self, x: f64) -> f64 {
        self.offset + self.slope * x
    }
}

/// Least squares of `y` on the ebb range.
fn line<'a>(
    pairs: impl Iterator<Item = &'a Pair>,
    y: &dyn Fn(&Pair) -> f64,
) -> Result<Line, FitError> {
    let points: Vec<(f64, f64)> = pairs.map(|p| (p.ebb_range_m, y(p))).collect();
    let n = points.len() as f64;
    if points.len() < 10 {
        return Err(FitError::TooFew(points.len()));
    }
    let mean_x = points.iter().map(|p| p.0).sum::<f64>() / n;
    let mean_y = points.iter().map(|p| p.1).sum::<f64>() / n;
    let sxx: f64 = points.iter().map(|p| (p.0 - mean_x) * (p.0 - mean_x)).sum();
    let sxy: f64 = points.iter().map(|p| (p.0 - mean_x) * (p.1 - mean_y)).sum();
    if sxx <= 1e-9 {
        return Err(FitError::OneRange);
    }
    let slope = sxy / sxx;
    let offset = mean_y - slope * mean_x;
    let left: f64 = points.iter().map(|p| p.1 - offset - slope * p.0).map(|r| r * r).sum();
    Ok(Line { offset, slope, sd: (left / (n - 2.0)).sqrt() })
}

#[cfg(test)]
mod tests;
