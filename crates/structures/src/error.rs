//! What makes a structure impossible.

use core::fmt;

/// A structure that cannot be built from the figures given; names the figure.
#[derive(Clone, PartialEq, Debug)]
pub enum StructureError {
    /// A figure outside what the law allows.
    BadFigure { what: &'static str, value: f64, rule: &'static str },
    /// A storage curve with fewer than two points.
    CurveTooShort { points: usize },
    /// A storage curve whose levels and volumes do not both rise.
    CurveNotRising { index: usize, level_m: f64, volume_m3: f64 },
}

impl fmt::Display for StructureError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::BadFigure { what, value, rule } => {
                write!(f, "{what} is {value}, but it must be {rule}")
            }
            Self::CurveTooShort { points } => {
                write!(f, "a storage curve needs two points or more, not {points}")
            }
            Self::CurveNotRising { index, level_m, volume_m3 } => write!(
                f,
                "point {index} of the storage curve ({level_m} m, {volume_m3} m3) does not rise in \
                 both level and volume over the one before"
            ),
        }
    }
}
impl std::error::Error for StructureError {}

/// The value, if it is finite and over zero.
pub(crate) fn positive(what: &'static str, value: f64) -> Result<f64, StructureError> {
    if value.is_finite() && value > 0.0 {
        Ok(value)
    } else {
        Err(StructureError::BadFigure { what, value, rule: "a finite number over zero" })
    }
}

/// The value, if it is finite and not below zero.
pub(crate) fn not_negative(what: &'static str, value: f64) -> Result<f64, StructureError> {
    if value.is_finite() && value >= 0.0 {
        Ok(value)
    } else {
        Err(StructureError::BadFigure { what, value, rule: "a finite number, zero or more" })
    }
}

/// The value, if it is finite.
pub(crate) fn finite(what: &'static str, value: f64) -> Result<f64, StructureError> {
    if value.is_finite() {
        Ok(value)
    } else {
        Err(StructureError::BadFigure { what, value, rule: "a finite number" })
    }
}
