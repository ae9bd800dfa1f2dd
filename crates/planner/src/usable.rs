//! Usable windows: when the water outside lets anything out at all, whatever the licence says.

use model::{AssetId, Forecast, Site, Usable, UsableEdge, UsableWindow};
use units::Utc;

/// When a storage at its high-alarm level has a head over the water outside; with pumps, which lift
/// over any tide that the site's range of levels holds, always. An outlet that the site does not
/// have is never usable.
pub fn usable(site: &Site, outlet: usize, forecast: &Forecast) -> Usable {
    let Some(outlet) = site.outlets.get(outlet) else {
        return Usable { asset: AssetId(u16::MAX), windows: Vec::new() };
    };
    let full_m = site.storage(outlet.storage).level_high_alarm.get();
    let level = &forecast.place(outlet.place).level;
    let (port_m, excess) = (outlet.pipe.port_centre.get(), outlet.pipe.density_excess);
    // inner - outer - excess (outer - port) > 0 gives the level outside that just stops it.
    let stops_m = (full_m + excess * port_m) / (1.0 + excess);
    let low_water = level.at_least(stops_m).complement_in(&forecast.span);
    let windows = if outlet.pumps.is_empty() { low_water } else { forecast.span.into() };
    let edge = |at: Utc| {
        let ends = at == forecast.span.start() || at == forecast.span.end();
        if ends { UsableEdge::SpanEnd } else { UsableEdge::Head }
    };
    let each = windows.iter().map(|w| UsableWindow {
        window: *w,
        opens: edge(w.start()),
        shuts: edge(w.end()),
    });
    Usable { asset: outlet.gate, windows: each.collect() }
}
