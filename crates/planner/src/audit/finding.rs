//! What a reader may find.

use core::fmt;

use model::{AssetId, ClauseId, TideNumber};
use units::{Span, Utc};

/// Something in a plan that must not be.
#[derive(Clone, PartialEq, Debug)]
pub enum Finding {
    /// The plan does not answer the request in this.
    OtherRequest {
        what: &'static str,
    },
    /// Not one slot at this instant: a gap, an overlap, or an asset left out.
    Gap {
        asset: AssetId,
        at: Utc,
    },
    /// A setpoint that the asset cannot do, or that its reason does not fit.
    WrongSetpoint {
        asset: AssetId,
        at: Utc,
    },
    /// An asset that may not be planned is.
    Unavailable {
        asset: AssetId,
        at: Utc,
    },
    /// A release outside every lawful window, before its margin, or too late to have drained.
    OutsideWindow {
        at: Utc,
    },
    OverFlowCap {
        at: Utc,
        m3_s: f64,
    },
    /// The mean flow changes faster than the clause lets the flow change.
    OverRamp {
        at: Utc,
        m3_s_min: f64,
    },
    OverTideCap {
        tide: TideNumber,
        m3: f64,
    },
    OverLongCap {
        clause: ClauseId,
        at: Utc,
        m3: f64,
    },
    /// The gate is open without a pump, and the head would be gone within the closing lead.
    HeadGone {
        at: Utc,
    },
    PumpWithoutGate {
        asset: AssetId,
        at: Utc,
    },
    /// A run or a rest shorter than the pump's least.
    TooShort {
        asset: AssetId,
        at: Utc,
        length: Span,
    },
    TooManyStarts {
        asset: AssetId,
        at: Utc,
    },
    /// Water leaves, or comes, that no slot and no spill says.
    Unexplained {
        at: Utc,
        m3: f64,
    },
    /// What came in, went out and stayed does not add up.
    Unbalanced {
        what: &'static str,
        m3: f64,
    },
    /// A level outside what the plan may let happen.
    LevelOutside {
        at: Utc,
        level_m: f64,
    },
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::OtherRequest { what } => write!(f, "the plan answers another {what}"),
            Self::Gap { asset, at } => write!(f, "asset {} has no one slot at {at}", asset.0),
            Self::WrongSetpoint { asset, at } => {
                write!(f, "asset {} has a setpoint at {at} that does not fit it", asset.0)
            }
            Self::Unavailable { asset, at } => {
                write!(f, "asset {} is not available, but is planned at {at}", asset.0)
            }
            Self::OutsideWindow { at } => write!(f, "a release outside its window at {at}"),
            Self::OverFlowCap { at, m3_s } => write!(f, "{m3_s} m3/s at {at} is over the cap"),
            Self::OverRamp { at, m3_s_min } => {
                write!(f, "the flow changes by {m3_s_min:.3} m3/s a minute at {at}")
            }
            Self::OverTideCap { tide, m3 } => write!(f, "{m3} m3 on tide {tide} is over its cap"),
            Self::OverLongCap { clause, at, m3 } => {
                write!(f, "{m3} m3 by {at} is over the cap of clause no. {}", clause.0)
            }
            Self::HeadGone { at } => {
                write!(f, "the gate is open at {at}, and the head is gone before it could be shut")
            }
            Self::PumpWithoutGate { asset, at } => {
                write!(f, "pump {} runs with the gate shut at {at}", asset.0)
            }
            Self::TooShort { asset, at, length } => {
                write!(f, "pump {} runs or rests for only {length} from {at}", asset.0)
            }
            Self::TooManyStarts { asset, at } => {
                write!(f, "pump {} starts too often in the hour to {at}", asset.0)
            }
            Self::Unexplained { at, m3 } => {
                write!(f, "{m3} m3 leave at {at}, and nothing says how")
            }
            Self::Unbalanced { what, m3 } => {
                write!(f, "{m3} m3 of the {what} are not accounted for")
            }
            Self::LevelOutside { at, level_m } => write!(f, "a level of {level_m} m at {at}"),
        }
    }
}
