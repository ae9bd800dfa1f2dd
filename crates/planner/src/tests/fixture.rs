//! Tarrow Works' figures on a made-up semi-diurnal tide, for this crate's tests.

use model::*;
use units::*;

pub const GATE: AssetId = AssetId(0);
pub const PUMPS: [AssetId; 2] = [AssetId(1), AssetId(2)];
pub const TIDE_WINDOW: ClauseId = ClauseId(0);
pub const TIDE_VOLUME: ClauseId = ClauseId(3);
pub const ROLLING: ClauseId = ClauseId(4);
const HALF_DAY_H: f64 = 12.42;
/// High water of tide 1 comes this long after the start.
const FIRST_HIGH_H: f64 = 3.0;

pub fn t(hours: f64) -> Utc {
    Utc::from_civil(2027, 5, 4, 0, 0, 0).unwrap() + Span::from_seconds_f64(hours * 3600.0)
}

pub fn window(from_h: f64, to_h: f64) -> Window {
    Window::new(t(from_h), t(to_h)).unwrap()
}

fn clause(id: u16, number: &str, kind: ClauseKind) -> Clause {
    let governed = |asset| Governed { asset, on_stale: OnStale::Hold };
    Clause {
        id: ClauseId(id),
        number: number.to_owned(),
        words: String::new(),
        kind,
        governs: [GATE, PUMPS[0], PUMPS[1]].map(governed).to_vec(),
    }
}

/// Clauses 2.2 to 2.7 of the permit.
fn permit() -> Vec<Clause> {
    let band = |range: f64, volume: f64, flow: Option<f64>| RangeBand {
        range_min: Metres::of(range),
        volume_max: CubicMetres::of(volume),
        flow_max: flow.map(CubicMetresPerSecond::of),
    };
    let bands = vec![band(0.0, 0.0, None), band(2.2, 4800.0, Some(0.9)), band(4.0, 9000.0, None)];
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
                flow_max: CubicMetresPerSecond::of(1.2),
                averaging: Span::minutes(15),
                ramp_max_per_min: Some(CubicMetresPerSecond::of(0.1)),
            },
        ),
        clause(
            3,
            "2.5",
            ClauseKind::VolumePerTide { rounding: Rounding { step: Metres::of(0.1) }, bands },
        ),
        clause(
            4,
            "2.6",
            ClauseKind::RollingVolume {
                span: Span::hours(24),
                volume_max: CubicMetres::of(16_500.0),
            },
        ),
        clause(5, "2.7", ClauseKind::MonthVolume { volume_max: CubicMetres::of(380_000.0) }),
    ]
}

fn asset(id: AssetId, name: &str, kind: AssetKind) -> Asset {
    let rest = if id == GATE { RestAction::Close } else { RestAction::Stop };
    Asset {
        id,
        name: name.to_owned(),
        kind,
        adapter: AdapterId(0),
        point: name.to_owned(),
        position: SignalId(id.0),
        local: None,
        lease: Span::seconds(120),
        lease_holder: LeaseHolder::Device,
        rest: RestActions { lease_out: rest, input_end: rest, trip: rest, stop: rest },
        move_rest: Span::seconds(30),
    }
}

fn assets() -> Vec<Asset> {
    let pump = || {
        AssetKind::Pump(Pump {
            flow: CubicMetresPerSecond::of(0.25),
            power: Kilowatts::of(22.0),
            starts_per_hour_max: 8,
            run_min: Span::minutes(5),
            rest_min: Span::minutes(5),
            needs_open: GATE,
            start_timeout: Span::seconds(60),
        })
    };
    let gate = Gate { stroke: Span::minutes(8), travel_factor: 1.5 };
    vec![
        asset(GATE, "penstock", AssetKind::Gate(gate)),
        asset(PUMPS[0], "pump-1", pump()),
        asset(PUMPS[1], "pump-2", pump()),
    ]
}

