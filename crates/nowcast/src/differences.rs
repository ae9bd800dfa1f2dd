//! From port to place by tabulated differences: four separate laws, each between a neap and a
//! spring figure.
//!
//! **Source**: the secondary-port method of official tide tables (UK Hydrographic Office NP 159; US
//! NOAA/NOS tide tables, table 2; from memory), in its range-weighted form. Clause by clause the
//! weight is w = (R - Rn)/(Rs - Rn), kept within -0.6 and 1.6; outside 0 to 1 the spread grows.

use model::{
    CurrentTurn, LowLevel, Method, NeapSpring, PlaceForecast, PlaceId, TideNumber, Turn, TurnKind,
};
use units::{Level, Metres, MetresPerSecond, Series, Span, Window};

use crate::curve;
use crate::port::PortTide;

/// A way from the port's tide to a place's.
pub trait PortToPlace {
    /// The place over `span`, on the 5-minute grid; `port` reaches at least a tide further on both
    /// sides. The error names what could not be covered.
    fn place_forecast(
        &self,
        port: &PortTide,
        place: PlaceId,
        span: &Window,
    ) -> Result<PlaceForecast, units::BadSeries>;
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

    /// When the current turns, and how fast it runs between. The seaward turn and the ebb go by the
    /// ebb range; the landward turn by the same ebb's low water; the flood by the flood range.
    fn current_turns(&self, port: &PortTide) -> Vec<curve::CurrentKnot> {
        let Some(current) = &self.0.current else { return Vec::new() };
        let mut knots = Vec::new();
        for (i, turn) in port.turns.iter().enumerate() {
            let Some(next) = port.turns.get(i + 1) else { continue };
            let weight =
                Weight::of(Metres::of((turn.level - next.level).get().abs()), &self.0.range);
            let high = turn.kind == TurnKind::High;
            let lag = if high {
                weight.span(&current.seaward_after_port_high)
            } else {
                // The lag at low water is tabulated by the ebb that comes to its end there.
                let before = i.checked_sub(1).map_or(turn, |p| &port.turns[p]);
                let ebb = Weight::of(before.level - turn.level, &self.0.range);
                ebb.span(&current.landward_after_port_low)
            };
            let peak = if high {
                weight.speed(&current.peak_ebb)
            } else {
                -weight.speed(&current.peak_flood)
            };
            let time_sd = self.0.time_sd.scaled(weight.widen);
            let number: TideNumber = turn.number;
            let to = CurrentTurn { number, to_seaward: high, at: turn.at + lag, time_sd };
            knots.push(curve::CurrentKnot { turn: to, peak_m_s: peak });
        }
        knots.sort_by_key(|k| k.turn.at);
        knots
    }
}

impl PortToPlace for Differences<'_> {
    fn place_forecast(
        &self,
        port: &PortTide,
        place: PlaceId,
        span: &Window,
    ) -> Result<PlaceForecast, units::BadSeries> {
        let turns = self.turns(port);
        let knots = self.current_turns(port);
        let level = Series::sampled(span, GRID, |t| curve::level_m(&turns, t))?;
        let current = match knots.is_empty() {
            true => None,
            false => Some(Series::sampled(span, GRID, |t| curve::current_m_s(&knots, t))?),
        };
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
