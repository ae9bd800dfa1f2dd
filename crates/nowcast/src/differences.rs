//! From port to place by tabulated differences: four separate laws, each between a neap and a
//! spring figure.
//!
//! **Source**: the secondary-port method of official tide tables (UK Hydrographic Office NP 159; US
//! NOAA/NOS tide tables, table 2; from memory), in its range-weighted form. The weight is
//! w = (R - Rn)/(Rs - Rn), kept within -0.6 and 1.6; outside 0 to 1 the spread grows. Which range R is
//! (the ebb's or the flood's) stands at each law below.

use core::fmt;

use model::{
    CurrentTurn, LowLevel, Method, NeapSpring, PlaceForecast, PlaceId, TideNumber, Turn, TurnKind,
};
use units::{BadSeries, Level, Metres, MetresPerSecond, Series, Span, Utc, Window};

use crate::curve;
use crate::port::PortTide;

/// A place that could not be forecast.
#[derive(Clone, PartialEq, Debug)]
pub enum PlaceError {
    /// The turns at the place do not reach over the whole span: the port was not predicted far
    /// enough, or the lags are longer than a day.
    NotCovered {
        span: Window,
        turns: Option<(Utc, Utc)>,
    },
    Series(BadSeries),
}

impl fmt::Display for PlaceError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NotCovered { span, turns: Some((first, last)) } => write!(
                f,
                "its turns reach from {first} to {last} and not over all of {span}; look at its lags"
            ),
            Self::NotCovered { span, turns: None } => {
                write!(f, "it has no turn at all that could serve {span}")
            }
            Self::Series(e) => write!(f, "{e}"),
        }
    }
}
impl std::error::Error for PlaceError {}

/// A way from the port's tide to a place's.
pub trait PortToPlace {
    /// The place over `span`, on the 5-minute grid; `port` reaches at least a tide further on both
    /// sides. The error names what could not be covered.
    fn place_forecast(
        &self,
        port: &PortTide,
        place: PlaceId,
        span: &Window,
    ) -> Result<PlaceForecast, PlaceError>;
}

/// Tabulated differences.
#[derive(Clone, PartialEq, Debug)]
pub struct Differences<'a>(pub &'a model::Differences);

/// A weight may run this far outside neap to spring.
const WEIGHT_LEAST: f64 = -0.6;
const WEIGHT_MOST: f64 = 1.6;
/// The spread grows by this many times itself for each unit of weight outside 0 to 1: at the ends
/// of what is allowed it is 2.2 times as wide (a choice, not a published figure).
const WIDEN: f64 = 2.0;

pub(crate) const GRID: Span = Span::minutes(5);

/// Where a range stands between neap (0) and spring (1).
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Weight {
    w: f64,
    widen: f64,
}

impl Weight {
    pub(crate) fn of(range: Metres, at: &NeapSpring<Metres>) -> Self {
        let raw = (range.get() - at.neap.get()) / (at.spring.get() - at.neap.get());
        let w = raw.clamp(WEIGHT_LEAST, WEIGHT_MOST);
        let outside = (-w).max(w - 1.0).max(0.0);
        Self { w, widen: 1.0 + WIDEN * outside }
    }
    fn mix(self, neap: f64, spring: f64) -> f64 {
        neap + self.w * (spring - neap)
    }
    fn span(self, d: &NeapSpring<Span>) -> Span {
        Span::from_seconds_f64(self.mix(d.neap.as_seconds(), d.spring.as_seconds()))
    }
    fn metres(self, d: &NeapSpring<Metres>) -> Metres {
        Metres::of(self.mix(d.neap.get(), d.spring.get()))
    }
    /// A speed does not change its sign by extrapolation: water that no longer turns stands still.
    fn speed(self, d: &NeapSpring<MetresPerSecond>) -> f64 {
        self.mix(d.neap.get(), d.spring.get()).max(0.0)
    }
}