fn storage() -> Storage {
    let point = |level, volume| (Level::of(level), CubicMetres::of(volume));
    Storage {
        id: StorageId(0),
        name: "lagoon".to_owned(),
        curve: vec![point(3.40, 0.0), point(6.60, 22_400.0), point(6.90, 24_500.0)],
        level_lowest_working: Level::of(3.70),
        level_high_alarm: Level::of(6.30),
        level_spill: Level::of(6.60),
        level_signals: Vec::new(),
        inflow: InflowProfile {
            mean: CubicMetresPerSecond::of(0.133),
            swing: 0.35,
            peak_hour_utc: 10.0,
        },
    }
}

fn outlet() -> Outlet {
    Outlet {
        name: "outfall".to_owned(),
        storage: StorageId(0),
        place: PlaceId(0),
        gate: GATE,
        pumps: PUMPS.to_vec(),
        pipe: OutfallPipe {
            diameter: Metres::of(1.20),
            length: Metres::of(380.0),
            friction_f: 0.018,
            loss_k: 3.5,
            port_centre: Level::of(-3.60),
            density_excess: 0.02,
        },
        flow_signal: None,
        outer_signal: None,
        drain_down: Span::minutes(6),
    }
}

fn settings() -> Settings {
    Settings {
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
    }
}

pub fn site() -> Site {
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
            valid: window(-24.0 * 400.0, 24.0 * 400.0),
            gauge: None,
        },
        places: Vec::new(),
        storages: vec![storage()],
        outlets: vec![outlet()],
        assets: assets(),
        signals: Vec::new(),
        adapters: Vec::new(),
        licence: Licence { reference: String::new(), title: String::new(), clauses: permit() },
        settings: settings(),
        keeping: model::Keeping::default(),
        simulation: None,
        site_digest: String::new(),
        licence_digest: String::new(),
    }
}

/// The site without some clauses; the ids of the others stay.
pub fn site_without(gone: &[ClauseId]) -> Site {
    let mut site = site();
    for clause in site.licence.clauses.iter_mut().filter(|c| gone.contains(&c.id)) {
        clause.governs.clear();
    }
    site
}

/// What differs from one made-up case to the next.
#[derive(Clone, PartialEq, Debug)]
pub struct Case {
    /// Ebb range at the port of tides 0, 1, ...; tide 1 has its high water 3 h after the start.
    pub ranges: Vec<f64>,
    pub level_m: f64,
    /// (start h, mm, hours of rain).
    pub rain: Option<(f64, f64, f64)>,
    pub surge_m: f64,
    pub start_h: f64,
    pub flow_now: f64,
    pub used: Vec<(TideNumber, f64)>,
    pub past: Vec<(Window, CubicMetres)>,
    pub available: [bool; 3],
}

impl Case {
    pub fn dry(range: f64, level_m: f64) -> Self {
        Self {
            ranges: vec![range; 10],
            level_m,
            rain: None,
            surge_m: 0.0,
            start_h: 0.0,
            flow_now: 0.0,
            used: Vec::new(),
            past: Vec::new(),
            available: [true; 3],
        }
    }
}

pub fn high_h(tide: usize) -> f64 {
    FIRST_HIGH_H + (tide as f64 - 1.0) * HALF_DAY_H
}

/// Level outside: cosine from high to low water and back, by the range of the tide.
fn outer_m(case: &Case, at: Utc) -> f64 {
    let h = (at - t(FIRST_HIGH_H)).as_hours() / HALF_DAY_H + 1.0;
    let tide = h.round().clamp(0.0, (case.ranges.len() - 1) as f64);
    let range = case.ranges[tide as usize];
    let swing = range / 2.0 * libm_cos(core::f64::consts::TAU * (h - tide));
    0.7 + case.surge_m + swing
}

