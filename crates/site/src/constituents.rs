//! Names of tidal constituents, and the names that other lists use for the same ones.

/// The 37 of the NOAA sets.
const NAMES: [&str; 37] = [
    "M2", "S2", "N2", "K1", "M4", "O1", "M6", "MK3", "S4", "MN4", "NU2", "S6", "MU2", "2N2", "OO1",
    "LAM2", "S1", "M1", "J1", "MM", "SSA", "SA", "MSF", "MF", "RHO", "Q1", "T2", "R2", "2Q1", "P1",
    "2SM2", "M3", "L2", "2MK3", "K2", "M8", "MS4",
];

pub(crate) fn canonical(said: &str) -> Option<&'static str> {
    NAMES.into_iter().find(|n| n.eq_ignore_ascii_case(said))
}

pub(crate) fn names() -> impl Iterator<Item = &'static str> {
    NAMES.into_iter()
}
