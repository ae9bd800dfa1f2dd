//! Between the turns: levels along half cosines, currents along half sines.
//!
//! **Source**: for the level, the principle of NOAA/NOS tide tables, table 3 (from memory): a cosine
//! between neighbouring high and low waters. For the current, the same idea between its turns
//! (common practice). Neither is right where the curve is much distorted; the turns are what the
//! licence and the plan rest on.

use libm::{cos, sin};
use model::{CurrentTurn, Turn};
use units::Utc;

/// A turn of the current and the peak speed until the next, positive seaward.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct CurrentKnot {
    pub turn: CurrentTurn,
    pub peak_m_s: f64,
}

/// The level at `t`, which must lie between the first and the last turn (NaN outside).
pub(crate) fn level_m(turns: &[Turn], t: Utc) -> f64 {
    let n = turns.partition_point(|turn| turn.at <= t);
    match (n.checked_sub(1).map(|i| &turns[i]), turns.get(n)) {
        (Some(a), Some(b)) => {
            let share = (t - a.at).as_seconds() / (b.at - a.at).as_seconds();
            let (from, to) = (a.level.get(), b.level.get());
            from + (to - from) * (1.0 - cos(core::f64::consts::PI * share)) / 2.0
        }
        _ => f64::NAN,
    }
}

/// The current at `t`, m/s positive seaward; `t` must lie between the first and the last turn (NaN
/// outside).
pub(crate) fn current_m_s(knots: &[CurrentKnot], t: Utc) -> f64 {
    let n = knots.partition_point(|k| k.turn.at <= t);
    match (n.checked_sub(1).map(|i| &knots[i]), knots.get(n)) {
        (Some(a), Some(b)) => {
            let share = (t - a.turn.at).as_seconds() / (b.turn.at - a.turn.at).as_seconds();
            a.peak_m_s * sin(core::f64::consts::PI * share)
        }
        _ => f64::NAN,
    }
}

#[cfg(test)]
mod tests;
