//! A small invented works for examples and tests: Tarrow Works' figures and a plain cosine tide.

use structures::StorageCurve;
use units::{Mono, Series, Span, Utc, Window};

use crate::{
    Beginning, GateConfig, InflowProfile, OutfallFigures, PlantConfig, PumpConfig, RestDo,
    SpillWeir, Totals, Truth, Water,
};

/// The works on 1 March 2027, 06:30, with 40 days of a tide of 8 m range that is high at the start.
pub fn small_works(truth: Truth) -> PlantConfig {
    let start = Utc::from_civil(2027, 3, 1, 6, 30, 0).expect("a date of the calendar");
    let pump = PumpConfig { flow_m3_s: 0.25, power_kw: 22.0, rest: RestDo::Stop };
    PlantConfig {
        start,
        boot: Mono::from_nanos(1_000_000_000),
        beginning: Beginning { level_m: 5.0, gate_percent: 0.0, totals: Totals::default() },
        truth,
        storage: StorageCurve::new(&[(3.40, 0.0), (6.60, 22_400.0)]).expect("it rises"),
        spill: SpillWeir { crest_level_m: 6.60, crest_length_m: 6.0, discharge: 0.95 },
        outfall: OutfallFigures {
            diameter_m: 1.20,
            length_m: 380.0,
            friction_f: 0.018,
            loss_k: 3.5,
            port_centre_m: -3.60,
            density_excess: 0.02,
        },
        drain_down: Span::minutes(6),
        gate: GateConfig { stroke: Span::minutes(8), rest: RestDo::Close },
        pumps: vec![pump; 2],
        inflow: InflowProfile { mean_m3_s: 0.133, swing: 0.35, peak_hour_utc: 10.0, max_m3_s: 0.4 },
        water: cosine_tide(start),
        constants: vec![2.0, 40.0, 1.0],
        faults: Vec::new(),
        record_every: Span::minutes(1),
    }
}

/// Levels of 0.3 + 4 cos m with the lunar half-day, and a current that is seaward on the ebb.
fn cosine_tide(start: Utc) -> Water {
    let from = start - Span::minutes(20);
    let span = Window::new(from, start + Span::days(40)).expect("forty days");
    let phase = |t: Utc| (t - start).as_hours() / 12.420_601_2;
    let series = |f: &dyn Fn(f64) -> f64| {
        Series::sampled(&span, Span::minutes(5), |t| f(phase(t))).expect("a finite curve")
    };
    Water {
        outer: series(&|p| 0.3 + 4.0 * cosine_of_turn(p)),
        port: None,
        current: Some(series(&|p| -1.2 * cosine_of_turn(p + 0.25))),
    }
}

/// cos(2 pi turn) to 2e-3 from a parabola and its correction: enough for an invented tide, and
/// this crate needs no other transcendental.
fn cosine_of_turn(turn: f64) -> f64 {
    let x = (turn + 0.25 - (turn + 0.25).floor()) * 2.0 - 1.0;
    let y = -4.0 * x * (1.0 - x.abs());
    y * (0.775 + 0.225 * y.abs())
}
