//! The controller's part for one asset: what it wants, by whose lease, and what it does alone.
//!
//! ```text
//!             drive                 lease out / rest told
//!   at rest ─────────► driven ────────────────────────────► resting ──► at rest
//!      ▲                  │ drive, renew: stays driven          │ there: rest done
//!      │                  └─ local taken: setpoint dropped      │ drive: driven again
//!      └────────────────────────────────────────────────────────┘
//! ```

use units::Mono;

use crate::RestDo;

/// Holds the lease of one asset. Positions and targets are shares 0 to 1.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Device {
    pub rest: RestDo,
    pub target: f64,
    pub lease: Option<Lease>,
    /// Resting, and not there yet.
    pub resting: bool,
    pub local: bool,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Lease {
    pub command: u64,
    pub end: Mono,
}

impl Device {
    pub const fn at(position: f64, rest: RestDo) -> Self {
        Self { rest, target: position, lease: None, resting: false, local: false }
    }
    pub const fn drive(&mut self, target: f64, lease: Lease) {
        self.target = target;
        self.lease = Some(lease);
        self.resting = false;
    }
    /// Begins a rest action from where the asset is.
    pub const fn begin_rest(&mut self, action: RestDo, position: f64) {
        self.target = match action {
            RestDo::Close | RestDo::Stop => 0.0,
            RestDo::Open => 1.0,
            RestDo::Hold => position,
        };
        self.lease = None;
        self.resting = true;
    }
    /// Drops the setpoint and stays at `position`: a person has taken it, or protection stopped it.
    pub const fn stand(&mut self, position: f64) {
        self.target = position;
        self.lease = None;
        self.resting = false;
    }
}
