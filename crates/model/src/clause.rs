//! The licence as data: clauses in the regulator's own numbering.

use units::{CubicMetres, CubicMetresPerSecond, Metres, MetresPerSecond, Span};

use crate::{AssetId, PlaceId, SignalId};

#[derive(Clone, PartialEq, Debug)]
pub struct Licence {
    pub reference: String,
    pub title: String,
    pub clauses: Vec<Clause>,
}

impl Licence {
    pub fn clause(&self, id: crate::ClauseId) -> &Clause {
        &self.clauses[id.index()]
    }
}

/// One condition.
#[derive(Clone, PartialEq, Debug)]
pub struct Clause {
    pub id: crate::ClauseId,
    /// As the regulator numbers it, e.g. `2.5`.
    pub number: String,
    /// The words of the licence.
    pub words: String,
    pub kind: ClauseKind,
    /// The assets it governs, and what it means for each when it cannot be read.
    pub governs: Vec<Governed>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Governed {
    pub asset: AssetId,
    pub on_stale: OnStale,
}

/// What a clause means for an asset while a signal that it needs is not good. No default.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum OnStale {
    Hold,
    Allow,
    Reduced(CubicMetresPerSecond),
}

#[derive(Clone, PartialEq, Debug)]
pub enum ClauseKind {
    /// Only from `from` after to `to` after the **predicted** event at the place: the port's
    /// prediction plus the tabulated difference. No surge moves it.
    TideWindow { place: PlaceId, anchor: TideAnchor, from: Span, to: Span },
    /// Only while the modelled current at the place runs seaward at `speed_min` or more.
    CurrentSeaward { place: PlaceId, speed_min: MetresPerSecond, meter: Option<SignalId> },
    /// A greatest flow as the mean over any `averaging`, and a greatest change per minute.
    Rate {
        flow_max: CubicMetresPerSecond,
        averaging: Span,
        ramp_max_per_min: Option<CubicMetresPerSecond>,
    },
    /// A volume (and flow) for each tide, by the range of its ebb at the port.
    VolumePerTide { rounding: Rounding, bands: Vec<RangeBand> },
    /// At most `volume_max` in (t - span, t] at every instant t.
    RollingVolume { span: Span, volume_max: CubicMetres },
    /// At most `volume_max` in each calendar month of the site's zone.
    MonthVolume { volume_max: CubicMetres },
    /// Signals that must keep within limits.
    SignalGate { conditions: Vec<SignalCondition>, applies: Applies },
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum TideAnchor {
    HighWater,
    LowWater,
}

/// Rounding of a range before it is looked up: to `step`, halves upward.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Rounding {
    pub step: Metres,
}

/// From `range_min` (after rounding) up to the next band's.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct RangeBand {
    pub range_min: Metres,
    /// Zero means nil: no release on such a tide.
    pub volume_max: CubicMetres,
    pub flow_max: Option<CubicMetresPerSecond>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct SignalCondition {
    pub signal: SignalId,
    pub limit: f64,
    pub sense: Sense,
    pub age_max: Span,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Sense {
    AtMost,
    AtLeast,
}

/// When a signal gate counts.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Applies {
    /// Before a release begins only.
    ToStart,
    /// Before it begins and for as long as it runs.
    Throughout,
}
