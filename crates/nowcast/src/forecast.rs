//! The forecast: port and places over a span, made once and never changed.

use core::fmt;

use model::{Forecast, PlaceForecast, Site};
use tide::TideError;
use units::{Digest, Series, Span, Utc, Window};

use crate::differences::{Differences, GRID, PlaceError, PortToPlace};
use crate::port::{PortTide, port_tide, tides};

#[derive(Clone, PartialEq, Debug)]
pub enum ForecastError {
    /// The span goes beyond what the constants hold for.
    OutsideValid {
        span: Window,
        valid: Window,
    },
    Tide(TideError),
    /// A place, by its name.
    Place {
        place: String,
        error: PlaceError,
    },
}

impl fmt::Display for ForecastError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::OutsideValid { span, valid } => write!(
                f,
                "the tide constants hold for {valid} and say nothing of all of {span}; give newer \
                 constants"
            ),
            Self::Tide(e) => write!(f, "the tide at the port: {e}"),
            Self::Place { place, error } => write!(f, "the forecast at {place:?}: {error}"),
        }
    }
}
impl std::error::Error for ForecastError {}

/// Turns are looked for this far beyond the span, so that every edge inside it is whole.
const BEYOND: Span = Span::hours(30);

/// Forecasts the whole site as of `as_of` (on the 5-minute grid) over `span`.
///
/// Pure astronomy and tables: the same site, `as_of` and span give the same forecast, bit for bit.
pub fn forecast(site: &Site, as_of: Utc, span: Window) -> Result<Forecast, ForecastError> {
    let valid = site.port.valid;
    if span.start() < valid.start() || span.end() > valid.end() {
        return Err(ForecastError::OutsideValid { span, valid });
    }
    let wide = Window::new(span.start() - BEYOND, span.end() + BEYOND)
        .expect("a span stays a span when it is widened");
    let port = port_tide(&site.port, &wide).map_err(ForecastError::Tide)?;
    let port_level = port.predictor.series(&span, GRID).map_err(ForecastError::Tide)?;
    let each = site.places.iter().map(|p| {
        let way = Differences(&p.differences);
        way.place_forecast(&port, p.id, &span)
            .map_err(|error| ForecastError::Place { place: p.name.clone(), error })
    });
    let places: Vec<PlaceForecast> = each.collect::<Result<_, _>>()?;
    let all = tides(&port.turns);
    let tides = all.into_iter().filter(|t| t.window.intersect(&span).is_some()).collect();
    Ok(Forecast {
        as_of,
        span,
        digest: digest(site, as_of, &span, &port, &port_level, &places),
        port_turns: port.turns,
        tides,
        port_level,
        places,
    })
}

/// Over what it was made from (by the site's own digest) and every turn and curve that came out.
fn digest(
    site: &Site,
    as_of: Utc,
    span: &Window,
    port: &PortTide,
    port_level: &Series,
    places: &[PlaceForecast],
) -> u64 {
    let mut d = Digest::new();
    d.bytes(site.site_digest.as_bytes()).i64(as_of.as_micros());
    d.i64(span.start().as_micros()).i64(span.end().as_micros());
    for t in port.turns.iter().chain(places.iter().flat_map(|p| &p.turns)) {
        d.i64(t.number).i64(t.at.as_micros()).f64(t.level.get());
        d.i64(t.time_sd.as_micros()).f64(t.level_sd.get());
    }
    for t in places.iter().flat_map(|p| &p.current_turns) {
        d.i64(t.number).i64(t.at.as_micros()).i64(t.time_sd.as_micros());
    }
    let curves = places.iter().flat_map(|p| [Some(&p.level), p.current.as_ref()]).flatten();
    for curve in core::iter::once(port_level).chain(curves) {
        curve.values().iter().for_each(|v| {
            d.f64(*v);
        });
    }
    d.get()
}
