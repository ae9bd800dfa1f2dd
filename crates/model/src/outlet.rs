//! Assets, and the outlet they form: a storage, its gate, its pumps and the place they meet.

use units::{CubicMetresPerSecond, Kilowatts, Level, Metres, Span};

use crate::{AdapterId, AssetId, PlaceId, SignalId, StorageId};

/// Something that can be commanded.
#[derive(Clone, PartialEq, Debug)]
pub struct Asset {
    pub id: AssetId,
    pub name: String,
    pub kind: AssetKind,
    pub adapter: AdapterId,
    /// The adapter's own id of the drivable point.
    pub point: String,
    /// Position in percent for a gate, 0 or 100 for a pump.
    pub position: SignalId,
    /// Reads 1 when the local panel has the asset; absent where there is no such switch.
    pub local: Option<SignalId>,
    pub lease: Span,
    pub lease_holder: LeaseHolder,
    pub rest: RestActions,
    /// Shortest time between two commands of this asset.
    pub move_rest: Span,
}

#[derive(Clone, PartialEq, Debug)]
pub enum AssetKind {
    Gate(Gate),
    Pump(Pump),
}

#[derive(Clone, PartialEq, Debug)]
pub struct Gate {
    /// Time for the full stroke.
    pub stroke: Span,
    /// A stroke that takes longer than this many times its nominal time is a discrepancy.
    pub travel_factor: f64,
}

#[derive(Clone, PartialEq, Debug)]
pub struct Pump {
    pub flow: CubicMetresPerSecond,
    pub power: Kilowatts,
    pub starts_per_hour_max: u32,
    pub run_min: Span,
    pub rest_min: Span,
    /// Runs only while this gate stands open.
    pub needs_open: AssetId,
    pub start_timeout: Span,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum LeaseHolder {
    /// A timer or heartbeat in the controller.
    Device,
    Adapter,
    None,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum RestAction {
    Close,
    Open,
    Stop,
    Hold,
    HandToLocal,
}

/// What the asset does by itself, one for each cause; mandatory.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct RestActions {
    pub lease_out: RestAction,
    pub input_end: RestAction,
    pub trip: RestAction,
    pub stop: RestAction,
}

/// A storage that empties through a gate (and a pipe) to a place, helped by pumps.
#[derive(Clone, PartialEq, Debug)]
pub struct Outlet {
    pub name: String,
    pub storage: StorageId,
    pub place: PlaceId,
    pub gate: AssetId,
    pub pumps: Vec<AssetId>,
    pub pipe: OutfallPipe,
    /// Metered flow at the ports, m3/s, positive out of the storage.
    pub flow_signal: Option<SignalId>,
    /// Water level outside, m above the site datum.
    pub outer_signal: Option<SignalId>,
    /// From the gate shut to the last flow at the ports.
    pub drain_down: Span,
}

/// A pipe outfall with its ports under tide.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct OutfallPipe {
    pub diameter: Metres,
    pub length: Metres,
    /// Darcy friction factor.
    pub friction_f: f64,
    /// Sum of the other loss coefficients on V2/2g, gate fully open.
    pub loss_k: f64,
    pub port_centre: Level,
    /// rho_sea / rho_effluent - 1.
    pub density_excess: f64,
}
