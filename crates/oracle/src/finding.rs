//! What was broken, and the figures.

use core::fmt;

use units::{Span, Utc};

#[derive(Clone, PartialEq, Debug)]
pub enum Finding {
    /// The record or the rules cannot be judged by; nothing else was looked at.
    Unjudgeable {
        why: String,
    },
    FlowOutsideWindow {
        from: Utc,
        to: Utc,
        volume_m3: f64,
    },
    FlowOverCap {
        at: Utc,
        mean_m3_s: f64,
        max_m3_s: f64,
    },
    RampOverCap {
        at: Utc,
        change_m3_s: f64,
        max_m3_s: f64,
    },
    TideOverCap {
        tide: i64,
        volume_m3: f64,
        max_m3: f64,
    },
    RollingOverCap {
        at: Utc,
        volume_m3: f64,
        max_m3: f64,
    },
    FixedOverCap {
        from: Utc,
        volume_m3: f64,
        max_m3: f64,
    },
    PastInterlock {
        at: Utc,
        asset: usize,
        why: String,
    },
    RestNotBegun {
        at: Utc,
        asset: usize,
        late: Span,
    },
    RestNotDone {
        at: Utc,
        asset: usize,
        late: Span,
    },
    AvoidableSpill {
        at: Utc,
        volume_m3: f64,
        unused: Utc,
    },
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Unjudgeable { why } => write!(f, "cannot be judged: {why}"),
            Self::FlowOutsideWindow { from, to, volume_m3 } => {
                write!(f, "{volume_m3:.2} m3 left outside a lawful window, {from} to {to}")
            }
            Self::FlowOverCap { at, mean_m3_s, max_m3_s } => {
                write!(f, "mean flow {mean_m3_s:.4} m3/s up to {at}, at most {max_m3_s:.2}")
            }
            Self::RampOverCap { at, change_m3_s, max_m3_s } => {
                write!(f, "flow changed by {change_m3_s:.3} m3/s in the minute to {at}, at most ")?;
                write!(f, "{max_m3_s:.2}")
            }
            Self::TideOverCap { tide, volume_m3, max_m3 } => {
                write!(f, "{volume_m3:.1} m3 left on tide {tide}, at most {max_m3:.0}")
            }
            Self::RollingOverCap { at, volume_m3, max_m3 } => {
                write!(f, "{volume_m3:.1} m3 left in the span up to {at}, at most {max_m3:.0}")
            }
            Self::FixedOverCap { from, volume_m3, max_m3 } => {
                write!(f, "{volume_m3:.1} m3 left in the month from {from}, at most {max_m3:.0}")
            }
            Self::PastInterlock { at, asset, why } => {
                write!(f, "asset {asset} was driven at {at} past an interlock: {why}")
            }
            Self::RestNotBegun { at, asset, late } => {
                write!(f, "asset {asset}: lease over at {at}, rest begun {late} late or never")
            }
            Self::RestNotDone { at, asset, late } => {
                write!(f, "asset {asset}: rest due to be done at {at}, {late} late or never")
            }
            Self::AvoidableSpill { at, volume_m3, unused } => {
                write!(
                    f,
                    "{volume_m3:.1} m3 spilled at {at}; a lawful minute was unused at {unused}"
                )
            }
        }
    }
}

/// Sums over the run.
#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub struct Totals {
    pub inflow_m3: f64,
    pub released_m3: f64,
    pub spilled_m3: f64,
    pub spilled_avoidably_m3: f64,
    /// Stretches of flow at the ports of a cubic metre or more.
    pub releases: usize,
    pub outside_window_m3: f64,
    pub drives: usize,
    pub drives_refused_by_plant: usize,
    pub leases_run_out: usize,
    pub rests_begun: usize,
    /// Rests that a jam of the gate delayed: the named exception to "done within stroke".
    pub rests_behind_jam: usize,
    /// The longest from the end of a lease, or from being told, to the beginning of the rest.
    pub rest_begun_latest: Span,
    /// The longest from there to its end, but for those behind a jam.
    pub rest_done_latest: Span,
    pub flow_mean_max_m3_s: f64,
    pub rolling_max_m3: f64,
}

/// The judgement.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Report {
    pub totals: Totals,
    pub findings: Vec<Finding>,
}

impl fmt::Display for Report {
    /// One figure a line, then each finding.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let t = &self.totals;
        writeln!(f, "inflow                    {:>10.0} m3", t.inflow_m3)?;
        writeln!(f, "released                  {:>10.0} m3", t.released_m3)?;
        writeln!(f, "releases                  {:>10}", t.releases)?;
        writeln!(f, "spilled                   {:>10.0} m3", t.spilled_m3)?;
        writeln!(f, "spilled, avoidable        {:>10.0} m3", t.spilled_avoidably_m3)?;
        writeln!(f, "outside a lawful window   {:>10.2} m3", t.outside_window_m3)?;
        writeln!(f, "greatest mean flow        {:>10.3} m3/s", t.flow_mean_max_m3_s)?;
        writeln!(f, "greatest rolling volume   {:>10.0} m3", t.rolling_max_m3)?;
        writeln!(f, "commands taken            {:>10}", t.drives)?;
        writeln!(f, "commands refused by plant {:>10}", t.drives_refused_by_plant)?;
        writeln!(f, "leases run out            {:>10}", t.leases_run_out)?;
        writeln!(f, "rests begun               {:>10}", t.rests_begun)?;
        writeln!(f, "rests behind a jam        {:>10}", t.rests_behind_jam)?;
        writeln!(f, "rest begun, latest        {:>10}", t.rest_begun_latest.to_string())?;
        writeln!(f, "rest done after, latest   {:>10}", t.rest_done_latest.to_string())?;
        writeln!(f, "findings                  {:>10}", self.findings.len())?;
        self.findings.iter().try_for_each(|finding| writeln!(f, "  {finding}"))
    }
}
