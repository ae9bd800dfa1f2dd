//! A permit like Tarrow's, on a made-up semi-diurnal tide, for this crate's tests.

use model::*;
use units::*;

pub fn t(hours: f64) -> Utc {
    Utc::from_civil(2027, 3, 1, 0, 0, 0).unwrap() + Span::from_seconds_f64(hours * 3600.0)
}

pub fn window(from_h: f64, to_h: f64) -> Window {
    Window::new(t(from_h), t(to_h)).unwrap()
}

pub const GATE: AssetId = AssetId(0);
pub const PUMP: AssetId = AssetId(1);
pub const SAMPLER: SignalId = SignalId(1);
pub const METER: SignalId = SignalId(2);
const HALF_DAY_H: f64 = 12.42;

pub fn clause(id: u16, number: &str, kind: ClauseKind) -> Clause {
    Clause {
        id: ClauseId(id),
        number: number.to_owned(),
        words: String::new(),
        kind,
        governs: vec![Governed { asset: GATE, on_stale: OnStale::Hold }],
    }
}

pub fn bands() -> ClauseKind {
    let band = |range: f64, volume: f64, flow: Option<f64>| RangeBand {
        range_min: Metres::of(range),
        volume_max: CubicMetres::of(volume),
        flow_max: flow.map(CubicMetresPerSecond::of),
    };
    ClauseKind::VolumePerTide {
        rounding: Rounding { step: Metres::of(0.1) },
        bands: vec![band(0.0, 0.0, None), band(2.2, 4800.0, Some(0.9)), band(4.0, 9000.0, None)],
    }
}

pub fn permit() -> Vec<Clause> {
    let flow = CubicMetresPerSecond::of;
    vec![
        clause(
            0,
            "2.2",
            ClauseKind::TideWindow {
                place: PlaceId(0),
                anchor: TideAnchor::HighWater,
                from: Span::minutes(30),
                to: Span::minutes(210),
            },
        ),
        clause(
            1,
            "2.3",
            ClauseKind::CurrentSeaward {
                place: PlaceId(0),
                speed_min: MetresPerSecond::of(0.1),
                meter: None,
            },
        ),
        clause(
            2,
            "2.4",
            ClauseKind::Rate {
                flow_max: flow(1.2),
                averaging: Span::minutes(15),
                ramp_max_per_min: Some(flow(0.1)),
            },
        ),
        clause(3, "2.5", bands()),
        clause(
            4,
            "2.6",
            ClauseKind::RollingVolume {
                span: Span::hours(24),
                volume_max: CubicMetres::of(16_500.0),
            },
        ),
        clause(5, "2.7", ClauseKind::MonthVolume { volume_max: CubicMetres::of(380_000.0) }),
        clause(
            6,
            "2.10",
            ClauseKind::SignalGate {
                conditions: vec![SignalCondition {
                    signal: SignalId(0),
                    limit: 5.0,
                    sense: Sense::AtMost,
                    age_max: Span::minutes(30),
                }],
                applies: Applies::Throughout,
            },
        ),
    ]
}

/// The whole of the permit: with a sampler that must be ready to begin, a current meter, and a pump
/// that only the current and the ammonia concern.
pub fn tarrow() -> Site {
    let mut clauses = permit();
    if let ClauseKind::CurrentSeaward { meter, .. } = &mut clauses[1].kind {
        *meter = Some(METER);
    }
    clauses.push(clause(
        7,
        "2.1",
        ClauseKind::SignalGate {
            conditions: vec![SignalCondition {
                signal: SAMPLER,
                limit: 1.0,
                sense: Sense::AtLeast,
                age_max: Span::minutes(10),
            }],
            applies: Applies::ToStart,
        },
    ));
    for n in [1, 6] {
        clauses[n].governs.push(Governed { asset: PUMP, on_stale: OnStale::Hold });
    }
    site(clauses)
}

pub fn site(clauses: Vec<Clause>) -> Site {
    let day = window(-24.0 * 400.0, 24.0 * 400.0);
    Site {
        name: "test".to_owned(),
        title: String::new(),
        datum: "HD".to_owned(),
        zone: ZoneRules::utc(),
        port: Port {
            name: String::new(),
            mean_level: Level::ZERO,
            nodal: NodalRule::MidYear,
            constants: Vec::new(),
            valid: day,
            gauge: None,
        },
        places: Vec::new(),
        storages: Vec::new(),
        outlets: Vec::new(),
        assets: Vec::new(),
        signals: Vec::new(),
        adapters: Vec::new(),
        licence: Licence { reference: String::new(), title: String::new(), clauses },
        settings: Settings {
            horizon: Span::hours(72),
            flow_aim: 0.95,
            ramp_aim: 0.8,
            clock_margin: Span::seconds(30),
            band_sigmas: 1.6,
            energy_price_per_kwh: 0.25,
            journal_grace: Span::seconds(30),
            outage_max: Span::minutes(15),
            opening_step_min: Percent::of(1.0),
            heartbeat_file: None,
        },
        keeping: model::Keeping::default(),
        simulation: None,
        site_digest: String::new(),
        licence_digest: String::new(),
    }
}

/// High water of tide k at k x 12.42 h + 3 h; current seaward from 40 min after to 5 h 40 after.
pub fn forecast(ranges: &[f64]) -> Forecast {
    let high = |k: usize| k as f64 * HALF_DAY_H + 3.0;
    let span = window(-4.0, ranges.len() as f64 * HALF_DAY_H + 1.0);
    let turn = |k: usize| Turn {
        number: k as i64,
        kind: TurnKind::High,
        at: t(high(k)),
        level: Level::of(3.0),
        time_sd: Span::minutes(6),
        level_sd: Metres::of(0.1),
    };
    let low = |k: usize| Turn {
        kind: TurnKind::Low,
        at: t(high(k) + 6.21),
        level: Level::of(-3.0),
        ..turn(k)
    };
    let turns: Vec<Turn> = (0..ranges.len()).flat_map(|k| [turn(k), low(k)]).collect();
    let tide = |(k, range): (usize, &f64)| Tide {
        number: k as i64,
        window: window(high(k) - 6.21, high(k) + 6.21),
        high: turn(k),
        ebb_range: Metres::of(*range),
    };
    let level = Series::sampled(&span, Span::minutes(5), |_| 0.0).unwrap();
    let current = Series::sampled(&span, Span::minutes(5), |at| {
        let h = (at - t(3.0)).as_hours().rem_euclid(HALF_DAY_H);
        if h > 0.6 && h < 5.7 { 1.0 } else { -1.0 }
    });
    let current_turns = (0..ranges.len()).map(|k| CurrentTurn {
        number: k as i64,
        to_seaward: true,
        at: t(high(k) + 0.6),
        time_sd: Span::minutes(5),
    });
    Forecast {
        as_of: t(0.0),
        span,
        digest: 0,
        port_turns: turns.clone(),
        tides: ranges.iter().enumerate().map(tide).collect(),
        port_level: level.clone(),
        places: vec![PlaceForecast {
            place: PlaceId(0),
            method: Method::Differences,
            turns,
            level,
            current: Some(current.unwrap()),
            current_turns: current_turns.collect(),
        }],
    }
}
