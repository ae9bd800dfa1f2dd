//! A pump: head from flow and speed, efficiency, power.

use crate::error::{finite, not_negative, positive};
use crate::{GRAVITY_M_S2, StructureError};

/// Head against flow at full speed, H = a + b Q + c Q2 with a falling head; at another speed by
/// the affinity laws.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct PumpCurve {
    a_m: f64,
    b: f64,
    c: f64,
}

impl PumpCurve {
    /// H = `shut_off_m` - `fall` Q2.
    pub fn new(shut_off_m: f64, fall: f64) -> Result<Self, StructureError> {
        positive("pump shut-off head_m", shut_off_m)?;
        not_negative("pump curve fall", fall)?;
        Ok(Self { a_m: shut_off_m, b: 0.0, c: -fall })
    }
    /// The parabola through three (flow m3/s, head m) points with rising flow and falling head.
    ///
    /// **Source**: J. L. Lagrange's interpolation, in Newton's divided differences.
    pub fn through(points: [(f64, f64); 3]) -> Result<Self, StructureError> {
        for (q, h) in points {
            not_negative("pump curve flow", q)?;
            finite("pump curve head", h)?;
        }
        let [(q0, h0), (q1, h1), (q2, h2)] = points;
        positive("rise of flow between pump curve points", (q1 - q0).min(q2 - q1))?;
        positive("fall of head between pump curve points", (h0 - h1).min(h1 - h2))?;
        let d01 = (h1 - h0) / (q1 - q0);
        let d12 = (h2 - h1) / (q2 - q1);
        let c = (d12 - d01) / (q2 - q0);
        let b = d01 - c * (q0 + q1);
        Ok(Self { a_m: h0 - (b + c * q0) * q0, b, c })
    }
    /// Head at a flow, m, at `speed_share` of full speed.
    ///
    /// **Source**: affinity laws, Q in proportion to N, H to N2 (common practice).
    pub fn head_m(&self, flow_m3_s: f64, speed_share: f64) -> f64 {
        let n = speed_share;
        n * n * self.a_m + (n * self.b + self.c * flow_m3_s) * flow_m3_s
    }
}

/// Efficiency as a parabola about its best point, by the affinity laws at other speeds.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Efficiency {
    pub best: f64,
    pub best_flow_m3_s: f64,
}

impl Efficiency {
    /// best (1 - ((Q/N - Q0)/Q0)2); zero or below means that the point is outside the pump's range.
    pub fn at(&self, flow_m3_s: f64, speed_share: f64) -> f64 {
        let off = (flow_m3_s / speed_share - self.best_flow_m3_s) / self.best_flow_m3_s;
        self.best * (1.0 - off * off)
    }
}

/// Power at the shaft, kW: rho g Q H / efficiency. For electricity divide by the efficiency of
/// motor and drive too.
///
/// **Source**: definition of hydraulic power.
pub fn shaft_power_kw(density_kg_m3: f64, flow_m3_s: f64, head_m: f64, efficiency: f64) -> f64 {
    density_kg_m3 * GRAVITY_M_S2 * flow_m3_s * head_m / efficiency / 1_000.0
}

/// Energy for each cubic metre, kWh/m3, from power and flow.
pub fn specific_energy_kwh_m3(power_kw: f64, flow_m3_s: f64) -> f64 {
    power_kw / (flow_m3_s * 3_600.0)
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn three_points_are_met_exactly() {
        let points = [(0.0, 14.0), (0.2, 10.4), (0.35, 2.975)];
        let c = PumpCurve::through(points).unwrap();
        for (q, h) in points {
            assert!((c.head_m(q, 1.0) - h).abs() < 1e-12);
        }
        assert!(PumpCurve::through([(0.0, 14.0), (0.2, 15.0), (0.3, 2.0)]).is_err());
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        #[test]
        fn prop_affinity(q in 0.0f64..0.35, n in 0.5f64..1.1) {
            let c = PumpCurve::through([(0.0, 14.0), (0.2, 10.4), (0.35, 2.975)]).unwrap();
            prop_assert!((c.head_m(n * q, n) - n * n * c.head_m(q, 1.0)).abs() < 1e-10);
        }
    }
}
