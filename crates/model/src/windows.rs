//! Lawful windows (pure licence) and usable windows (what the water lets an asset do).

use units::{CubicMetres, CubicMetresPerSecond, Metres, Span, Utc, Window};

use crate::{AssetId, ClauseId, TideNumber};

/// When the licence lets an asset move water.
#[derive(Clone, PartialEq, Debug)]
pub struct Lawful {
    pub asset: AssetId,
    /// Over which the windows were worked out.
    pub span: Window,
    /// In order, disjoint.
    pub windows: Vec<LawfulWindow>,
    /// Tides with no window at all, and the clause that took it.
    pub nil: Vec<NilTide>,
}

impl Lawful {
    pub fn holding(&self, t: Utc) -> Option<&LawfulWindow> {
        self.windows.iter().find(|w| w.window.contains(t))
    }
    pub fn next_after(&self, t: Utc) -> Option<&LawfulWindow> {
        self.windows.iter().find(|w| w.window.start() > t)
    }
}

/// One stretch with every cap that holds in it: within one tide where a clause counts by tides, and
/// else by the tide that it begins in.
#[derive(Clone, PartialEq, Debug)]
pub struct LawfulWindow {
    pub tide: TideNumber,
    pub window: Window,
    pub opens: Edge,
    pub shuts: Edge,
    /// The tide's ebb range at the port: as it is, and as the clause rounds it.
    pub range: Metres,
    pub range_rounded: Metres,
    pub flow_max: Option<Cap<CubicMetresPerSecond>>,
    pub ramp_max_per_min: Option<Cap<CubicMetresPerSecond>>,
    pub volume_max: Option<Cap<CubicMetres>>,
}

/// A limit and the clause that sets it.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Cap<T> {
    pub max: T,
    pub clause: ClauseId,
}

/// Where a window begins or ends, and the clause that makes it so.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Edge {
    pub at: Utc,
    /// `None` where the forecast, not a clause, ends it.
    pub clause: Option<ClauseId>,
    pub anchor: EdgeAnchor,
    pub time_sd: Span,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum EdgeAnchor {
    /// Astronomy and a table: exact by the clause's own words.
    Predicted,
    /// The water as modelled: carries a band.
    Modelled,
    /// The end of what was looked at.
    SpanEnd,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct NilTide {
    pub tide: TideNumber,
    pub clause: ClauseId,
    pub range: Metres,
    pub range_rounded: Metres,
}

/// When the water lets an asset work, and what ends it.
#[derive(Clone, PartialEq, Debug)]
pub struct Usable {
    pub asset: AssetId,
    pub windows: Vec<UsableWindow>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct UsableWindow {
    pub window: Window,
    pub opens: UsableEdge,
    pub shuts: UsableEdge,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum UsableEdge {
    /// Enough head from a full storage, pumps included where there are any.
    Head,
    SpanEnd,
}
