//! The water ahead: the site's own prediction, worked out in stretches as time goes on. The plant
//! then shifts it by the lag error that its truth drew.

use model::Site;
use plant::Water;
use units::{Span, Utc, Window};

use crate::SimulationError;

/// How much is worked out at once. Longer costs memory and start-up time, shorter costs seams.
const STRETCH: Span = Span::days(8);
/// Kept from before the present: more than the greatest lag error of ten minutes.
const BACK: Span = Span::hours(1);
/// Must be known ahead of where the plant is to go, for the same reason.
pub(crate) const MARGIN: Span = Span::hours(1);
const GRID: Span = Span::minutes(5);

/// Outer level, current and port level from a little before `from` for some days.
pub(crate) fn water_from(site: &Site, from: Utc) -> Result<Water, SimulationError> {
    water(site, from, STRETCH)
}

/// The same for `length` from `from` on, and a margin at both ends.
pub(crate) fn water(site: &Site, from: Utc, length: Span) -> Result<Water, SimulationError> {
    let bad = |e: &dyn std::fmt::Display| SimulationError::Water(e.to_string());
    let valid = site.port.valid;
    let start = (from - BACK).floor_to(GRID).max(valid.start());
    let end = (from + length + MARGIN).min(valid.end());
    let span = Window::new(start, end).map_err(|e| bad(&e))?;
    let forecast = nowcast::forecast(site, start, span).map_err(|e| bad(&e))?;
    let outlet = site.outlets.first();
    let outlet = outlet.ok_or_else(|| SimulationError::NotSimulated("no outlet".to_owned()))?;
    let place = forecast.place(outlet.place);
    Ok(Water {
        outer: place.level.clone(),
        port: site.port.gauge.map(|_| forecast.port_level.clone()),
        current: place.current.clone(),
    })
}
