//! Harmonic prediction: y(t) = Z0 + sum f H cos(V + u - g).
//!
//! **Source**: P. Schureman (1940), Special Publication 98, the general equation of the tide (from
//! memory).

use libm::sincos;
use units::{Series, Span, Utc, Window, ZoneRules};

use crate::arguments::arguments;
use crate::constants::{Constants, Nodal, TideError};
use crate::node::{NodeFactor, Nodes};

/// Predicts one port.
#[derive(Clone, Debug)]
pub struct Predictor {
    constants: Constants,
}

/// One constituent over one UTC day: its phase at midnight, and amplitude and node angle that move
/// straight from this midnight to the next.
#[derive(Clone, Copy, Debug)]
struct Wave {
    amplitude_m: f64,
    amplitude_rise_m_h: f64,
    phase_rad: f64,
    speed_rad_h: f64,
}

/// A day of a predictor: evaluated often, so its waves are kept.
#[derive(Clone, Debug)]
pub(crate) struct Day {
    midnight: Utc,
    mean_level_m: f64,
    waves: Vec<Wave>,
}

const DAY: Span = Span::days(1);

impl Predictor {
    pub fn new(constants: &Constants) -> Self {
        Self { constants: constants.clone() }
    }
    /// The level at one instant, metres on the constants' datum.
    pub fn level_m(&self, t: Utc) -> f64 {
        self.day(t).level_m(t)
    }
    /// Levels on a grid over the window, one past its end included.
    pub fn series(&self, window: &Window, step: Span) -> Result<Series, TideError> {
        let mut days = self.days();
        Series::sampled(window, step, |t| days.at(t).level_m(t)).map_err(TideError::Series)
    }
    pub(crate) fn days(&self) -> Days<'_> {
        Days { predictor: self, day: None }
    }

    /// Node factors of every constituent at `t`, by the convention of the constants.
    fn node_factors(&self, t: Utc) -> Vec<NodeFactor> {
        let at = match self.constants.nodal {
            Nodal::Continuous => t,
            Nodal::MidYear => middle_of_year(t),
        };
        let nodes = Nodes::at(&arguments(at));
        self.constants.list.iter().map(|c| nodes.compound(&c.row.nodes)).collect()
    }

    fn day(&self, t: Utc) -> Day {
        let midnight = t.floor_to(DAY);
        let here = self.node_factors(midnight);
        let next = match self.constants.nodal {
            Nodal::Continuous => self.node_factors(midnight + DAY),
            Nodal::MidYear => here.clone(),
        };
        let a = arguments(midnight);
        let b = arguments(midnight + DAY);
        let waves =
            self.constants.list.iter().zip(here.iter().zip(&next)).map(|(c, (now, then))| {
                let v0 = c.row.argument_deg(&a);
                // The day's own mean speed, so that one day meets the next to the last digits.
                let turned = c.row.argument_deg(&b) - v0;
                let whole = ((c.row.speed_deg_h() * 24.0 - turned) / 360.0).round() * 360.0;
                let du = then.u_deg - now.u_deg;
                let du = du - 360.0 * (du / 360.0).round();
                Wave {
                    amplitude_m: now.f * c.amplitude_m,
                    amplitude_rise_m_h: (then.f - now.f) * c.amplitude_m / 24.0,
                    phase_rad: (v0 + now.u_deg - c.phase_deg).to_radians(),
                    speed_rad_h: ((turned + whole + du) / 24.0).to_radians(),
                }
            });
        Day { midnight, mean_level_m: self.constants.mean_level_m, waves: waves.collect() }
    }
}

/// A predictor with the day of its last use kept.
pub(crate) struct Days<'a> {
    predictor: &'a Predictor,
    day: Option<Day>,
}

impl Days<'_> {
    pub(crate) fn at(&mut self, t: Utc) -> &Day {
        let kept = self.day.take().filter(|d| d.midnight <= t && t < d.midnight + DAY);
        self.day.insert(kept.unwrap_or_else(|| self.predictor.day(t)))
    }
}

impl Day {
    pub(crate) fn level_m(&self, t: Utc) -> f64 {
        let h = (t - self.midnight).as_hours();
        self.waves.iter().fold(self.mean_level_m, |sum, w| {
            let (_, cos) = sincos(w.phase_rad + w.speed_rad_h * h);
            sum + (w.amplitude_m + w.amplitude_rise_m_h * h) * cos
        })
    }
    /// First and second derivative, m/h and m/h2. The slow change of amplitude is left out: it
    /// moves a turn by well under a second.
    pub(crate) fn slopes(&self, t: Utc) -> (f64, f64) {
        let h = (t - self.midnight).as_hours();
        self.waves.iter().fold((0.0, 0.0), |(first, second), w| {
            let (sin, cos) = sincos(w.phase_rad + w.speed_rad_h * h);
            let a = (w.amplitude_m + w.amplitude_rise_m_h * h) * w.speed_rad_h;
            (first - a * sin, second - a * w.speed_rad_h * cos)
        })
    }
}

/// Half-way from the start of the UTC year to the start of the next.
fn middle_of_year(t: Utc) -> Utc {
    let year = ZoneRules::utc().to_local(t).year;
    let start = |y| Utc::from_civil(y, 1, 1, 0, 0, 0).expect("the first of January is a date");
    let (a, b) = (start(year), start(year + 1));
    a + Span::micros((b - a).as_micros() / 2)
}

#[cfg(test)]
mod tests;
