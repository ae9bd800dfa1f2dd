//! Names of tidal constituents: what `tide` can reckon decides.

/// The 37 of the NOAA sets, to offer for a slip of the finger.
const USUAL: [&str; 37] = [
    "M2", "S2", "N2", "K1", "M4", "O1", "M6", "MK3", "S4", "MN4", "NU2", "S6", "MU2", "2N2", "OO1",
    "LAM2", "S1", "M1", "J1", "MM", "SSA", "SA", "MSF", "MF", "RHO", "Q1", "T2", "R2", "2Q1", "P1",
    "2SM2", "M3", "L2", "2MK3", "K2", "M8", "MS4",
];

pub(crate) fn usual() -> impl Iterator<Item = &'static str> {
    USUAL.into_iter()
}

/// Whether this is a name, or another list's name, of a constituent that can be reckoned.
pub(crate) fn is_known(name: &str) -> bool {
    tide::speed_deg_h(name).is_some()
}

/// Whether two known names stand for one constituent.
pub(crate) fn same(a: &str, b: &str) -> bool {
    let both = [(a, 1.0, 0.0), (b, 1.0, 0.0)];
    let made = tide::Constants::new(0.0, tide::Nodal::Continuous, &both);
    matches!(made, Err(tide::TideError::Twice(_)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_name_that_is_offered_is_known_and_aliases_are_the_same() {
        for name in usual() {
            assert!(is_known(name), "{name}");
        }
        assert!(same("RHO", "RHO1") && same("LAM2", "LAMBDA2") && same("m2", "M2"));
        assert!(!same("M2", "N2") && !is_known("MV2"));
    }
}
