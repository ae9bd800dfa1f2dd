//! What the plant refuses, and why.

use core::fmt;

use structures::StructureError;
use units::Utc;

/// A refusal leaves everything as it was, except that a refused drive is in the record.
#[derive(Clone, PartialEq, Debug)]
pub enum PlantError {
    /// A structure that cannot exist.
    Structure { part: &'static str, source: StructureError },
    /// A figure of the configuration that cannot be.
    BadFigure { what: &'static str, value: f64 },
    /// No asset has this number.
    NoSuchAsset { asset: usize },
    /// A setting that is no number from 0 to 100.
    SettingOutOfRange { asset: usize, setting_percent: f64 },
    /// The lease would be over already.
    LeasePast { asset: usize },
    /// A renewal of an asset that nothing drives.
    NothingToRenew { asset: usize },
    /// The local panel has the asset.
    InLocal { asset: usize },
    /// A pump with the gate shut.
    WayShut { asset: usize },
    /// The water outside is not known that far.
    NoWater { until: Utc, wanted: Utc },
}

impl fmt::Display for PlantError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Structure { part, .. } => write!(f, "the {part} of the plant cannot be built"),
            Self::BadFigure { what, value } => write!(f, "{what} of the plant cannot be {value}"),
            Self::NoSuchAsset { asset } => write!(f, "the plant has no asset number {asset}"),
            Self::SettingOutOfRange { asset, setting_percent } => {
                write!(f, "asset {asset} takes 0 to 100 %, not {setting_percent}")
            }
            Self::LeasePast { asset } => write!(f, "the lease for asset {asset} is over already"),
            Self::NothingToRenew { asset } => {
                write!(f, "asset {asset} is at rest: there is no lease to renew")
            }
            Self::InLocal { asset } => write!(f, "asset {asset} is in local control"),
            Self::WayShut { asset } => write!(f, "pump {asset} may not run against a shut gate"),
            Self::NoWater { until, wanted } => {
                write!(f, "the water outside is known until {until}, not until {wanted}")
            }
        }
    }
}

impl std::error::Error for PlantError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            Self::Structure { source, .. } => Some(source),
            _ => None,
        }
    }
}
