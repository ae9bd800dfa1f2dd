//! Storages and the outlets by which they empty.

use model::{AssetId, InflowProfile, OutfallPipe, Outlet, PlaceId, Storage, StorageId};
use units::{CubicMetres, CubicMetresPerSecond, Level, Span};

use crate::codes;
use crate::fields::{FLOW_M3_S_MAX, VOLUME_M3_MAX, all};
use crate::names::Names;
use crate::raw::{Node, Table};
use crate::signals::{Signals, Use};
use crate::text::{Datums, FLOW, VOLUME};

const CURVE: &str = "[[\"3.40 m HD\", \"0 m3\"], [\"6.90 m HD\", \"24500 m3\"]]";

pub(crate) fn storages(
    tables: &mut [Table<'_>],
    datums: &Datums,
    signals: &Signals<'_>,
) -> (Names, Option<Vec<Storage>>) {
    let names = Names::of("storage", tables);
    let made: Vec<_> = tables
        .iter()
        .enumerate()
        .map(|(i, t)| {
            let made = storage(StorageId(i as u16), names.name(i), t, datums, signals);
            t.finish();
            made
        })
        .collect();
    (names, all(made))
}

fn storage(
    id: StorageId,
    name: &str,
    t: &Table<'_>,
    datums: &Datums,
    signals: &Signals<'_>,
) -> Option<Storage> {
    let curve = t.need("curve", &format!("`curve = {CURVE}`")).and_then(|n| curve(&n, datums));
    let lowest = t.level("lowest_working", datums);
    let high = t.level("high_alarm", datums);
    let spill = t.level("spill", datums);
    let level_signals = t.need("level_signals", "`level_signals = [\"lagoon-level-a\"]`");
    let level_signals = level_signals.and_then(|n| {
        if n.list("[\"lagoon-level-a\"]")?.is_empty() {
            return n.fault(
                codes::EMPTY,
                "a storage must have at least one signal of its level",
                "name it: [\"lagoon-level-a\"]",
            );
        }
        signals.find_all_as(&n, Use::Level)
    });
    let inflow = t
        .need("inflow", "`inflow = { mean = \"0.133 m3/s\", swing = 0.35, peak = \"10:00 UTC\" }`");
    let inflow =
        inflow.and_then(|n| inflow_profile(&n.table(format!("the inflow of {}", t.what))?));
    let made = Storage {
        id,
        name: name.to_owned(),
        curve: curve?,
        level_lowest_working: lowest?,
        level_high_alarm: high?,
        level_spill: spill?,
        level_signals: level_signals?,
        inflow: inflow?,
    };
    levels_in_order(t, made)
}

fn inflow_profile(t: &Table<'_>) -> Option<InflowProfile> {
    let mean = t.quantity("mean", &FLOW, 0.0, FLOW_M3_S_MAX);
    let swing = t.number("swing", 0.0, 1.0);
    let peak = t.need("peak", "`peak = \"10:00 UTC\"`").and_then(|n| n.time_of_day_utc());
    t.finish();
    let mean = CubicMetresPerSecond::of(mean?);
    Some(InflowProfile { mean, swing: swing?, peak_hour_utc: peak? })
}

/// Rows of level and volume, both strictly rising.
fn curve(node: &Node<'_>, datums: &Datums) -> Option<Vec<(Level, CubicMetres)>> {
    let rows = node.list(CURVE)?;
    if rows.len() < 2 {
        return node.fault(
            codes::CURVE,
            "a storage curve must have at least two rows",
            format!("write it like {CURVE}"),
        );
    }
    let read = |row: &Node<'_>| {
        let [level, volume] = row.row::<2>("[\"3.40 m HD\", \"0 m3\"]")?;
        let (level, volume) = (datums.level(&level), volume.quantity(&VOLUME, 0.0, VOLUME_M3_MAX));
        Some((level?, CubicMetres::of(volume?)))
    };
    let points: Vec<_> = rows.iter().map(read).collect();
    let points = all(points)?;
    for (pair, row) in points.windows(2).zip(&rows[1..]) {
        if pair[0].0 >= pair[1].0 || pair[0].1 >= pair[1].1 {
            return row.fault(
                codes::CURVE,
                format!(
                    "level and volume must both rise; the row before is {} and {}",
                    pair[0].0, pair[0].1
                ),
                "put the rows in order, or mend the figure that falls",
            );
        }
    }
    Some(points)
}

