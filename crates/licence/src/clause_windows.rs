//! The windows of a single clause over a forecast.

use model::{Clause, ClauseKind, CurrentTurn, EdgeAnchor, Forecast, TideAnchor, TurnKind};
use units::{Span, Utc, Window, Windows};

/// Where one clause, by itself, lets water move.
pub(crate) struct ClauseWindows<'a> {
    pub windows: Windows,
    pub anchor: EdgeAnchor,
    turns: &'a [CurrentTurn],
}

impl ClauseWindows<'_> {
    /// One standard deviation of an edge of these windows: of the current's turn nearest to it, the
    /// earlier of two; none for a predicted anchor.
    pub(crate) fn time_sd(&self, at: Utc) -> Span {
        let nearest = self.turns.iter().min_by_key(|t| ((t.at - at).abs(), t.at));
        nearest.map_or(Span::ZERO, |t| t.time_sd)
    }
}

/// `None` for a clause that sets no window, and for one that the forecast says nothing about.
pub(crate) fn of<'a>(clause: &Clause, forecast: &'a Forecast) -> Option<ClauseWindows<'a>> {
    match &clause.kind {
        ClauseKind::TideWindow { place, anchor, from, to } => {
            let kind = match anchor {
                TideAnchor::HighWater => TurnKind::High,
                TideAnchor::LowWater => TurnKind::Low,
            };
            let place = forecast.places.get(place.index())?;
            let turns = place.turns.iter().filter(|t| t.kind == kind);
            let windows = turns.filter_map(|t| Window::new(t.at + *from, t.at + *to).ok());
            let windows = windows.collect();
            Some(ClauseWindows { windows, anchor: EdgeAnchor::Predicted, turns: &[] })
        }
        ClauseKind::CurrentSeaward { place, speed_min, .. } => {
            let place = forecast.places.get(place.index())?;
            Some(ClauseWindows {
                windows: place.current.as_ref()?.at_least(speed_min.get()),
                anchor: EdgeAnchor::Modelled,
                turns: &place.current_turns,
            })
        }
        _ => None,
    }
}

/// Whether the clause is one that sets windows, readable or not.
pub(crate) fn sets_windows(clause: &Clause) -> bool {
    matches!(clause.kind, ClauseKind::TideWindow { .. } | ClauseKind::CurrentSeaward { .. })
}
