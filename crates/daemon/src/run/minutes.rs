//! Minute readings: what each signal showed, for people, plots and returns. Decisions never read
//! them.

use journal::{Minute, MinuteReading};
use model::{Quality, Signal, Site, Validated};
use units::{Span, Utc};

const MINUTE: Span = Span::minutes(1);
/// Steps over a signal's whole range, at most: a millimetre on ten metres.
const STEPS_MOST: f64 = 20_000.0;

/// Says when a minute is over.
#[derive(Debug, Default)]
pub struct Minutes {
    begun: Option<Utc>,
}

impl Minutes {
    /// The minute that has just ended, if one has. `readings` are those at `now`, in the order of
    /// the site's signals; a minute that the program slept through has none.
    pub fn over(&mut self, site: &Site, now: Utc, readings: &[Validated]) -> Option<Minute> {
        let this = now.floor_to(MINUTE);
        let before = self.begun.replace(this)?;
        if this <= before {
            return None;
        }
        let pairs = site.signals.iter().zip(readings);
        let readings = pairs.map(|(signal, v)| reading(signal, v)).collect();
        Some(Minute { at: this - MINUTE, readings })
    }

    pub fn is_over(&self, now: Utc) -> bool {
        self.begun.is_none_or(|b| now.floor_to(MINUTE) > b)
    }
}

fn reading(signal: &Signal, v: &Validated) -> MinuteReading {
    let exponent = exponent(signal.value_max - signal.value_min);
    let scale = libm::pow(10.0, -f64::from(exponent));
    let steps = v.good.map(|g| (g.value * scale).round());
    let quality = match v.quality {
        Quality::Good => 0,
        Quality::Stale => 1,
        Quality::Missing => 2,
        Quality::NotANumber => 3,
        Quality::OutOfRange => 4,
        Quality::TooFast => 5,
        Quality::Frozen => 6,
        Quality::BadAtSource => 7,
        Quality::FromTheFuture => 8,
    };
    // Beyond 2^31 steps there is no signal of ours; `as` stops at the ends.
    MinuteReading { signal: signal.name.clone(), steps: steps.map(|s| s as i32), exponent, quality }
}

/// The step is ten to this power, in the signal's unit.
fn exponent(range: f64) -> i8 {
    let finest = (range / STEPS_MOST).max(1e-9);
    let power = libm::ceil(libm::log10(finest) - 1e-9);
    power.clamp(-9.0, 9.0) as i8
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_step_is_fine_enough_to_show_and_coarse_enough_to_keep() {
        assert_eq!(exponent(10.0), -3);
        assert_eq!(exponent(20.0), -3);
        assert_eq!(exponent(21.0), -2);
        assert_eq!(exponent(100.0), -2);
        assert_eq!(exponent(0.0), -9);
        assert_eq!(exponent(2e9), 5);
    }
}
