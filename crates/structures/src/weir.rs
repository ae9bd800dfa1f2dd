//! Broad-crested weir, free: the passive spill of a storage.

use crate::GRAVITY_M_S2;

/// Flow over a broad-crested weir of a rectangular section, m3/s.
///
/// `crest_m` its width across the flow, `head_m` the energy head above the crest (zero or below
/// gives no flow; a storage has no approach speed, so its level above the crest serves),
/// `discharge` about 0.85 to 1.0. Valid while the tail water is below the modular limit (about two
/// thirds of the head or more, by the shape of the back face); for a drowned weir see
/// [`crate::drowned_share`].
///
/// **Source**: M. G. Bos (ed., 1989), "Discharge Measurement Structures", ILRI publication 20:
/// Q = Cd (2/3) sqrt(2g/3) b H^1.5.
pub fn broad_crested_m3_s(crest_m: f64, head_m: f64, discharge: f64) -> f64 {
    let h = head_m.max(0.0);
    discharge * (2.0 / 3.0) * (2.0 * GRAVITY_M_S2 / 3.0).sqrt() * crest_m * h * h.sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn below_the_crest_nothing_spills() {
        assert_eq!(broad_crested_m3_s(6.0, -0.2, 0.95), 0.0);
    }
}
