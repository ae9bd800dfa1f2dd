//! The digest of a product hangs on every field of it.

use std::collections::BTreeSet;

use model::{
    AssetId, AssetPlan, ClauseId, CurrentTurn, FlowLimit, Forecast, Method, PlaceForecast, PlaceId,
    Plan, PlanId, PlannedRelease, Setpoint, Shortfall, Slot, SlotReason, Tide, Turn, TurnKind,
};
use units::{CubicMetres, CubicMetresPerSecond, Level, Metres, Percent, Series, Span, Window};

use super::at;
use crate::product::{of_forecast, of_plan};

fn series(last: f64) -> Series {
    Series::new(at(0), Span::minutes(5), vec![1.0, last]).unwrap()
}

fn window(hours: i64) -> Window {
    Window::new(at(0), at(hours)).unwrap()
}

fn turn(kind: TurnKind) -> Turn {
    Turn {
        number: 7,
        kind,
        at: at(1),
        level: Level::of(3.0),
        time_sd: Span::minutes(6),
        level_sd: Metres::of(0.1),
    }
}

pub fn forecast() -> Forecast {
    let high = turn(TurnKind::High);
    let current_turn =
        CurrentTurn { number: 7, to_seaward: true, at: at(2), time_sd: Span::minutes(5) };
    Forecast {
        as_of: at(0),
        span: window(9),
        digest: 1,
        port_turns: vec![high],
        tides: vec![Tide { number: 7, window: window(3), high, ebb_range: Metres::of(5.0) }],
        port_level: series(2.0),
        places: vec![PlaceForecast {
            place: PlaceId(0),
            method: Method::Differences,
            turns: vec![high],
            level: series(3.0),
            current: Some(series(0.5)),
            current_turns: vec![current_turn],
        }],
    }
}

const RELEASE: Setpoint =
    Setpoint::Release { target: CubicMetresPerSecond::of(0.9), openings: [Percent::of(10.0); 5] };

fn slot(setpoint: Setpoint, why: SlotReason) -> Slot {
    Slot { window: window(1), setpoint, why, tide: Some(7) }
}

pub fn plan() -> Plan {
    let clause = ClauseId(1);
    let why = [
        SlotReason::OutsideWindow { clause: Some(clause) },
        SlotReason::EdgeMargin { clause: None },
        SlotReason::Releasing { limited_by: FlowLimit::Clause(clause) },
        SlotReason::CapReached { clause },
        SlotReason::StorageLow,
    ];
    let slots = why.map(|w| slot(RELEASE, w)).to_vec();
    Plan {
        id: PlanId(2),
        parent: Some(PlanId(1)),
        as_of: at(0),
        span: window(9),
        request_digest: 3,
        forecast_digest: 4,
        assets: vec![AssetPlan { asset: AssetId(0), slots }],
        releases: vec![PlannedRelease { tide: 7, window: window(1), volume: CubicMetres::of(9.0) }],
        level: series(4.0),
        volume_released: CubicMetres::of(9.0),
        energy_kwh: 1.5,
        cost: 0.4,
        shortfalls: vec![Shortfall {
            spill: window(2),
            volume: CubicMetres::of(5.0),
            clauses: vec![clause],
        }],
    }
}

/// All different, and different from the one that nothing was done to.
fn all_differ<T>(
    make: impl Fn() -> T,
    digest: impl Fn(&T) -> u64,
    changes: &[fn(&mut T)],
) -> usize {
    let digests: BTreeSet<u64> = changes
        .iter()
        .map(|change| {
            let mut changed = make();
            change(&mut changed);
            digest(&changed)
        })
        .chain([digest(&make())])
        .collect();
    assert_eq!(digests.len(), changes.len() + 1);
    digests.len()
}