impl Differences<'_> {
    /// The place's own turns. High water and the low water after it go by the ebb range (high water
    /// down to the low water that ends the tide).
    fn turns(&self, port: &PortTide) -> Vec<Turn> {
        let mut turns = Vec::with_capacity(port.turns.len());
        for pair in port.turns.windows(2) {
            let [high, low] = pair else { continue };
            if high.kind != TurnKind::High || low.number != high.number {
                continue;
            }
            let weight = Weight::of(high.level - low.level, &self.0.range);
            turns.push(self.high(high, weight));
            turns.push(self.low(low, weight));
        }
        turns.sort_by_key(|t| t.at);
        turns
    }
    fn spread(&self, turn: Turn, weight: Weight) -> Turn {
        Turn {
            time_sd: self.0.time_sd.scaled(weight.widen),
            level_sd: self.0.level_sd * weight.widen,
            ..turn
        }
    }
    fn high(&self, port: &Turn, weight: Weight) -> Turn {
        let at = port.at + weight.span(&self.0.high_lag);
        let level = port.level + weight.metres(&self.0.high_rise);
        self.spread(Turn { at, level, ..*port }, weight)
    }
    fn low(&self, port: &Turn, weight: Weight) -> Turn {
        let at = port.at + weight.span(&self.0.low_lag);
        let end = |d: LowLevel| match d {
            LowLevel::At(level) => level.get(),
            LowLevel::RiseOverPort(rise) => port.level.get() + rise.get(),
        };
        let level = weight.mix(end(self.0.low_level.neap), end(self.0.low_level.spring));
        self.spread(Turn { at, level: Level::of(level), ..*port }, weight)
    }

    /// When the current turns, and how fast it runs between. The seaward turn and the ebb's peak go
    /// by the ebb range (high water to the following low water). The landward turn goes by the ebb
    /// that comes to its end there, as the low water itself does, so that the two keep together;
    /// the flood's peak goes by the flood range (low water to the following high water).
    fn current_turns(&self, port: &PortTide) -> Vec<curve::CurrentKnot> {
        let Some(current) = &self.0.current else { return Vec::new() };
        let range = &self.0.range;
        let mut knots = Vec::new();
        for three in port.turns.windows(3) {
            let [before, turn, next] = three else { continue };
            let (ebb, flood) = (before.level - turn.level, next.level - turn.level);
            let to_seaward = turn.kind == TurnKind::High;
            let (placed_by, lag, peak_m_s) = if to_seaward {
                let by = Weight::of(-flood, range);
                (by, by.span(&current.seaward_after_port_high), by.speed(&current.peak_ebb))
            } else {
                let by = Weight::of(ebb, range);
                let speed = Weight::of(flood, range).speed(&current.peak_flood);
                (by, by.span(&current.landward_after_port_low), -speed)
            };
            let time_sd = self.0.time_sd.scaled(placed_by.widen);
            let number: TideNumber = turn.number;
            let turn = CurrentTurn { number, to_seaward, at: turn.at + lag, time_sd };
            knots.push(curve::CurrentKnot { turn, peak_m_s });
        }
        knots.sort_by_key(|k| k.turn.at);
        knots
    }
}

/// The grid reaches up to one step past the end of the span.
fn covers(span: &Window, first: Option<Utc>, last: Option<Utc>) -> Result<(), PlaceError> {
    let turns = first.zip(last);
    match turns {
        Some((first, last)) if first <= span.start() && span.end() + GRID < last => Ok(()),
        _ => Err(PlaceError::NotCovered { span: *span, turns }),
    }
}

impl PortToPlace for Differences<'_> {
    fn place_forecast(
        &self,
        port: &PortTide,
        place: PlaceId,
        span: &Window,
    ) -> Result<PlaceForecast, PlaceError> {
        let turns = self.turns(port);
        covers(span, turns.first().map(|t| t.at), turns.last().map(|t| t.at))?;
        let level = Series::sampled(span, GRID, |t| curve::level_m(&turns, t));
        let knots = self.current_turns(port);
        let current = match &self.0.current {
            None => None,
            Some(_) => {
                covers(span, knots.first().map(|k| k.turn.at), knots.last().map(|k| k.turn.at))?;
                let sampled = Series::sampled(span, GRID, |t| curve::current_m_s(&knots, t));
                Some(sampled.map_err(PlaceError::Series)?)
            }
        };
        let level = level.map_err(PlaceError::Series)?;
        Ok(PlaceForecast {
            place,
            method: Method::Differences,
            turns,
            level,
            current,
            current_turns: knots.into_iter().map(|k| k.turn).collect(),
        })
    }
}

#[cfg(test)]
mod tests;
