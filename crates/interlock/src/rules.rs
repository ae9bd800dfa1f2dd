//! What an asset is, fixed for the life of a site file, and the scene it is judged in.

use units::{Percent, Span};

use crate::Raw;

/// Whether the clock may be believed.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum ClockTrust {
    Trusted,
    Distrusted,
}

/// How long a permit is good for: 2 s of real time.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct PermitLife(Span);

impl PermitLife {
    pub const REAL: Self = Self(Span::seconds(2));
    /// The same 2 s of real time on a simulated clock that runs `speed` times as fast.
    pub fn simulated(speed: u32) -> Self {
        Self(Span::seconds(2) * i64::from(speed.max(1)))
    }
    pub(crate) const fn span(self) -> Span {
        self.0
    }
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Rules {
    /// Digest of the site's name: a permit is good for one site.
    pub site: u64,
    pub asset: u16,
    pub kind: Kind,
    pub lease: Span,
    pub permit_life: PermitLife,
    pub move_rest: Span,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Kind {
    Gate(GateRules),
    Pump(PumpRules),
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct GateRules {
    /// Ports and density, for the pressure outside: net head = inner - outer - excess x (outer -
    /// ports), in metres of the water inside.
    pub port_centre_m: f64,
    pub density_excess: f64,
    /// How long the way may stand open against the head while its pumps start.
    pub assist_grace: Span,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct PumpRules {
    pub starts_per_hour_max: u32,
    pub rest_min: Span,
    pub inner_m_min: f64,
    /// The gate must stand open at least this far.
    pub way_open_min: Percent,
}

/// A lease may be this long at most: a site that needs longer must say so to people, not to us.
pub(crate) const LEASE_MAX: Span = Span::minutes(10);
/// Two levels of one storage may differ by this much (common practice: a few centimetres).
pub(crate) const INNER_DISAGREE_M: f64 = 0.10;

/// Everything that is known of the asset at the moment of judgement.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Scene {
    pub clock: ClockTrust,
    pub state: State,
    pub position: Option<Raw>,
    /// 1 when the local panel has the asset; `None` where there is no such switch.
    pub selector: Option<Option<Raw>>,
    /// Levels of the storage: all that there should be; a missing reading is `Some(None)`.
    pub inner: [Option<Option<Raw>>; 2],
    /// The water outside; `None` where the site has no such gauge.
    pub outer: Option<Option<Raw>>,
    /// The position of the gate that a pump pumps through.
    pub way: Option<Raw>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct State {
    /// Commanded to pass water or use power now.
    pub active: bool,
    pub locked_out: bool,
    pub latched: bool,
    /// Since the asset was last commanded; `None` if never in this term.
    pub since_move: Option<Span>,
    /// Since a pump last stopped, by the boot clock; `None` if it never ran.
    pub since_stop: Option<Span>,
    pub starts_last_hour: u32,
    /// A pump of this way runs by its own feedback.
    pub pump_runs: bool,
    /// The way is open for pumps to be started, since so long.
    pub assisted_for: Option<Span>,
}
