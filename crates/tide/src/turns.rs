//! High and low waters: where the predicted level turns.

use units::{Span, Utc, Window};

use crate::predict::{Days, Predictor};

/// A turn of the predicted level.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct PortTurn {
    /// To a tenth of a second.
    pub at: Utc,
    pub level_m: f64,
    pub high: bool,
}

/// Turns are looked for between marks so far apart; two that lie closer than this are missed, and
/// nobody would call them two tides.
const MARK: Span = Span::minutes(10);
const CLOSE: Span = Span::millis(50);

impl Predictor {
    /// Every high and low water in the window, in order.
    pub fn turns(&self, window: &Window) -> Vec<PortTurn> {
        let mut days = self.days();
        let mut turns = Vec::new();
        let mut t = window.start().floor_to(MARK);
        let mut rising = days.at(t).slopes(t).0 > 0.0;
        while t < window.end() {
            let next = t + MARK;
            let still_rising = days.at(next).slopes(next).0 > 0.0;
            if rising != still_rising {
                let at = root(&mut days, t, next, rising);
                if window.contains(at) {
                    turns.push(PortTurn { at, level_m: days.at(at).level_m(at), high: rising });
                }
            }
            (t, rising) = (next, still_rising);
        }
        turns
    }
}

/// Newton's method kept inside a shrinking bracket: it always ends, within a few steps as a rule.
fn root(days: &mut Days, from: Utc, to: Utc, rising: bool) -> Utc {
    let (mut low, mut high) = (from, to);
    let mut t = from + Span::micros((to - from).as_micros() / 2);
    while high - low > CLOSE {
        let (first, second) = days.at(t).slopes(t);
        if (first > 0.0) == rising {
            low = t;
        } else {
            high = t;
        }
        let step = Span::from_seconds_f64(-first / second * 3600.0);
        let newton = t + step;
        if newton > low && newton < high {
            if step.abs() < CLOSE {
                return newton;
            }
            t = newton;
        } else {
            t = low + Span::micros((high - low).as_micros() / 2);
        }
    }
    t
}
