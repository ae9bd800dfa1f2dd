//! The smallest site that an intent can be about, and permits for it.

use interlock::{
    Action, Bounds, ClockTrust, GateRules, Kind, PermitLife, Raw, Rules, Scene, State, Verdict,
    Wish, judge,
};
use model::{
    AdapterId, Asset, AssetId, AssetKind, Gate, LeaseHolder, Licence, NodalRule, Port, RestAction,
    RestActions, Settings, SignalId, Site,
};
use record::Intent;
use units::{Level, Mono, Percent, Span, Utc, Window, ZoneRules};

/// Invented; only its one asset's name gets into rows.
pub fn sallow() -> Site {
    let valid = Window::new(Utc::EPOCH, Utc::EPOCH + Span::days(1)).expect("a day is a window");
    let rest = RestAction::Close;
    let penstock = Asset {
        id: AssetId(0),
        name: "penstock".to_owned(),
        kind: AssetKind::Gate(Gate { stroke: Span::seconds(60), travel_factor: 1.5 }),
        adapter: AdapterId(0),
        point: "P1".to_owned(),
        position: SignalId(0),
        local: None,
        lease: Span::seconds(120),
        lease_holder: LeaseHolder::Device,
        rest: RestActions { lease_out: rest, input_end: rest, trip: rest, stop: rest },
        move_rest: Span::seconds(30),
    };
    Site {
        name: "sallow-intake".to_owned(),
        title: "Sallow Intake".to_owned(),
        datum: "site".to_owned(),
        zone: ZoneRules::utc(),
        port: Port {
            name: "Port Ansel".to_owned(),
            mean_level: Level::of(0.0),
            nodal: NodalRule::Continuous,
            constants: Vec::new(),
            valid,
            gauge: None,
        },
        places: Vec::new(),
        storages: Vec::new(),
        outlets: Vec::new(),
        assets: vec![penstock],
        signals: Vec::new(),
        adapters: Vec::new(),
        licence: Licence { reference: String::new(), title: String::new(), clauses: Vec::new() },
        settings: settings(),
        keeping: model::Keeping::default(),
        simulation: None,
        site_digest: String::new(),
        licence_digest: String::new(),
    }
}

fn settings() -> Settings {
    Settings {
        horizon: Span::days(1),
        flow_aim: 0.9,
        ramp_aim: 0.7,
        clock_margin: Span::seconds(60),
        band_sigmas: 2.0,
        energy_price_per_kwh: 0.2,
        journal_grace: Span::seconds(60),
        outage_max: Span::minutes(10),
        opening_step_min: Percent::of(1.0),
        heartbeat_file: None,
    }
}

/// The interlock permits to open the penstock, in a scene where nothing stands against it.
pub fn intent(site: &Site, command: u64, term: u64, now: Mono) -> Intent {
    let opening = Percent::of(1.0 + (command % 90) as f64);
    let action = Action::Open(opening);
    let wish = Wish { action, anchored_on_time: true, command, term, state_seq: command };
    match judge(&rules(), &calm(), &wish, now) {
        Verdict::Permit(permit) => Intent::new(permit, site),
        Verdict::Deny(_) | Verdict::Force(_) => unreachable!("nothing stands against it"),
    }
}

fn rules() -> Rules {
    Rules {
        site: 1,
        asset: 0,
        kind: Kind::Gate(GateRules {
            port_centre_m: -3.6,
            density_excess: 0.02,
            assist_grace: Span::seconds(60),
        }),
        lease: Span::seconds(120),
        permit_life: PermitLife::REAL,
        move_rest: Span::seconds(30),
    }
}

fn calm() -> Scene {
    let bounds = Bounds { min: -20.0, max: 200.0, age_max: Span::seconds(60), frozen_after: None };
    let raw = |value| Some(Raw { value, age: Span::seconds(1), unchanged_for: Span::ZERO, bounds });
    Scene {
        clock: ClockTrust::Trusted,
        state: State {
            active: false,
            locked_out: false,
            latched: false,
            since_move: None,
            since_stop: None,
            starts_last_hour: 0,
            pump_runs: false,
            assisted_for: None,
        },
        position: raw(0.0),
        selector: None,
        inner: [Some(raw(5.0)), None],
        outer: Some(raw(1.0)),
        way: None,
    }
}
