//! Pipe friction: the Darcy factor from roughness and Reynolds number.

/// Below this Reynolds number the flow is taken as laminar.
const REYNOLDS_LAMINAR: f64 = 2_000.0;

/// How a pipe's friction factor is known.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Friction {
    /// A fixed Darcy factor, as a permit or a survey states it.
    Darcy(f64),
    /// Wall roughness and kinematic viscosity: Colebrook-White at each speed.
    Roughness { height_m: f64, viscosity_m2_s: f64 },
}

impl Friction {
    /// The Darcy factor at a speed (m/s, sign ignored) in a pipe of this diameter.
    pub fn factor(&self, speed_m_s: f64, diameter_m: f64) -> f64 {
        match *self {
            Self::Darcy(f) => f,
            Self::Roughness { height_m, viscosity_m2_s } => {
                let reynolds = speed_m_s.abs() * diameter_m / viscosity_m2_s;
                // At rest the factor is infinite but the loss is zero; 1 keeps it finite.
                colebrook_white(reynolds.max(1.0), height_m / diameter_m)
            }
        }
    }
}

/// Darcy friction factor.
///
/// `reynolds` V D / nu and `relative_roughness` k / D, both without unit. Under a Reynolds number
/// of 2,000 it is the laminar 64/Re; from there on the turbulent law is used straight away, though
/// between 2,000 and 4,000 nature may do either.
///
/// **Source**: C. F. Colebrook (1939), "Turbulent flow in pipes", J. Inst. Civ. Eng. 11, 133-156:
/// 1/sqrt f = -2 log10(k/(3.7 D) + 2.51/(Re sqrt f)); laminar part: Hagen-Poiseuille.
pub fn colebrook_white(reynolds: f64, relative_roughness: f64) -> f64 {
    if reynolds < REYNOLDS_LAMINAR {
        return 64.0 / reynolds;
    }
    // Fixed point on x = 1/sqrt f: a contraction here, under 20 rounds to the last bit or two.
    let mut x = 8.0;
    for _ in 0..100 {
        let next = -2.0 * libm::log10(relative_roughness / 3.7 + 2.51 * x / reynolds);
        let step: f64 = next - x;
        x = next;
        if step.abs() < 1e-14 {
            break;
        }
    }
    1.0 / (x * x)
}

/// Darcy friction factor without iteration, within 3 % of Colebrook-White for Reynolds numbers of
/// 5e3 to 1e8 and relative roughness of 1e-6 to 1e-2; outside that nothing is claimed.
///
/// **Source**: P. K. Swamee, A. K. Jain (1976), "Explicit equations for pipe-flow problems",
/// J. Hydraul. Div. ASCE 102(5), 657-664: f = 0.25 / log10(k/(3.7 D) + 5.74/Re^0.9)^2.
pub fn swamee_jain(reynolds: f64, relative_roughness: f64) -> f64 {
    let l = libm::log10(relative_roughness / 3.7 + 5.74 / libm::pow(reynolds, 0.9));
    0.25 / (l * l)
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn laminar_and_rest_are_finite() {
        assert_eq!(colebrook_white(1_000.0, 0.01), 0.064);
        let f = Friction::Roughness { height_m: 0.001, viscosity_m2_s: 1.14e-6 };
        assert!(f.factor(0.0, 1.0).is_finite());
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        /// Swamee and Jain's own claim: within 3 % over their range.
        #[test]
        fn prop_swamee_jain_keeps_its_claim(log_re in 3.7f64..8.0, log_k in -6.0f64..-2.0) {
            let (re, k) = (libm::pow(10.0, log_re), libm::pow(10.0, log_k));
            let ratio = swamee_jain(re, k) / colebrook_white(re, k);
            prop_assert!((ratio - 1.0).abs() < 0.03);
        }
        #[test]
        fn prop_the_fixed_point_satisfies_colebrook(log_re in 3.4f64..8.0, log_k in -6.0f64..-1.3) {
            let (re, k) = (libm::pow(10.0, log_re), libm::pow(10.0, log_k));
            let root = colebrook_white(re, k).sqrt();
            let right = -2.0 * libm::log10(k / 3.7 + 2.51 / (re * root));
            prop_assert!((1.0 / root - right).abs() < 1e-11);
        }
    }
}
