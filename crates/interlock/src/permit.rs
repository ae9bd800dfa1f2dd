//! The permit: the only thing that lets a command leave, and only this crate makes one.
//!
//! Private fields, not `Clone`, not `Default`, no constructor outside this crate, consumed by value:
//! that no other crate can write one down is a compile-time fact.
//!
//! ```compile_fail,E0451
//! // A permit cannot be made by hand ...
//! let forged = interlock::Permit {
//!     site: 1, asset: 0, action: interlock::Action::Shut, command: 7, term: 1, state_seq: 1,
//!     readings: 0, not_after: units::Mono::ZERO, lease_end: units::Mono::ZERO,
//! };
//! ```
//! ```compile_fail,E0599
//! // ... nor copied, to be used twice.
//! fn twice(permit: interlock::Permit) -> (interlock::Permit, interlock::Permit) {
//!     (permit.clone(), permit)
//! }
//! ```
//! The same functions without the offending act compile, so the failures above are the ones meant:
//! ```
//! fn once(permit: interlock::Permit) -> interlock::Permit {
//!     assert_eq!(permit.action(), interlock::Action::Shut);
//!     permit
//! }
//! ```

use units::{Mono, Percent};

/// What an asset may be told.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Action {
    /// Gate to this opening; an opening of zero is `Shut`.
    Open(Percent),
    Shut,
    Run,
    Stop,
}

impl Action {
    /// Whether it passes water or uses power: anything but rest.
    pub const fn is_active(self) -> bool {
        matches!(self, Self::Open(_) | Self::Run)
    }
    /// The value on the wire: percent for a gate, 100 or 0 for a pump.
    pub const fn setting(self) -> Percent {
        match self {
            Self::Open(p) => p,
            Self::Run => Percent::FULL,
            Self::Shut | Self::Stop => Percent::ZERO,
        }
    }
}

/// Leave to give one command once, until `not_after`.
#[derive(PartialEq, Debug)]
pub struct Permit {
    pub(crate) site: u64,
    pub(crate) asset: u16,
    pub(crate) action: Action,
    pub(crate) command: u64,
    pub(crate) term: u64,
    pub(crate) state_seq: u64,
    pub(crate) readings: u64,
    pub(crate) not_after: Mono,
    pub(crate) lease_end: Mono,
}

impl Permit {
    /// Digest of the site's name.
    pub const fn site(&self) -> u64 {
        self.site
    }
    pub const fn asset(&self) -> u16 {
        self.asset
    }
    pub const fn action(&self) -> Action {
        self.action
    }
    pub const fn command(&self) -> u64 {
        self.command
    }
    pub const fn term(&self) -> u64 {
        self.term
    }
    /// The engine's event on which it was judged.
    pub const fn state_seq(&self) -> u64 {
        self.state_seq
    }
    /// Digest of the raw readings it was judged on.
    pub const fn readings(&self) -> u64 {
        self.readings
    }
    /// The boot-clock instant after which the host refuses it.
    pub const fn not_after(&self) -> Mono {
        self.not_after
    }
    /// The boot-clock instant at which the asset rests by itself.
    pub const fn lease_end(&self) -> Mono {
        self.lease_end
    }
}

/// Leave to prolong the lease of a command that has gone out.
#[derive(PartialEq, Debug)]
pub struct Renewal {
    pub(crate) asset: u16,
    pub(crate) command: u64,
    pub(crate) not_after: Mono,
    pub(crate) lease_end: Mono,
}

impl Renewal {
    pub const fn asset(&self) -> u16 {
        self.asset
    }
    pub const fn command(&self) -> u64 {
        self.command
    }
    pub const fn not_after(&self) -> Mono {
        self.not_after
    }
    pub const fn lease_end(&self) -> Mono {
        self.lease_end
    }
}
