//! The windows of a single clause over a forecast.

use model::{Clause, ClauseKind, EdgeAnchor, Forecast, TideAnchor, TurnKind};
use units::{Span, Window, Windows};

/// Where one clause, by itself, lets water move; `None` for a clause that sets no window.
pub(crate) struct ClauseWindows {
    pub windows: Windows,
    pub anchor: EdgeAnchor,
    pub time_sd: Span,
}

pub(crate) fn of(clause: &Clause, forecast: &Forecast) -> Option<ClauseWindows> {
    match &clause.kind {
        ClauseKind::TideWindow { place, anchor, from, to } => {
            let kind = match anchor {
                TideAnchor::HighWater => TurnKind::High,
                TideAnchor::LowWater => TurnKind::Low,
            };
            let turns = forecast.place(*place).turns.iter().filter(|t| t.kind == kind);
            let windows = turns.filter_map(|t| Window::new(t.at + *from, t.at + *to).ok());
            Some(ClauseWindows {
                windows: windows.collect(),
                anchor: EdgeAnchor::Predicted,
                time_sd: Span::ZERO,
            })
        }
        ClauseKind::CurrentSeaward { place, speed_min, .. } => {
            let place = forecast.place(*place);
            let current = place.current.as_ref();
            // Without a modelled current, nothing is known to run seaward.
            let windows = current.map_or(Windows::none(), |c| c.at_least(speed_min.get()));
            let time_sd = place.current_turns.iter().map(|t| t.time_sd).max();
            Some(ClauseWindows {
                windows,
                anchor: EdgeAnchor::Modelled,
                time_sd: time_sd.unwrap_or(Span::ZERO),
            })
        }
        _ => None,
    }
}
