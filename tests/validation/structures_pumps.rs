//! Pumps and wet wells against tables computed from the published equations
//! (`tests/data/hydraulics-2026`).

use structures::{
    Efficiency, Friction, Pipe, PumpCurve, cycle, duty, shaft_power_kw, specific_energy_kwh_m3,
    static_head_m, volume_least_m3,
};

use super::structures_table::{PRINTED, Table, relative_error};

/// Source: pump curve H = N2 14 - 90 Q2 against a rising main with Colebrook-White, through
/// `st_pump_vs_tide.csv`.
/// Where in it: all rows: speeds 1.0, 0.9, 0.8, tides -1 to 5 m.
/// Quantity and unit: static head, m; flow, m3/s; head, m; efficiency; shaft power, kW; kWh/m3.
/// Tolerance: the table's nine figures (1e-8 relative).
#[test]
fn val_pump_against_tide() {
    let curve = PumpCurve::new(14.0, 90.0).expect("a falling curve");
    let rough = Friction::Roughness { height_m: 0.6e-3, viscosity_m2_s: 1.14e-6 };
    let main = Pipe::new(0.4, 60.0, rough, 3.5).expect("a possible pipe");
    let efficiency = Efficiency { best: 0.78, best_flow_m3_s: 0.22 };
    let worst = Table::read("st_pump_vs_tide.csv").worst(21, |r| {
        let lift = static_head_m(-2.0, r[1], 1.0);
        assert_eq!(lift, r[2]);
        let at = duty(&curve, 1, r[0], lift, &main).expect("the pump lifts it");
        let eta = efficiency.at(at.flow_m3_s, r[0]);
        let power = shaft_power_kw(1000.0, at.flow_m3_s, at.head_m, eta);
        let energy = specific_energy_kwh_m3(power, at.flow_m3_s);
        let ours = [at.flow_m3_s, at.head_m, eta, power, energy];
        ours.iter().zip(&r[3..]).map(|(a, b)| relative_error(*a, *b)).fold(0.0, f64::max)
    });
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: affinity laws (common practice), through `st_affinity.csv`.
/// Where in it: all rows; Q and H. The program states no power law of its own.
/// Quantity and unit: head at the similar flow, m.
/// Tolerance: 1e-12 relative: the table's heads are exact decimals.
#[test]
fn val_affinity() {
    // Any curve through (0.25, 10) must carry that point along the similarity parabola.
    let curve = PumpCurve::through([(0.1, 13.0), (0.25, 10.0), (0.3, 8.0)]).expect("it falls");
    let worst =
        Table::read("st_affinity.csv").worst(5, |r| relative_error(curve.head_m(r[1], r[0]), r[2]));
    assert!(worst <= 1e-12, "worst {worst:e}");
}

/// Source: definition of hydraulic power, through `st_pump_power.csv`.
/// Where in it: all rows, fresh and sea water.
/// Quantity and unit: shaft power, kW.
/// Tolerance: the table's nine figures (1e-8 relative).
#[test]
fn val_pump_power() {
    let worst = Table::read("st_pump_power.csv").worst(4, |r| {
        let fresh = relative_error(shaft_power_kw(1000.0, r[0], r[1], r[2]), r[3]);
        fresh.max(relative_error(shaft_power_kw(1025.0, r[0], r[1], r[2]), r[4]))
    });
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: continuity of a wet well (common practice), through `st_wet_well_cycle.csv`.
/// Where in it: all rows, inflow 5 to 95 % of the pump.
/// Quantity and unit: fill, pump and cycle time, s; starts an hour.
/// Tolerance: the table's nine figures (1e-8 relative).
#[test]
fn val_wet_well_cycle() {
    let worst = Table::read("st_wet_well_cycle.csv").worst(9, |r| {
        let c = cycle(22.5, r[0] * 0.1, 0.1).expect("it cycles");
        let ours = [c.fill_s, c.pump_s, c.total_s(), c.starts_per_hour()];
        ours.iter().zip(&r[1..]).map(|(a, b)| relative_error(*a, *b)).fold(0.0, f64::max)
    });
    assert!(worst <= PRINTED, "worst {worst:e}");
}

/// Source: least volume of a wet well (common practice), through `st_wet_well_volume.csv`.
/// Where in it: all rows, one pump and two that alternate.
/// Quantity and unit: volume, m3.
/// Tolerance: 1e-12 relative: the table's figures are exact decimals.
#[test]
fn val_wet_well_volume() {
    let worst = Table::read("st_wet_well_volume.csv").worst(7, |r| {
        let one = relative_error(volume_least_m3(r[0], r[2], 1), r[3]);
        one.max(relative_error(volume_least_m3(r[0], r[2], 2), r[4]))
    });
    assert!(worst <= 1e-12, "worst {worst:e}");
}
