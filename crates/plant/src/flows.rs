//! The flows at one instant, from levels and positions.

use structures::{Outfall, broad_crested_m3_s, daily_inflow_m3_s};
use units::{Span, Utc};

use crate::{PlantConfig, PumpConfig};

/// All flows, m3/s.
#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub(crate) struct Flows {
    pub inflow: f64,
    /// Past the gate, before drain-down is added at the ports.
    pub gate: f64,
    pub spill: f64,
    pub pump_kw: f64,
}

/// What the flows are taken from.
pub(crate) struct Standing<'a> {
    pub level_m: f64,
    pub outer_m: f64,
    pub gate_share: f64,
    pub pumps_run: &'a [bool],
}

pub(crate) fn inflow_m3_s(config: &PlantConfig, t: Utc) -> f64 {
    let p = &config.inflow;
    let hour = (t - t.floor_to(Span::days(1))).as_hours();
    let dry = daily_inflow_m3_s(p.mean_m3_s, p.swing, p.peak_hour_utc, hour);
    (dry * config.truth.inflow_factor + config.truth.unmodelled_m3_s(t)).min(p.max_m3_s)
}

pub(crate) fn flows(config: &PlantConfig, outfall: &Outfall, t: Utc, s: &Standing) -> Flows {
    let running = || config.pumps.iter().zip(s.pumps_run).filter(|(_, on)| **on).map(|(p, _)| p);
    let rated: f64 = running().map(|p| p.flow_m3_s * config.truth.pump_factor).sum();
    // A pump cannot raise the chamber further than its power lifts its flow.
    let lift_m = running().map(PumpConfig::lift_m).fold(f64::INFINITY, f64::min);
    let pumped = if rated > 0.0 {
        rated.min(outfall.flow_m3_s(s.level_m + lift_m, s.outer_m, s.gate_share))
    } else {
        0.0
    };
    let gate = outfall.flow_with_pumps_m3_s(s.level_m, s.outer_m, s.gate_share, pumped);
    let w = &config.spill;
    let over_m = s.level_m - w.crest_level_m;
    let discharge = w.discharge * config.truth.spill_factor;
    Flows {
        inflow: inflow_m3_s(config, t),
        gate: if s.level_m > config.storage.floor_m() { gate } else { 0.0 },
        spill: broad_crested_m3_s(w.crest_length_m, over_m, discharge),
        pump_kw: running().map(|p| p.power_kw).sum(),
    }
}