#[test]
fn a_forecast() {
    let changes: &[fn(&mut Forecast)] = &[
        |f| f.as_of = at(1),
        |f| f.span = window(8),
        |f| f.digest = 2,
        |f| f.port_turns.clear(),
        |f| f.port_turns[0].number = 8,
        |f| f.port_turns[0].kind = TurnKind::Low,
        |f| f.port_turns[0].at = at(2),
        |f| f.port_turns[0].level = Level::of(3.000_000_1),
        |f| f.port_turns[0].time_sd = Span::minutes(7),
        |f| f.port_turns[0].level_sd = Metres::of(0.2),
        |f| f.tides[0].number = 9,
        |f| f.tides[0].window = window(4),
        |f| f.tides[0].high.number = 5,
        |f| f.tides[0].ebb_range = Metres::of(5.5),
        |f| f.port_level = series(2.5),
        |f| f.places[0].place = PlaceId(1),
        |f| f.places[0].turns[0].number = 1,
        |f| f.places[0].level = series(2.0),
        |f| f.places[0].current = None,
        |f| f.places[0].current_turns[0].to_seaward = false,
        |f| f.places[0].current_turns[0].at = at(4),
        |f| f.places[0].current_turns[0].number = 4,
        |f| f.places[0].current_turns[0].time_sd = Span::ZERO,
    ];
    assert_eq!(all_differ(forecast, of_forecast, changes), 24);
}

#[test]
fn a_plan() {
    let changes: &[fn(&mut Plan)] = &[
        |p| p.id = PlanId(3),
        |p| p.parent = None,
        |p| p.as_of = at(1),
        |p| p.span = window(8),
        |p| p.request_digest = 9,
        |p| p.forecast_digest = 9,
        |p| p.assets[0].asset = AssetId(1),
        |p| p.assets[0].slots.truncate(1),
        |p| p.assets[0].slots[0].window = window(2),
        |p| p.assets[0].slots[0].tide = None,
        |p| p.releases[0].tide = 8,
        |p| p.releases[0].window = window(2),
        |p| p.releases[0].volume = CubicMetres::of(8.0),
        |p| p.level = series(5.0),
        |p| p.volume_released = CubicMetres::of(8.0),
        |p| p.energy_kwh = 2.0,
        |p| p.cost = 0.5,
        |p| p.shortfalls.clear(),
        |p| p.shortfalls[0].spill = window(3),
        |p| p.shortfalls[0].volume = CubicMetres::of(6.0),
        |p| p.shortfalls[0].clauses.clear(),
    ];
    assert_eq!(all_differ(plan, of_plan, changes), 22);
}

#[test]
fn every_setpoint_and_every_reason_of_a_slot() {
    let clause = ClauseId(1);
    let other = Setpoint::Release {
        target: CubicMetresPerSecond::of(0.9),
        openings: [10.0, 10.0, 10.0, 10.0, 11.0].map(Percent::of),
    };
    let setpoints = [Setpoint::Shut, Setpoint::Stopped, Setpoint::Running, RELEASE, other];
    let reasons = [
        SlotReason::OutsideWindow { clause: None },
        SlotReason::OutsideWindow { clause: Some(clause) },
        SlotReason::EdgeMargin { clause: None },
        SlotReason::EdgeMargin { clause: Some(clause) },
        SlotReason::Releasing { limited_by: FlowLimit::Clause(clause) },
        SlotReason::Releasing { limited_by: FlowLimit::Clause(ClauseId(2)) },
        SlotReason::Releasing { limited_by: FlowLimit::Head },
        SlotReason::Releasing { limited_by: FlowLimit::Pump },
        SlotReason::Releasing { limited_by: FlowLimit::Ramp },
        SlotReason::CapReached { clause },
        SlotReason::StorageLow,
        SlotReason::NoHead,
        SlotReason::WaitingForHead,
        SlotReason::GravityEnough,
        SlotReason::Assisting,
        SlotReason::Unavailable,
    ];
    let mut digests = BTreeSet::new();
    for setpoint in setpoints {
        for why in &reasons {
            let mut plan = plan();
            plan.assets[0].slots = vec![slot(setpoint, why.clone())];
            digests.insert(of_plan(&plan));
        }
    }
    assert_eq!(digests.len(), setpoints.len() * reasons.len());
}
