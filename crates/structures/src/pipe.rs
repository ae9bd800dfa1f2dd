//! A full pipe: the head that a flow costs, and the flow that a head gives.

use crate::bisect::crossing;
use crate::error::{not_negative, positive};
use crate::{Friction, GRAVITY_M_S2, StructureError};

/// A round pipe that runs full.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Pipe {
    diameter_m: f64,
    length_m: f64,
    friction: Friction,
    loss_k: f64,
}

/// No pipe passes water faster than this; it only bounds the search.
const SPEED_M_S_MAX: f64 = 100.0;

impl Pipe {
    /// Diameter and length in m; `loss_k` is the sum of the other losses (entry, bends, exit) as a
    /// factor on V2/2g.
    pub fn new(
        diameter_m: f64,
        length_m: f64,
        friction: Friction,
        loss_k: f64,
    ) -> Result<Self, StructureError> {
        positive("pipe diameter_m", diameter_m)?;
        not_negative("pipe length_m", length_m)?;
        not_negative("pipe loss_k", loss_k)?;
        match friction {
            Friction::Darcy(f) => positive("Darcy friction factor", f)?,
            Friction::Roughness { height_m, viscosity_m2_s } => {
                not_negative("roughness height_m", height_m)?;
                positive("viscosity_m2_s", viscosity_m2_s)?
            }
        };
        Ok(Self { diameter_m, length_m, friction, loss_k })
    }
    pub fn area_m2(&self) -> f64 {
        core::f64::consts::FRAC_PI_4 * self.diameter_m * self.diameter_m
    }
    /// Total loss as a factor on V2/2g at this speed.
    pub fn loss_factor(&self, speed_m_s: f64) -> f64 {
        let f = self.friction.factor(speed_m_s, self.diameter_m);
        f * self.length_m / self.diameter_m + self.loss_k
    }
    /// Head lost to a flow, m, with the flow's sign.
    ///
    /// **Source**: H. Darcy (1857), J. Weisbach (1845): h = (f L/D + K) V2/2g.
    pub fn head_loss_m(&self, flow_m3_s: f64) -> f64 {
        let v = flow_m3_s / self.area_m2();
        self.loss_factor(v) * v * v.abs() / (2.0 * GRAVITY_M_S2)
    }
    /// The flow that a head drives through the pipe, m3/s, with the head's sign; `extra_k` is one
    /// more loss in series (a throttled penstock), zero or more, infinite when shut.
    pub fn flow_m3_s(&self, head_m: f64, extra_k: f64) -> f64 {
        if head_m == 0.0 || !extra_k.is_finite() {
            return 0.0;
        }
        let speed_m_s = match self.friction {
            Friction::Darcy(_) => {
                (2.0 * GRAVITY_M_S2 * head_m.abs() / (self.loss_factor(1.0) + extra_k)).sqrt()
            }
            Friction::Roughness { .. } => crossing(0.0, SPEED_M_S_MAX, |v| {
                (self.loss_factor(v) + extra_k) * v * v / (2.0 * GRAVITY_M_S2) - head_m.abs()
            }),
        };
        (speed_m_s * self.area_m2()).copysign(head_m)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn impossible_pipes_are_refused_by_name() {
        let of = |d, f| Pipe::new(d, 10.0, f, 0.0);
        let bad = of(0.0, Friction::Darcy(0.02));
        assert!(matches!(bad, Err(StructureError::BadFigure { what: "pipe diameter_m", .. })));
        assert!(of(1.0, Friction::Darcy(f64::NAN)).is_err());
        let dry = Friction::Roughness { height_m: 0.001, viscosity_m2_s: 0.0 };
        assert!(of(1.0, dry).is_err());
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        #[test]
        fn prop_flow_and_head_are_inverses(
            head_m in -8.0f64..8.0, d in 0.2f64..2.5, l in 10.0f64..2_000.0, rough in any::<bool>(),
        ) {
            let friction = if rough {
                Friction::Roughness { height_m: 0.0015, viscosity_m2_s: 1.14e-6 }
            } else {
                Friction::Darcy(0.018)
            };
            prop_assume!(head_m.abs() > 1e-3);
            let pipe = Pipe::new(d, l, friction, 2.0).unwrap();
            let back = pipe.head_loss_m(pipe.flow_m3_s(head_m, 0.0));
            prop_assert!((back - head_m).abs() < 1e-9 * head_m.abs().max(1.0));
        }
    }
}
