//! The constants of a port, checked.

use core::fmt;

use crate::table::{self, Row};

/// How node factors move with time; a convention of the constants.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Nodal {
    /// At each instant.
    Continuous,
    /// Those of the middle of the calendar year (UTC), held for that year.
    MidYear,
}

/// Constants that no prediction can be made from.
#[derive(Clone, PartialEq, Debug)]
pub enum TideError {
    UnknownConstituent(String),
    Twice(String),
    NotFinite { name: String, amplitude_m: f64, phase_deg: f64 },
    Series(units::BadSeries),
}

impl fmt::Display for TideError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::UnknownConstituent(name) => write!(
                f,
                "{name:?} is no constituent that this program knows; use the IHO name, e.g. M2, \
                 LAMBDA2, 2SM2"
            ),
            Self::Twice(name) => write!(f, "constituent {name:?} is given twice; leave one out"),
            Self::NotFinite { name, amplitude_m, phase_deg } => write!(
                f,
                "constituent {name:?} has amplitude {amplitude_m} m and phase {phase_deg} deg; the \
                 amplitude must be 0 or more, and both finite"
            ),
            Self::Series(e) => write!(f, "{e}"),
        }
    }
}
impl std::error::Error for TideError {}

#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Constituent {
    pub row: &'static Row,
    pub amplitude_m: f64,
    pub phase_deg: f64,
}

/// Mean level and harmonic constants of one port, on one datum.
#[derive(Clone, PartialEq, Debug)]
pub struct Constants {
    pub(crate) mean_level_m: f64,
    pub(crate) nodal: Nodal,
    pub(crate) list: Vec<Constituent>,
}

impl Constants {
    /// `list` holds (name, amplitude in metres, Greenwich phase lag in degrees). A term of zero
    /// amplitude ("not resolved" in published lists) is left out. The order changes nothing.
    pub fn new(
        mean_level_m: f64,
        nodal: Nodal,
        list: &[(&str, f64, f64)],
    ) -> Result<Self, TideError> {
        let mut found: Vec<Constituent> = Vec::with_capacity(list.len());
        for (name, amplitude_m, phase_deg) in list.iter().copied() {
            let row =
                table::find(name).ok_or_else(|| TideError::UnknownConstituent(name.to_owned()))?;
            if found.iter().any(|c| c.row.name == row.name) {
                return Err(TideError::Twice(name.to_owned()));
            }
            let fine = amplitude_m.is_finite() && amplitude_m >= 0.0 && phase_deg.is_finite();
            if !fine {
                let name = name.to_owned();
                return Err(TideError::NotFinite { name, amplitude_m, phase_deg });
            }
            found.push(Constituent { row, amplitude_m, phase_deg });
        }
        found.retain(|c| c.amplitude_m > 0.0);
        // Sums in a fixed order, so that the same constants give the same bits.
        found.sort_by(|a, b| a.row.name.cmp(b.row.name));
        Ok(Self { mean_level_m, nodal, list: found })
    }
}
