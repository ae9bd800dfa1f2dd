//! A pipe outfall whose ports lie under the tide, with a penstock at its head.

use crate::error::{finite, not_negative};
use crate::{GRAVITY_M_S2, Pipe, StructureError, opening_for_loss, penstock_loss};

/// A pipe from a chamber, through a penstock, to ports at a depth under water that may be salt.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Outfall {
    pipe: Pipe,
    port_centre_m: f64,
    density_excess: f64,
}

impl Outfall {
    /// `port_centre_m` on the same datum as the levels; `density_excess` is
    /// rho_outside / rho_inside - 1, zero or more.
    pub fn new(
        pipe: Pipe,
        port_centre_m: f64,
        density_excess: f64,
    ) -> Result<Self, StructureError> {
        finite("port_centre_m", port_centre_m)?;
        not_negative("density_excess", density_excess)?;
        Ok(Self { pipe, port_centre_m, density_excess })
    }
    pub const fn pipe(&self) -> &Pipe {
        &self.pipe
    }
    /// Driving head, in metres of the water inside.
    ///
    /// inner - outer - (rho_outside/rho_inside - 1)(outer - ports). Water outside below the ports
    /// no longer matters: they then pour freely at their own level.
    ///
    /// **Source**: hydrostatics of two fluids balanced at the ports (common practice for sea
    /// outfalls; 10 m of sea water over the ports costs 0.25 m).
    pub fn net_head_m(&self, inner_m: f64, outer_m: f64) -> f64 {
        let outside_m = outer_m.max(self.port_centre_m);
        inner_m - outside_m - self.density_excess * (outside_m - self.port_centre_m)
    }
    /// Flow out, m3/s, with a non-return in the way: zero while the net head is not positive.
    ///
    /// Levels in m on one datum; `opening_share` of the penstock 0 to 1, by area (outside it is
    /// taken as the nearer end).
    pub fn flow_m3_s(&self, inner_m: f64, outer_m: f64, opening_share: f64) -> f64 {
        self.flow_both_ways_m3_s(inner_m, outer_m, opening_share).max(0.0)
    }
    /// Flow out, m3/s, without a non-return: negative is water coming in.
    ///
    /// The head of the water coming in is taken by the same density balance, which overstates it
    /// a little once the pipe has filled with salt water.
    pub fn flow_both_ways_m3_s(&self, inner_m: f64, outer_m: f64, opening_share: f64) -> f64 {
        self.pipe.flow_m3_s(self.net_head_m(inner_m, outer_m), penstock_loss(opening_share))
    }
    /// Flow out with assist pumps that push from the storage into the chamber above the penstock:
    /// the greater of gravity's flow and the pumps' own, while the penstock is open at all.
    ///
    /// The gravity way from storage to chamber has a non-return. Either the chamber stands below
    /// the storage and the pipe takes what gravity gives (the pumps only churn water round), or the
    /// pumps raise the chamber until the pipe passes exactly what they deliver and the non-return
    /// is shut; the two never add. The pumps' delivery is taken as fixed, so a nearly shut penstock
    /// would need more head than a pump has: valid for openings of about a fifth and up.
    pub fn flow_with_pumps_m3_s(
        &self,
        inner_m: f64,
        outer_m: f64,
        opening_share: f64,
        pumps_m3_s: f64,
    ) -> f64 {
        if opening_share <= 0.0 {
            return 0.0;
        }
        self.flow_m3_s(inner_m, outer_m, opening_share).max(pumps_m3_s)
    }
    /// The penstock opening (share of area) that passes `flow_m3_s` by gravity; zero for no flow;
    /// `None` where even a fully open penstock passes less.
    pub fn opening_for_flow(&self, inner_m: f64, outer_m: f64, flow_m3_s: f64) -> Option<f64> {
        if flow_m3_s <= 0.0 {
            return Some(0.0);
        }
        let v = flow_m3_s / self.pipe.area_m2();
        let all_k = 2.0 * GRAVITY_M_S2 * self.net_head_m(inner_m, outer_m) / (v * v);
        let left_k = all_k - self.pipe.loss_factor(v);
        (left_k >= 0.0).then(|| opening_for_loss(left_k))
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::Friction;

    fn tarrow() -> Outfall {
        let pipe = Pipe::new(1.20, 380.0, Friction::Darcy(0.018), 3.5).unwrap();
        Outfall::new(pipe, -3.60, 0.02).unwrap()
    }

    /// The scenario's own sums for the invented works: 1.20 m3/s needs 0.53 m, 0.90 needs 0.30 m,
    /// each rounded to a centimetre there.
    #[test]
    fn the_sums_of_the_invented_works() {
        let head = |q| tarrow().pipe().head_loss_m(q);
        assert!((head(1.20) - 0.53).abs() < 0.005, "{}", head(1.20));
        assert!((head(0.90) - 0.30).abs() < 0.005, "{}", head(0.90));
        assert!((1.20 / tarrow().pipe().area_m2() - 1.06).abs() < 0.005);
        // Density: 0.02 x (tide + 3.6).
        assert!((tarrow().net_head_m(5.0, 1.4) - (3.6 - 0.1)).abs() < 1e-12);
    }

    #[test]
    fn pumps_and_gravity_do_not_add() {
        let o = tarrow();
        let gravity = o.flow_m3_s(6.0, 3.0, 1.0);
        assert!(gravity > 0.5);
        assert_eq!(o.flow_with_pumps_m3_s(6.0, 3.0, 1.0, 0.5), gravity);
        assert_eq!(o.flow_with_pumps_m3_s(4.0, 4.5, 1.0, 0.5), 0.5);
        assert_eq!(o.flow_with_pumps_m3_s(6.0, 3.0, 0.0, 0.5), 0.0);
    }

    #[test]
    fn ports_in_the_air_pour_at_their_own_level() {
        assert_eq!(tarrow().net_head_m(4.0, -5.0), tarrow().net_head_m(4.0, -3.6));
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        #[test]
        fn prop_the_non_return_never_passes_landward(
            inner in 3.4f64..6.7, outer in -5.0f64..8.0, a in -0.5f64..1.5,
        ) {
            prop_assert!(tarrow().flow_m3_s(inner, outer, a) >= 0.0);
        }
        #[test]
        fn prop_the_opening_found_passes_the_flow(
            inner in 3.4f64..6.7, outer in -5.0f64..6.0, flow in 0.01f64..3.0,
        ) {
            let o = tarrow();
            match o.opening_for_flow(inner, outer, flow) {
                Some(a) => prop_assert!((o.flow_m3_s(inner, outer, a) - flow).abs() < 1e-9),
                None => prop_assert!(o.flow_m3_s(inner, outer, 1.0) < flow),
            }
        }
        #[test]
        fn prop_more_head_or_opening_never_passes_less(
            inner in 3.4f64..6.7, outer in -5.0f64..8.0, a in 0.0f64..0.9, more in 0.0f64..0.1,
        ) {
            let o = tarrow();
            let q = o.flow_m3_s(inner, outer, a);
            prop_assert!(o.flow_m3_s(inner + more, outer, a) >= q);
            prop_assert!(o.flow_m3_s(inner, outer, a + more) >= q);
        }
    }
}
