//! The forecast: what the water will do at the port and at each place. Immutable.

use units::{Level, Metres, Series, Span, Utc, Window};

use crate::{PlaceId, TideNumber};

#[derive(Clone, PartialEq, Debug)]
pub struct Forecast {
    /// On the 5-minute grid of UTC.
    pub as_of: Utc,
    pub span: Window,
    /// Digest of everything it was made from.
    pub digest: u64,
    /// Predicted turns at the port: astronomy alone, no surge.
    pub port_turns: Vec<Turn>,
    /// The port's ebbs, one a tide, for clauses that look a range up.
    pub tides: Vec<Tide>,
    pub port_level: Series,
    pub places: Vec<PlaceForecast>,
}

impl Forecast {
    pub fn place(&self, id: PlaceId) -> &PlaceForecast {
        &self.places[id.index()]
    }
    pub fn tide(&self, number: TideNumber) -> Option<&Tide> {
        self.tides.iter().find(|t| t.number == number)
    }
    /// The tide (predicted low water to low water at the port) that holds `t`.
    pub fn tide_at(&self, t: Utc) -> Option<&Tide> {
        self.tides.iter().find(|tide| tide.window.contains(t))
    }
}

/// One tide for counting: low water to low water at the port, numbered by the moon.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Tide {
    pub number: TideNumber,
    pub window: Window,
    pub high: Turn,
    /// High water down to the low water that ends this tide, unrounded.
    pub ebb_range: Metres,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum TurnKind {
    High,
    Low,
}

/// A high or a low water. A tide's high water and the low water that ends it carry its number.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Turn {
    pub number: TideNumber,
    pub kind: TurnKind,
    pub at: Utc,
    pub level: Level,
    /// One standard deviation each.
    pub time_sd: Span,
    pub level_sd: Metres,
}

/// A place: by what method, and what will be.
#[derive(Clone, PartialEq, Debug)]
pub struct PlaceForecast {
    pub place: PlaceId,
    pub method: Method,
    pub turns: Vec<Turn>,
    /// Level, m above the site datum, on the 5-minute grid.
    pub level: Series,
    /// Current, m/s positive seaward, on the 5-minute grid; absent where none is tabulated.
    pub current: Option<Series>,
    pub current_turns: Vec<CurrentTurn>,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Method {
    Differences,
}

/// The current turns.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct CurrentTurn {
    pub number: TideNumber,
    pub to_seaward: bool,
    pub at: Utc,
    pub time_sd: Span,
}
