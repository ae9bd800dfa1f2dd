//! The water outside, given as series; the truth is late on them by the drawn lag.

use units::{Series, Span, Utc};

/// What the water does outside. The series may be replaced by later ones as time goes on.
#[derive(Clone, PartialEq, Debug)]
pub struct Water {
    /// Level at the ports, m above the site datum.
    pub outer: Series,
    /// Level at the reference port's gauge, m above the site datum; it has no lag error.
    pub port: Option<Series>,
    /// Current at the ports, m/s positive seaward.
    pub current: Option<Series>,
}

impl Water {
    /// The last instant at which everything is known, with the lag taken into account.
    pub fn until(&self, lag: Span) -> Utc {
        let late = [Some(&self.outer), self.current.as_ref()];
        let late = late.into_iter().flatten().map(|s| s.last_instant() + lag);
        late.chain(self.port.as_ref().map(Series::last_instant)).min().expect("outer is there")
    }
    pub(crate) fn outer_m(&self, t: Utc, lag: Span) -> f64 {
        near(&self.outer, t - lag)
    }
    pub(crate) fn current_m_s(&self, t: Utc, lag: Span) -> Option<f64> {
        self.current.as_ref().map(|s| near(s, t - lag))
    }
    pub(crate) fn port_m(&self, t: Utc) -> Option<f64> {
        self.port.as_ref().map(|s| near(s, t))
    }
}

/// The value at `t`, or the first one before the series begins: a series that starts at the
/// plant's own start is up to ten minutes short once the lag is applied. (`advance` never asks
/// past the end.)
fn near(series: &Series, t: Utc) -> f64 {
    series.at(t.max(series.start()).min(series.last_instant())).expect("inside the series")
}