/// cos by its series: tests need no more, and the crate has no libm.
fn libm_cos(x: f64) -> f64 {
    let x = x.rem_euclid(core::f64::consts::TAU) - core::f64::consts::PI;
    let (mut term, mut sum) = (1.0, 1.0);
    for n in 1..20 {
        term *= -x * x / f64::from((2 * n - 1) * (2 * n));
        sum += term;
    }
    -sum
}

pub fn forecast(case: &Case) -> Forecast {
    let span = window(-14.0, 92.0);
    let turn = |k: usize| Turn {
        number: k as i64,
        kind: TurnKind::High,
        at: t(high_h(k)),
        level: Level::of(3.0),
        time_sd: Span::minutes(6),
        level_sd: Metres::of(0.1),
    };
    let tide = |(k, range): (usize, &f64)| Tide {
        number: k as i64,
        window: window(high_h(k) - 6.21, high_h(k) + 6.21),
        high: turn(k),
        ebb_range: Metres::of(*range),
    };
    let level = Series::sampled(&span, Span::minutes(5), |at| outer_m(case, at)).unwrap();
    let current = Series::sampled(&span, Span::minutes(5), |at| {
        let h = (at - t(FIRST_HIGH_H)).as_hours().rem_euclid(HALF_DAY_H);
        if h > 0.55 && h < 7.0 { 1.0 } else { -1.0 }
    });
    let current_turn = |k: usize| CurrentTurn {
        number: k as i64,
        to_seaward: true,
        at: t(high_h(k) + 0.55),
        time_sd: Span::minutes(6),
    };
    let tides = case.ranges.len();
    Forecast {
        as_of: t(case.start_h),
        span,
        digest: 7,
        port_turns: (0..tides).map(turn).collect(),
        tides: case.ranges.iter().enumerate().map(tide).collect(),
        port_level: level.clone(),
        places: vec![PlaceForecast {
            place: PlaceId(0),
            method: Method::Differences,
            turns: (0..tides).map(turn).collect(),
            level,
            current: Some(current.unwrap()),
            current_turns: (0..tides).map(current_turn).collect(),
        }],
    }
}

/// Dry-weather flow, and 560 m3 for each mm of rain over its hours and six more; 0.40 at most.
fn inflow_m3_s(case: &Case, at: Utc) -> f64 {
    let h = (at - t(0.0)).as_hours();
    let dry = 0.133 * (1.0 + 0.35 * libm_cos(core::f64::consts::TAU * (h - 10.0) / 24.0));
    let storm = case.rain.map_or(0.0, |(start, mm, hours)| {
        let on = h >= start + 1.0 && h < start + 7.0 + hours;
        if on { 560.0 * mm / ((hours + 6.0) * 3600.0) } else { 0.0 }
    });
    (dry + storm).min(0.40)
}

pub fn request(site: &Site, case: &Case) -> PlanRequest {
    let forecast = forecast(case);
    let lawful = licence::lawful(site, &forecast, GATE);
    let span = window(case.start_h, case.start_h + 72.0);
    let mut tallies = licence::Tallies::default();
    for (w, v) in &case.past {
        tallies.add(*w, *v, 0);
    }
    let used = |(tide, m3): &(TideNumber, f64)| (*tide, CubicMetres::of(*m3));
    PlanRequest {
        job: JobId(1),
        id: PlanId(2),
        parent: Some(PlanId(1)),
        as_of: span.start(),
        span,
        outlet: 0,
        level_now: Level::of(case.level_m),
        inflow: Series::sampled(&span, Span::minutes(5), |at| inflow_m3_s(case, at)).unwrap(),
        outer_level: forecast.places[0].level.clone(),
        lawful,
        used_tides: case.used.iter().map(used).collect(),
        caps: licence::long_caps(site, &tallies, span.start(), GATE),
        available: case.available.to_vec(),
        flow_now: CubicMetresPerSecond::of(case.flow_now),
        closing_lead: Span::minutes(15),
        forecast_digest: 7,
    }
}
