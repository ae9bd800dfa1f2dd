//! A person's acts. Each has a name and a reason, and is kept.

use model::AssetId;
use units::{Percent, Utc};

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Mode {
    /// Nothing is commanded.
    Observe,
    /// Each release waits for an operator's yes; protection waits for nobody.
    Advise,
    Automatic,
}

impl Mode {
    pub const fn words(self) -> &'static str {
        match self {
            Self::Observe => "observe",
            Self::Advise => "advise",
            Self::Automatic => "automatic",
        }
    }
}

#[derive(Clone, PartialEq, Debug)]
pub struct Act {
    pub by: String,
    pub reason: String,
    /// Who the socket says it is: user id and process, as text.
    pub peer: String,
    pub kind: ActKind,
}

#[derive(Clone, PartialEq, Debug)]
pub enum ActKind {
    Mode(Mode),
    /// Automatic may resume by itself after a restart until this instant.
    Authorise {
        until: Utc,
    },
    /// Yes to the next (or running) release of the asset, for the whole of it.
    Confirm {
        asset: AssetId,
    },
    /// Keep the asset at rest until this instant.
    Hold {
        asset: AssetId,
        until: Utc,
    },
    /// A person drives the asset; passes guard and interlock.
    Hand {
        asset: AssetId,
        setting: Percent,
        until: Utc,
    },
    /// Give the asset back to the program.
    Auto {
        asset: AssetId,
    },
    /// Lock out, or (only by the same person) give back.
    OutOfService {
        asset: AssetId,
        locked: bool,
    },
    /// Clear the safe latch or an asset's trip, once its cause is gone.
    Reset {
        asset: Option<AssetId>,
    },
    /// Send one asset, or all, to rest now.
    Rest {
        asset: Option<AssetId>,
    },
    /// A person has checked the clock and vouches for it.
    TrustClock,
}
