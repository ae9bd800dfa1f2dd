//! Why an asset is as it is: causes, each resting on one fact that could be otherwise.

use units::{Utc, Window};

use crate::{AdapterId, AssetId, ClauseId, SignalId};

/// One thing that stands against a movement (or asks for it).
#[derive(Clone, PartialEq, Debug)]
pub struct Cause {
    pub by: By,
    pub fact: Fact,
}

/// Who or what says so.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum By {
    /// Hand/off/auto, local/remote, a lock-out.
    AssetState,
    /// An interlock, by its id.
    Interlock(&'static str),
    Latch,
    Clause(ClauseId),
    Mode,
    Armed,
    /// An operator's hold, or a yes that is still missing.
    Person,
    Plan,
}

/// One fact: what it is about, what it is, and what it would have to be.
#[derive(Clone, PartialEq, Debug)]
pub struct Fact {
    pub about: About,
    pub is: Is,
    pub must_be: MustBe,
}

#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum About {
    Signal(SignalId),
    Now,
    Mode,
    Latch,
    ClockTrust,
    Journal,
    Forecast,
    Adapter(AdapterId),
    Position(AssetId),
    Lock(AssetId),
    Selector(AssetId),
    Hold(AssetId),
    Confirmation(AssetId),
    LastMove(AssetId),
    VolumeThisTide,
    VolumeRolling,
    VolumeMonth,
    MeanFlow,
    Plan,
}

#[derive(Clone, PartialEq, Debug)]
pub enum Is {
    Number(f64),
    Instant(Utc),
    Words(String),
    Nothing,
}

#[derive(Clone, PartialEq, Debug)]
pub enum MustBe {
    AtLeast(f64),
    AtMost(f64),
    Inside(Window),
    After(Utc),
    Words(&'static str),
}
