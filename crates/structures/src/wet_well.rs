//! A wet well: how often a pump starts.

/// One fill and one empty of a wet well at a steady inflow.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Cycle {
    pub fill_s: f64,
    pub pump_s: f64,
}

impl Cycle {
    pub fn total_s(&self) -> f64 {
        self.fill_s + self.pump_s
    }
    pub fn starts_per_hour(&self) -> f64 {
        3_600.0 / self.total_s()
    }
}

/// The cycle of a well with `volume_m3` between start and stop level. `None` where the pump never
/// rests or never starts: inflow of zero or below, or of the pump's flow and above.
///
/// **Source**: continuity: t = V/q + V/(Qp - q) (common practice).
pub fn cycle(volume_m3: f64, inflow_m3_s: f64, pump_m3_s: f64) -> Option<Cycle> {
    (inflow_m3_s > 0.0 && inflow_m3_s < pump_m3_s).then(|| Cycle {
        fill_s: volume_m3 / inflow_m3_s,
        pump_s: volume_m3 / (pump_m3_s - inflow_m3_s),
    })
}

/// The least volume that keeps starts to one in `period_s` at the worst inflow, half the pump's
/// flow: V = T Qp / 4, m3; with pumps that alternate, over their number.
///
/// **Source**: minimum of the cycle over q (common practice).
pub fn volume_least_m3(pump_m3_s: f64, period_s: f64, alternating: u32) -> f64 {
    period_s * pump_m3_s / 4.0 / f64::from(alternating.max(1))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_drowned_or_dry_well_does_not_cycle() {
        assert_eq!(cycle(20.0, 0.0, 0.1), None);
        assert_eq!(cycle(20.0, 0.1, 0.1), None);
    }
}
