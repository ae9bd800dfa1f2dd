//! The port's predicted turns, numbered by the moon, one high and one low water a tide.

use model::{Port, Tide, Turn, TurnKind};
use tide::{Constants, Nodal, PortTurn, Predictor, TideError};
use units::{Level, Metres, Span, Window};

/// The port over a span: turns with their tide's number, and the tides themselves.
#[derive(Clone, Debug)]
pub struct PortTide {
    /// In order; for each tide number one high water and the low water that ends it.
    pub turns: Vec<Turn>,
    pub predictor: Predictor,
}

/// The port's constants as the tide crate wants them.
pub(crate) fn predictor(port: &Port) -> Result<Predictor, TideError> {
    let nodal = match port.nodal {
        model::NodalRule::Continuous => Nodal::Continuous,
        model::NodalRule::MidYear => Nodal::MidYear,
    };
    let list: Vec<(&str, f64, f64)> = port
        .constants
        .iter()
        .map(|c| (c.name.as_str(), c.amplitude.get(), c.phase_lag_greenwich_deg))
        .collect();
    Ok(Predictor::new(&Constants::new(port.mean_level.get(), nodal, &list)?))
}

/// Predicts the port over the span. Turns carry no spread: they are astronomy by the clause's own
/// words; what the weather adds belongs to the places.
pub fn port_tide(port: &Port, span: &Window) -> Result<PortTide, TideError> {
    let predictor = predictor(port)?;
    let m2_lag_deg = port
        .constants
        .iter()
        .find(|c| c.name.eq_ignore_ascii_case("M2"))
        .map_or(0.0, |c| c.phase_lag_greenwich_deg);
    let raw = predictor.turns(span);
    Ok(PortTide { turns: numbered(&raw, m2_lag_deg), predictor })
}

/// One high water a tide (the highest) and one low water (the lowest): a stand or a double high
/// water is one tide.
pub(crate) fn numbered(raw: &[PortTurn], m2_lag_deg: f64) -> Vec<Turn> {
    let mut turns: Vec<Turn> = Vec::with_capacity(raw.len());
    for t in raw {
        let x = tide::number(t.at, m2_lag_deg);
        let (kind, number) = if t.high {
            (TurnKind::High, x.round() as i64)
        } else {
            (TurnKind::Low, (x - 0.5).round() as i64)
        };
        let turn = Turn {
            number,
            kind,
            at: t.at,
            level: Level::of(t.level_m),
            time_sd: Span::ZERO,
            level_sd: Metres::ZERO,
        };
        let same = |o: &&mut Turn| o.kind == kind && o.number == number;
        match turns.iter_mut().rev().take(4).find(same) {
            Some(other) => {
                let further = match kind {
                    TurnKind::High => turn.level > other.level,
                    TurnKind::Low => turn.level < other.level,
                };
                if further {
                    *other = turn;
                }
            }
            None => turns.push(turn),
        }
    }
    turns.sort_by_key(|t| t.at);
    turns
}

/// Tides for counting: predicted low water to low water. Those not whole in the span are left out.
pub(crate) fn tides(turns: &[Turn]) -> Vec<Tide> {
    turns
        .windows(3)
        .filter_map(|w| {
            let [before, high, after] = w else { return None };
            let whole = before.kind == TurnKind::Low
                && high.kind == TurnKind::High
                && after.kind == TurnKind::Low
                && after.number == high.number;
            let window = Window::new(before.at, after.at).ok()?;
            whole.then(|| Tide {
                number: high.number,
                window,
                high: *high,
                ebb_range: high.level - after.level,
            })
        })
        .collect()
}
