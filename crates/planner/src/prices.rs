//! What a plan minds, as prices in the money of the energy price. Their order is the order of rule
//! 1: water spilled, then water above the alarm, then energy and strokes; within it they are a
//! choice.

use crate::problem::PumpPlate;

#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Prices {
    pub energy_per_kwh: f64,
    /// Each m3 that is still there at the plan's end: three times what the dearest pump costs to
    /// move it, so that pumping pays where gravity cannot do it within the plan, and only there.
    pub stored_at_end_m3: f64,
    /// Each m3 for each hour that it stays: so little that leaving a tide sooner never pays for
    /// pumping, but always for leaving by gravity.
    pub stored_m3_h: f64,
    pub alarm_m3_h: f64,
    pub spill_m3: f64,
    /// A first opening on a tide: what keeping 500 m3 for half a day costs.
    pub opening: f64,
    /// Each further opening on the same tide.
    pub reopening: f64,
    pub pump_start: f64,
    /// A slot in which an open gate only passes what flows in, the storage being down to its floor:
    /// more than that water is worth, unless it keeps the storage off its alarm or its weir.
    pub trickle: f64,
}

/// With no pump, or free energy, a price is still needed: this much a m3.
const PUMPING_LEAST_M3: f64 = 0.002;

impl Prices {
    pub(crate) fn of(energy_per_kwh: f64, pumps: &[PumpPlate]) -> Self {
        let per_m3 = |p: &PumpPlate| p.power_kw / (3600.0 * p.flow_m3_s.max(1e-6)) * energy_per_kwh;
        let pumping_m3 = pumps.iter().map(per_m3).fold(PUMPING_LEAST_M3, f64::max);
        let stored_at_end_m3 = 3.0 * pumping_m3;
        let stored_m3_h = stored_at_end_m3 / 500.0;
        let opening = stored_m3_h * 12.0 * 500.0;
        Self {
            energy_per_kwh,
            stored_at_end_m3,
            stored_m3_h,
            alarm_m3_h: 10.0 * stored_at_end_m3,
            spill_m3: 1e5 * stored_at_end_m3,
            opening,
            reopening: 20.0 * opening,
            pump_start: opening,
            trickle: 4.0 * opening,
        }
    }
    /// Keeping `volume` for `hours`.
    pub(crate) fn stored(&self, volume: f64, volume_alarm: f64, hours: f64) -> f64 {
        let over = (volume - volume_alarm).max(0.0);
        (self.stored_m3_h * volume + self.alarm_m3_h * over) * hours
    }
}
