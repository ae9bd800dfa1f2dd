//! Orifices, weirs, friction and the pipe outfall against tables computed from the published
//! equations (`tests/data/hydraulics-2026`). All tables have nine significant figures.

use structures::{
    Friction, Outfall, Pipe, broad_crested_m3_s, colebrook_white, drowned_share, free_orifice_m3_s,
    submerged_orifice_discharge, submerged_orifice_m3_s, swamee_jain,
};

use super::structures_table::{PRINTED, Table, relative_error};

/// Source: USBR, Water Measurement Manual, 3rd ed. 1997, ch. 9, through `st_free_orifice.csv`.
/// Where in it: all rows.
/// Quantity and unit: flow, m3/s.
/// Tolerance: the table's nine figures (1e-8 relative); areas are printed to nine figures too.
#[test]
fn val_usbr_free_orifice() {
    let worst = Table::read("st_free_orifice.csv")
        .worst(4, |r| relative_error(free_orifice_m3_s(r[0], r[1], r[2]), r[3]));
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: USBR, Water Measurement Manual, 3rd ed. 1997, ch. 9, through `st_submerged_orifice.csv`.
/// Where in it: all rows; the coefficient and the flow.
/// Quantity and unit: discharge coefficient, no unit; flow, m3/s.
/// Tolerance: the table's nine figures (1e-8 relative).
#[test]
fn val_usbr_submerged_orifice() {
    let worst = Table::read("st_submerged_orifice.csv").worst(6, |r| {
        let cd = submerged_orifice_discharge(r[2]);
        let flow = submerged_orifice_m3_s(r[0] * r[1], r[3], cd);
        relative_error(cd, r[4]).max(relative_error(flow, r[5]))
    });
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: Bos (ed.), Discharge Measurement Structures, ILRI 20, 1989, through
/// `st_broad_crested_free.csv`.
/// Where in it: all rows.
/// Quantity and unit: flow over the crest, m3/s.
/// Tolerance: the table's nine figures (1e-8 relative).
#[test]
fn val_bos_broad_crested() {
    let worst = Table::read("st_broad_crested_free.csv")
        .worst(4, |r| relative_error(broad_crested_m3_s(r[0], r[1], r[2]), r[3]));
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: Villemonte, Engineering News-Record 139, 1947, through `st_villemonte.csv`.
/// Where in it: all rows, exponents 1.5, 2.5, 1.44 and 1.42.
/// Quantity and unit: share of the free flow, no unit.
/// Tolerance: the table's nine figures, as 1e-9 absolute because the share is 1 at most.
#[test]
fn val_villemonte_drowned_share() {
    let worst = Table::read("st_villemonte.csv").worst(12, |r| {
        let off = |n, column: usize| (drowned_share(r[0], n) - r[column]).abs();
        off(1.5, 1).max(off(2.5, 2)).max(off(1.44, 3)).max(off(1.42, 4))
    });
    assert!(worst <= 1e-9, "worst {worst:e}");
}

/// Source: Colebrook 1939; Swamee and Jain 1976, through `st_friction_factor.csv`.
/// Where in it: all rows, Re 5e3 to 1e7, k/D 0 to 1e-2.
/// Quantity and unit: Darcy friction factor, no unit.
/// Tolerance: the table's nine figures (1e-8 relative).
#[test]
fn val_colebrook_and_swamee_jain() {
    let worst = Table::read("st_friction_factor.csv").worst(36, |r| {
        let white = relative_error(colebrook_white(r[0], r[1]), r[2]);
        white.max(relative_error(swamee_jain(r[0], r[1]), r[3]))
    });
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: Darcy-Weisbach with Colebrook-White and the density head, through
/// `st_gravity_outfall.csv`.
/// Where in it: all rows: chamber 3.0 and 4.5 m, tide -2 to 3 m, one of them without flow.
/// Quantity and unit: net head, m; flow, m3/s; Darcy factor at that flow.
/// Tolerance: the table's nine figures for head (1e-9 m) and flow (1e-8 relative); the density
/// 1025/1000 - 1 is not exact in binary, which is far below that.
#[test]
fn val_outfall_against_tide() {
    let rough = Friction::Roughness { height_m: 1.5e-3, viscosity_m2_s: 1.14e-6 };
    let pipe = Pipe::new(0.9, 800.0, rough, 2.1).expect("a possible pipe");
    let outfall = Outfall::new(pipe, -8.0, 1025.0 / 1000.0 - 1.0).expect("a possible outfall");
    let worst = Table::read("st_gravity_outfall.csv").worst(12, |r| {
        assert!((outfall.net_head_m(r[0], r[1]) - r[3]).abs() < 1e-9);
        let flow = outfall.flow_m3_s(r[0], r[1], 1.0);
        if r[4] == 0.0 {
            assert_eq!(flow, 0.0, "no flow against the tide");
            return 0.0;
        }
        let factor = rough.factor(flow / pipe.area_m2(), 0.9);
        relative_error(flow, r[4]).max(relative_error(factor, r[6]))
    });
    assert!(worst <= PRINTED, "worst {worst:e}");
}
