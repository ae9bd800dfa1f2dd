//! Orifices: free into air, and drowned between two levels.

use crate::GRAVITY_M_S2;

/// Below this head difference the root law is replaced by a straight line through zero, so that a
/// solver does not meet an infinite slope.
const HEAD_LINEAR_M: f64 = 0.001;

/// Flow through an orifice that pours freely, m3/s.
///
/// `area_m2` of the opening, `head_m` above its centre (zero or below gives no flow), `discharge`
/// the coefficient (0.61 sharp-edged). Valid while the head is over about twice the opening's
/// height; a lower head is nearer a weir and the result is too high.
///
/// **Source**: E. Torricelli (1644) with a discharge coefficient; USBR, Water Measurement Manual
/// (3rd ed. 1997, rev. 2001), chapter 9: Q = Cd A sqrt(2 g h).
pub fn free_orifice_m3_s(area_m2: f64, head_m: f64, discharge: f64) -> f64 {
    discharge * area_m2 * (2.0 * GRAVITY_M_S2 * head_m.max(0.0)).sqrt()
}

/// Flow through a drowned orifice, m3/s, with the sign of `head_difference_m` (upstream less
/// downstream level). Under 1 mm it falls linearly to zero. Approach velocity is neglected.
///
/// **Source**: USBR, Water Measurement Manual, chapter 9: Q = Cd A sqrt(2 g dh).
pub fn submerged_orifice_m3_s(area_m2: f64, head_difference_m: f64, discharge: f64) -> f64 {
    let size = head_difference_m.abs();
    let root = if size >= HEAD_LINEAR_M {
        (2.0 * GRAVITY_M_S2 * size).sqrt()
    } else {
        (2.0 * GRAVITY_M_S2 * HEAD_LINEAR_M).sqrt() * (size / HEAD_LINEAR_M)
    };
    (discharge * area_m2 * root).copysign(head_difference_m)
}

/// Discharge coefficient of a drowned orifice with part of its contraction suppressed: the share
/// `suppressed_perimeter` (0 to 1) of its edge lies flush with floor or walls.
///
/// **Source**: USBR, Water Measurement Manual, chapter 9: Cd = 0.61 (1 + 0.15 r) (coefficient
/// from memory).
pub fn submerged_orifice_discharge(suppressed_perimeter: f64) -> f64 {
    0.61 * (1.0 + 0.15 * suppressed_perimeter.clamp(0.0, 1.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn flow_turns_with_the_head_and_meets_at_a_millimetre() {
        let q = |dh| submerged_orifice_m3_s(1.0, dh, 0.61);
        assert_eq!(q(0.3), -q(-0.3));
        assert_eq!(q(0.0), 0.0);
        assert!((q(0.001) - q(0.000_999_999)).abs() < 1e-6);
        assert_eq!(free_orifice_m3_s(1.0, -0.5, 0.61), 0.0);
    }
}