fn levels_in_order(t: &Table<'_>, s: Storage) -> Option<Storage> {
    let (bottom, top) = (s.curve.first()?.0, s.curve.last()?.0);
    if s.level_lowest_working < bottom {
        return t.get("lowest_working")?.fault(
            codes::CURVE,
            format!(
                "the curve must reach down to the lowest working level, and begins at {bottom}"
            ),
            "add a row to the curve, or raise the level",
        );
    }
    if s.level_high_alarm <= s.level_lowest_working {
        return t.get("high_alarm")?.fault(
            codes::LEVEL_ORDER,
            format!(
                "the high alarm must lie above the lowest working level, {}",
                s.level_lowest_working
            ),
            "check both levels and their datums",
        );
    }
    if s.level_spill <= s.level_high_alarm {
        return t.get("spill")?.fault(
            codes::LEVEL_ORDER,
            format!("the spill must lie above the high alarm, {}", s.level_high_alarm),
            "check both levels and their datums",
        );
    }
    if s.level_spill > top {
        return t.get("spill")?.fault(
            codes::CURVE,
            format!("the curve must reach up to the spill, and ends at {top}"),
            "add a row to the curve, or lower the level",
        );
    }
    Some(s)
}

/// The names that an outlet refers to.
pub(crate) struct OutletNames<'a> {
    pub storages: &'a Names,
    pub places: &'a Names,
    pub assets: &'a Names,
}

pub(crate) fn outlets(
    tables: &mut [Table<'_>],
    known: &OutletNames<'_>,
    datums: &Datums,
    signals: &Signals<'_>,
) -> Option<Vec<Outlet>> {
    let names = Names::of("outlet", tables);
    let made: Vec<_> = tables
        .iter()
        .enumerate()
        .map(|(i, t)| {
            let made = outlet(names.name(i), t, known, datums, signals);
            t.finish();
            made
        })
        .collect();
    all(made)
}

fn outlet(
    name: &str,
    t: &Table<'_>,
    known: &OutletNames<'_>,
    datums: &Datums,
    signals: &Signals<'_>,
) -> Option<Outlet> {
    let storage = t.need("storage", "`storage = \"lagoon\"`").and_then(|n| known.storages.find(&n));
    let place = t.need("place", "`place = \"outfall\"`").and_then(|n| known.places.find(&n));
    let gate = t.need("gate", "`gate = \"penstock\"`").and_then(|n| known.assets.find(&n));
    let pumps =
        t.need("pumps", "`pumps = []`, or their names").and_then(|n| known.assets.find_all(&n));
    let flow = t.get("flow_signal").map(|n| signals.find_as(&n, Use::Flow));
    let outer = t.get("outer_signal").map(|n| signals.find_as(&n, Use::Level));
    let drain_down = t.duration("drain_down", Span::ZERO, Span::hours(2));
    let pipe = t
        .need("pipe", "a table [outlets.pipe]")
        .and_then(|n| n.table(format!("the pipe of {}", t.what)))
        .and_then(|p| {
            let made = pipe(&p, datums);
            p.finish();
            made
        });
    let unless_wrong = |signal: Option<Option<_>>| match signal {
        Some(s) => s.map(Some),
        None => Some(None),
    };
    Some(Outlet {
        name: name.to_owned(),
        storage: StorageId(storage?),
        place: PlaceId(place?),
        gate: AssetId(gate?),
        pumps: pumps?.into_iter().map(AssetId).collect(),
        pipe: pipe?,
        flow_signal: unless_wrong(flow)?,
        outer_signal: unless_wrong(outer)?,
        drain_down: drain_down?,
    })
}

fn pipe(t: &Table<'_>, datums: &Datums) -> Option<OutfallPipe> {
    let diameter = t.length("diameter", 0.05, 10.0);
    let length = t.length("length", 1.0, 20_000.0);
    let friction_f = t.number("friction_f", 0.005, 0.2);
    let loss_k = t.number("loss_k", 0.0, 200.0);
    let port_centre = t.level("port_centre", datums);
    let density_excess = t.number("density_excess", 0.0, 0.05);
    Some(OutfallPipe {
        diameter: diameter?,
        length: length?,
        friction_f: friction_f?,
        loss_k: loss_k?,
        port_centre: port_centre?,
        density_excess: density_excess?,
    })
}
