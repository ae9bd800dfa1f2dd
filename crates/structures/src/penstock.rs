//! A penstock that throttles a pipe: the loss of a part-open gate.

use crate::bisect::crossing;

/// Loss of a gate open by `opening_share` of its area, as a factor on V2/2g of the full pipe.
///
/// `opening_share` a is 0 (shut: infinite loss) to 1 (no loss); outside it is taken as the nearer
/// end. The jet contracts to Cc a of the area and then expands suddenly to the whole pipe, which
/// costs (1/(Cc a) - 1)2, with Cc = 0.63 + 0.37 a3.
///
/// **Source**: J. Weisbach (1855), "Die Experimental-Hydraulik", contraction of a part-open
/// orifice in a pipe, and the Borda-Carnot loss of a sudden expansion (both from memory).
pub fn penstock_loss(opening_share: f64) -> f64 {
    let a = opening_share.clamp(0.0, 1.0);
    if a <= 0.0 {
        return f64::INFINITY;
    }
    let e = 1.0 / jet_share(a) - 1.0;
    e * e
}

/// The opening whose loss is `loss_k` (0 or more); the inverse of [`penstock_loss`].
pub fn opening_for_loss(loss_k: f64) -> f64 {
    if loss_k <= 0.0 {
        return 1.0;
    }
    if !loss_k.is_finite() {
        return 0.0;
    }
    let jet = 1.0 / (1.0 + loss_k.sqrt());
    crossing(0.0, 1.0, |a| jet_share(a) - jet)
}

/// Cc a: the share of the area that the contracted jet fills. Rises with a from 0 to 1.
fn jet_share(a: f64) -> f64 {
    (0.63 + 0.37 * a * a * a) * a
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn ends_are_free_and_shut() {
        assert_eq!(penstock_loss(1.0), 0.0);
        assert_eq!(penstock_loss(1.7), 0.0);
        assert_eq!(penstock_loss(0.0), f64::INFINITY);
        assert_eq!((opening_for_loss(0.0), opening_for_loss(f64::INFINITY)), (1.0, 0.0));
        // By hand: a = 0.5, Cc = 0.63 + 0.37/8 = 0.67625, 1/(0.338125) - 1 = 1.957486.
        assert!((penstock_loss(0.5) - 1.957486 * 1.957486).abs() < 1e-5);
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]
        #[test]
        fn prop_opening_and_loss_are_inverses(a in 0.001f64..0.999) {
            prop_assert!((opening_for_loss(penstock_loss(a)) - a).abs() < 1e-9);
        }
        #[test]
        fn prop_a_wider_gate_never_costs_more(a in 0.001f64..1.0, b in 0.001f64..1.0) {
            let (narrow, wide) = if a < b { (a, b) } else { (b, a) };
            prop_assert!(penstock_loss(narrow) >= penstock_loss(wide));
        }
    }
}
