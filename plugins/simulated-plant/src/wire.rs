//! The line protocol between the adapter and the plant: one JSON object a line, ask and answer.
//! It is private to this crate; both ends are always of one build.

use serde::{Deserialize, Serialize};

/// Longest line either end reads, bytes.
pub(crate) const LINE_MAX: u64 = 64 * 1024;

#[derive(Clone, PartialEq, Debug, Serialize, Deserialize)]
#[serde(tag = "ask", rename_all = "snake_case")]
pub(crate) enum Ask {
    Points,
    Sense,
    Drive {
        point: String,
        setting_percent: f64,
        command: u64,
        lease_end_ns: u64,
    },
    Renew {
        point: String,
        command: u64,
        lease_end_ns: u64,
    },
    /// No action means the one that the controller has for a lease that ran out.
    Rest {
        point: String,
        action: Option<RestWord>,
        why: String,
    },
    /// A person at the panel.
    Local {
        point: String,
        local: bool,
    },
    /// Rest everything, and end when all is still.
    Finish,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub(crate) enum RestWord {
    Close,
    Open,
    Stop,
    Hold,
    /// The simulated plant has no local control of its own: it stays as it is.
    HandToLocal,
}

#[derive(Clone, PartialEq, Debug, Serialize, Deserialize)]
#[serde(tag = "answer", rename_all = "snake_case")]
pub(crate) enum Answer {
    Done,
    Refused { why: String },
    Points { driven: Vec<Driven>, read: Vec<Read> },
    Readings { at_us: i64, list: Vec<Value> },
}

#[derive(Clone, PartialEq, Debug, Serialize, Deserialize)]
pub(crate) struct Driven {
    pub point: String,
    pub gate: bool,
    pub rest: Rests,
}

/// What an asset does by itself, one for each cause.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize, Deserialize)]
pub(crate) struct Rests {
    pub lease_out: RestWord,
    pub input_end: RestWord,
    pub trip: RestWord,
    pub stop: RestWord,
}

#[derive(Clone, PartialEq, Debug, Serialize, Deserialize)]
pub(crate) struct Read {
    pub point: String,
    pub unit: String,
    pub min: f64,
    pub max: f64,
}

#[derive(Clone, PartialEq, Debug, Serialize, Deserialize)]
pub(crate) struct Value {
    pub point: String,
    pub value: f64,
}

impl RestWord {
    pub const fn into_do(self) -> plant::RestDo {
        match self {
            Self::Close => plant::RestDo::Close,
            Self::Open => plant::RestDo::Open,
            Self::Stop => plant::RestDo::Stop,
            Self::Hold | Self::HandToLocal => plant::RestDo::Hold,
        }
    }
    pub const fn of(action: model::RestAction) -> Self {
        match action {
            model::RestAction::Close => Self::Close,
            model::RestAction::Open => Self::Open,
            model::RestAction::Stop => Self::Stop,
            model::RestAction::Hold => Self::Hold,
            model::RestAction::HandToLocal => Self::HandToLocal,
        }
    }
}
