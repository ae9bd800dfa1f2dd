//! What makes a plan impossible to work out.

use core::fmt;

use structures::StructureError;
use units::{Utc, Window};

/// A request, or a site, that no plan can be made from; names its subject.
#[derive(Clone, PartialEq, Debug)]
pub enum PlanError {
    /// The site has no outlet of this index.
    NoSuchOutlet {
        outlet: usize,
        outlets: usize,
    },
    /// One flag for each asset of the site is needed.
    AvailableCount {
        given: usize,
        assets: usize,
    },
    /// The outlet's gate is not a gate, or one of its pumps not a pump.
    WrongKind {
        asset: String,
        must_be: &'static str,
    },
    /// The pump waits for another gate than its outlet's.
    PumpOfAnotherGate {
        pump: String,
    },
    /// Lowest working, high alarm and spill level do not rise in this order.
    LevelsOutOfOrder {
        lowest_m: f64,
        alarm_m: f64,
        spill_m: f64,
    },
    /// A setting that must be a share.
    BadShare {
        setting: &'static str,
        value: f64,
    },
    Structure {
        part: &'static str,
        source: StructureError,
    },
    /// The level is below the storage's curve.
    LevelOutside {
        level_m: f64,
    },
    /// The span does not begin on the 5-minute grid of UTC.
    OffGrid {
        start: Utc,
    },
    /// The span is shorter than one slot.
    TooShort {
        span: Window,
    },
    /// A series of the request does not cover its span.
    Uncovered {
        what: &'static str,
        at: Utc,
    },
}

impl fmt::Display for PlanError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NoSuchOutlet { outlet, outlets } => {
                write!(f, "outlet no. {outlet} was asked for, but the site has {outlets}")
            }
            Self::AvailableCount { given, assets } => {
                write!(f, "{given} availability flags were given for {assets} assets")
            }
            Self::WrongKind { asset, must_be } => {
                write!(f, "{asset} is not the {must_be} that the outlet needs")
            }
            Self::PumpOfAnotherGate { pump } => {
                write!(f, "{pump} waits for another gate than its outlet's")
            }
            Self::LevelsOutOfOrder { lowest_m, alarm_m, spill_m } => write!(
                f,
                "lowest working {lowest_m} m, high alarm {alarm_m} m and spill {spill_m} m must \
                 rise in this order"
            ),
            Self::BadShare { setting, value } => {
                write!(f, "{setting} is {value}, but it must be over 0 and at most 1")
            }
            Self::Structure { part, source } => write!(f, "the {part}: {source}"),
            Self::LevelOutside { level_m } => {
                write!(f, "a storage level of {level_m} m is outside its curve")
            }
            Self::OffGrid { start } => {
                write!(f, "a plan begins on the 5-minute grid of UTC, not at {start}")
            }
            Self::TooShort { span } => write!(f, "{span} is shorter than a slot of 5 minutes"),
            Self::Uncovered { what, at } => write!(f, "the {what} says nothing of {at}"),
        }
    }
}

impl std::error::Error for PlanError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            Self::Structure { source, .. } => Some(source),
            _ => None,
        }
    }
}
