//! Lawful windows: pure licence over a forecast, tide by tide, each edge with its clause.

use model::{
    AssetId, Cap, ClauseId, ClauseKind, Edge, EdgeAnchor, Forecast, Lawful, LawfulWindow, NilTide,
    Site, Tide,
};
use units::{Metres, Span, Utc, Windows};

use crate::caps::{band, flow_cap, governing, least, ramp_cap, rounded_m};
use crate::clause_windows::{self, ClauseWindows};

/// The windows in which every clause that governs the asset lets it move water.
///
/// Each lies within one tide (predicted low water to low water at the port), so that a release
/// across low water is split. Tides whose band is nil have none and are listed apart. Where no
/// forecast tide lies, nothing is lawful.
pub fn lawful(site: &Site, forecast: &Forecast, asset: AssetId) -> Lawful {
    let sets: Vec<(ClauseId, ClauseWindows)> = governing(site, asset)
        .filter_map(|(clause, _)| Some((clause.id, clause_windows::of(clause, forecast)?)))
        .collect();
    let everywhere = Windows::from(forecast.span);
    let open = sets.iter().fold(everywhere, |open, (_, set)| open.intersect(&set.windows));
    let mut result = Lawful { asset, span: forecast.span, windows: Vec::new(), nil: Vec::new() };
    for tide in &forecast.tides {
        match by_tide(site, asset, tide) {
            ByTide::Nil(nil) => result.nil.push(nil),
            ByTide::Caps(caps) => {
                let of_tide = open.intersect(&Windows::from(tide.window));
                let edge = |at| edge_at(at, &sets, &caps, tide, forecast);
                result.windows.extend(of_tide.iter().map(|w| LawfulWindow {
                    tide: tide.number,
                    window: *w,
                    opens: edge(w.start()),
                    shuts: edge(w.end()),
                    range: tide.ebb_range,
                    range_rounded: caps.range_rounded,
                    flow_max: caps.flow_max,
                    ramp_max_per_min: ramp_cap(site, asset),
                    volume_max: caps.volume_max,
                }));
            }
        }
    }
    result
}

enum ByTide {
    Nil(NilTide),
    Caps(TideCaps),
}

struct TideCaps {
    by: Option<ClauseId>,
    range_rounded: Metres,
    flow_max: Option<Cap<units::CubicMetresPerSecond>>,
    volume_max: Option<Cap<units::CubicMetres>>,
}

fn by_tide(site: &Site, asset: AssetId, tide: &Tide) -> ByTide {
    let mut caps = TideCaps {
        by: None,
        range_rounded: tide.ebb_range,
        flow_max: flow_cap(site, asset),
        volume_max: None,
    };
    for (clause, _) in governing(site, asset) {
        let ClauseKind::VolumePerTide { rounding, bands } = &clause.kind else { continue };
        let range_rounded = rounded_m(tide.ebb_range, rounding);
        caps.range_rounded = range_rounded;
        caps.by = caps.by.or(Some(clause.id));
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
    }
    ByTide::Caps(caps)
}

/// The clause that makes this edge: the first whose own windows begin or end here, else the one
/// that counts by tides, else the end of what was looked at.
fn edge_at(
    at: Utc,
    sets: &[(ClauseId, ClauseWindows)],
    caps: &TideCaps,
    tide: &Tide,
    forecast: &Forecast,
) -> Edge {
    let makes = |set: &ClauseWindows| set.windows.iter().any(|w| w.start() == at || w.end() == at);
    if at == forecast.span.start() || at == forecast.span.end() {
        return Edge { at, clause: None, anchor: EdgeAnchor::SpanEnd, time_sd: Span::ZERO };
    }
    match sets.iter().find(|(_, set)| makes(set)) {
        Some((clause, set)) => {
            Edge { at, clause: Some(*clause), anchor: set.anchor, time_sd: set.time_sd }
        }
        None => {
            debug_assert!(at == tide.window.start() || at == tide.window.end());
            Edge { at, clause: caps.by, anchor: EdgeAnchor::Predicted, time_sd: Span::ZERO }
        }
    }
}
