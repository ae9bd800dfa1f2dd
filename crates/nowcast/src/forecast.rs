//! The forecast: port and places over a span, made once and never changed.

use core::fmt;

use model::{Forecast, PlaceForecast, Site};
use tide::TideError;
use units::{BadSeries, Digest, Span, Utc, Window};

use crate::differences::{Differences, GRID, PortToPlace};
use crate::port::{PortTide, port_tide, tides};

#[derive(Clone, PartialEq, Debug)]
pub enum ForecastError {
    /// The span goes beyond what the constants hold for.
    OutsideValid {
        span: Window,
        valid: Window,
    },
    Tide(TideError),
    Series(BadSeries),
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
            Self::Series(e) => write!(f, "a curve of the forecast: {e}"),
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
        way.place_forecast(&port, p.id, &span).map_err(ForecastError::Series)
    });
    let places: Vec<PlaceForecast> = each.collect::<Result<_, _>>()?;
    let all = tides(&port.turns);
    let tides = all.into_iter().filter(|t| t.window.intersect(&span).is_some()).collect();
    Ok(Forecast {
        as_of,
        span,
        digest: digest(site, as_of, &span, &port, &places),
        port_turns: port.turns,
        tides,
        port_level,
        places,
    })
}

fn digest(
    site: &Site,
    as_of: Utc,
    span: &Window,
    port: &PortTide,
    places: &[PlaceForecast],
) -> u64 {
    let mut d = Digest::new();
    d.bytes(site.site_digest.as_bytes()).i64(as_of.as_micros());
    d.i64(span.start().as_micros()).i64(span.end().as_micros());
    for t in port.turns.iter().chain(places.iter().flat_map(|p| &p.turns)) {
        d.i64(t.number).i64(t.at.as_micros()).f64(t.level.get());
    }
    for place in places {
        place.level.values().iter().for_each(|v| {
            d.f64(*v);
        });
    }
    d.get()
}
