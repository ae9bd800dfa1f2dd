//! Lawful windows: pure licence over a forecast, each edge with the clause that makes it.

use model::{
    AssetId, Cap, ClauseId, ClauseKind, Edge, EdgeAnchor, Forecast, Lawful, LawfulWindow, NilTide,
    Site, Tide,
};
use units::{CubicMetres, CubicMetresPerSecond, Metres, Span, Utc, Window, Windows};

use crate::caps::{band, flow_cap, governing, least, ramp_cap, rounded_m};
use crate::clause_windows::{self, ClauseWindows};

/// The windows in which every clause that governs the asset lets it move water.
///
/// Where a clause counts by tides (predicted low water to low water at the port) each window lies
/// in one tide, so that a release across low water is split; tides whose band is nil have no window
/// and are listed apart. Where no clause does, nothing is split and a window carries the tide that
/// it begins in. Where no forecast tide lies, or a clause that sets windows finds nothing to read,
/// nothing is lawful. Pure licence: no surge, reading or sum enters, and no margin is taken off.
pub fn lawful(site: &Site, forecast: &Forecast, asset: AssetId) -> Lawful {
    let mut result = Lawful { asset, span: forecast.span, windows: Vec::new(), nil: Vec::new() };
    let open = Open::of(site, forecast, asset);
    let by_tides = |kind: &ClauseKind| matches!(kind, ClauseKind::VolumePerTide { .. });
    if governing(site, asset).any(|(clause, _)| by_tides(&clause.kind)) {
        for tide in &forecast.tides {
            match by_tide(site, asset, tide) {
                ByTide::Nil(nil) => result.nil.push(nil),
                ByTide::Caps(caps) => {
                    let of_tide = open.windows.intersect(&Windows::from(tide.window));
                    let each = of_tide.iter().map(|w| open.window(*w, tide, &caps));
                    result.windows.extend(each);
                }
            }
        }
    } else {
        let known: Windows = forecast.tides.iter().map(|t| t.window).collect();
        for w in open.windows.intersect(&known).iter() {
            let tide = forecast.tide_at(w.start()).expect("it begins in a known tide");
            let caps = TideCaps::without_bands(site, asset, tide);
            result.windows.push(open.window(*w, tide, &caps));
        }
    }
    result
}

/// What the clauses that set windows leave open between them.
struct Open<'a> {
    forecast: &'a Forecast,
    sets: Vec<(ClauseId, ClauseWindows<'a>)>,
    windows: Windows,
    ramp_max_per_min: Option<Cap<CubicMetresPerSecond>>,
}

impl<'a> Open<'a> {
    fn of(site: &Site, forecast: &'a Forecast, asset: AssetId) -> Self {
        let mut sets = Vec::new();
        let mut windows = Windows::from(forecast.span);
        for (clause, _) in governing(site, asset).filter(|(c, _)| clause_windows::sets_windows(c)) {
            match clause_windows::of(clause, forecast) {
                Some(set) => {
                    windows = windows.intersect(&set.windows);
                    sets.push((clause.id, set));
                }
                None => windows = Windows::none(),
            }
        }
        Self { forecast, sets, windows, ramp_max_per_min: ramp_cap(site, asset) }
    }

    fn window(&self, window: Window, tide: &Tide, caps: &TideCaps) -> LawfulWindow {
        LawfulWindow {
            tide: tide.number,
            window,
            opens: self.edge(window.start(), |w| w.start(), tide, caps),
            shuts: self.edge(window.end(), |w| w.end(), tide, caps),
            range: tide.ebb_range,
            range_rounded: caps.range_rounded,
            flow_max: caps.flow_max,
            ramp_max_per_min: self.ramp_max_per_min,
            volume_max: caps.volume_max,
        }
    }

    /// The clause that makes this edge: of those whose own windows begin (or end) here, and of the
    /// one that counts by tides where a tide does, the first in the licence. Where there is none,
    /// what was looked at begins or ends here.
    fn edge(&self, at: Utc, side: fn(&Window) -> Utc, tide: &Tide, caps: &TideCaps) -> Edge {
        let makes = |set: &ClauseWindows| set.windows.iter().any(|w| side(w) == at);
        let own = self.sets.iter().find(|(_, set)| makes(set));
        let own = own.map(|(clause, set)| (*clause, set.anchor, set.time_sd(at)));
        let by_tides = caps.by.filter(|_| side(&tide.window) == at);
        let by_tides = by_tides.map(|clause| (clause, EdgeAnchor::Predicted, Span::ZERO));
        let first = own.into_iter().chain(by_tides).min_by_key(|(clause, ..)| *clause);
        match first.filter(|_| side(&self.forecast.span) != at) {
            Some((clause, anchor, time_sd)) => Edge { at, clause: Some(clause), anchor, time_sd },
            None => Edge { at, clause: None, anchor: EdgeAnchor::SpanEnd, time_sd: Span::ZERO },
        }
    }
}

enum ByTide {
    Nil(NilTide),
    Caps(TideCaps),
}

struct TideCaps {
    by: Option<ClauseId>,
    range_rounded: Metres,
    flow_max: Option<Cap<CubicMetresPerSecond>>,
    volume_max: Option<Cap<CubicMetres>>,
}

impl TideCaps {
    fn without_bands(site: &Site, asset: AssetId, tide: &Tide) -> Self {
        let flow_max = flow_cap(site, asset);
        Self { by: None, range_rounded: tide.ebb_range, flow_max, volume_max: None }
    }
}

fn by_tide(site: &Site, asset: AssetId, tide: &Tide) -> ByTide {
    let mut caps = TideCaps::without_bands(site, asset, tide);
    for (clause, _) in governing(site, asset) {
        let ClauseKind::VolumePerTide { rounding, bands } = &clause.kind else { continue };
        let range_rounded = rounded_m(tide.ebb_range, rounding);
        match band(rounding, bands, tide.ebb_range).filter(|b| b.volume_max.get() > 0.0) {
            None => {
                let (tide, range) = (tide.number, tide.ebb_range);
                return ByTide::Nil(NilTide { tide, clause: clause.id, range, range_rounded });
            }
            Some(b) => {
                let cap = Cap { max: b.volume_max, clause: clause.id };
                caps.volume_max = least(caps.volume_max, cap);
                if let Some(max) = b.flow_max {
                    caps.flow_max = least(caps.flow_max, Cap { max, clause: clause.id });
                }
            }
        }
        // The first such clause is the one whose rounding is shown.
        if caps.by.is_none() {
            (caps.by, caps.range_rounded) = (Some(clause.id), range_rounded);
        }
    }
    ByTide::Caps(caps)
}
