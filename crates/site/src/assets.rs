//! Assets: gates and pumps, their leases and what they do when nobody may command them.

use model::{
    AdapterId, Asset, AssetId, AssetKind, Gate, LeaseHolder, Pump, RestAction, RestActions,
};
use units::Span;

use crate::codes;
use crate::fields::all;
use crate::names::Names;
use crate::raw::{Node, Table};
use crate::signals::{Signals, Use};

/// Bounds of a lease: see S026.
const LEASE_MIN: Span = Span::seconds(5);
const LEASE_MAX: Span = Span::minutes(10);

const ACTIONS: [(&str, RestAction); 5] = [
    ("close", RestAction::Close),
    ("open", RestAction::Open),
    ("stop", RestAction::Stop),
    ("hold", RestAction::Hold),
    ("hand-to-local", RestAction::HandToLocal),
];

pub(crate) fn assets(
    tables: &mut [Table<'_>],
    adapters: &Names,
    signals: &Signals<'_>,
) -> (Names, Option<Vec<Asset>>) {
    let names = Names::of("asset", tables);
    let made: Vec<_> = tables
        .iter()
        .enumerate()
        .map(|(i, t)| {
            let made = asset(AssetId(i as u16), &names, t, adapters, signals);
            t.finish();
            made
        })
        .collect();
    (names, all(made))
}

fn asset(
    id: AssetId,
    names: &Names,
    t: &Table<'_>,
    adapters: &Names,
    signals: &Signals<'_>,
) -> Option<Asset> {
    let is_gate = t.word("kind", &[("gate", true), ("pump", false)]);
    let kind = is_gate.and_then(|gate| if gate { gate_kind(t) } else { pump_kind(t, names) });
    let adapter = t.need("adapter", "`adapter = \"plant\"`").and_then(|n| adapters.find(&n));
    let point = t.words("point", "penstock");
    let position = t
        .need("position", "`position = \"penstock-position\"`")
        .and_then(|n| signals.find_as(&n, Use::Position));
    let local = t.get("local").map(|n| signals.find_as(&n, Use::Switch));
    let lease = t.need("lease", "`lease = \"120 s\"`").and_then(|n| lease(&n));
    let holder = t.need("lease_holder", "`lease_holder = \"device\"`").and_then(|n| holder(&n));
    let rest = rest(t, is_gate);
    let move_rest = t.duration("move_rest", Span::ZERO, Span::hours(6));
    if is_gate.is_none() {
        t.forgive();
    }
    Some(Asset {
        id,
        name: names.name(id.index()).to_owned(),
        kind: kind?,
        adapter: AdapterId(adapter?),
        point: point?,
        position: position?,
        local: match local {
            Some(s) => Some(s?),
            None => None,
        },
        lease: lease?,
        lease_holder: holder?,
        rest: rest?,
        move_rest: move_rest?,
    })
}

fn gate_kind(t: &Table<'_>) -> Option<AssetKind> {
    let stroke = t.duration("stroke", Span::seconds(1), Span::hours(2));
    let travel_factor = t.number("travel_factor", 1.05, 5.0);
    Some(AssetKind::Gate(Gate { stroke: stroke?, travel_factor: travel_factor? }))
}

fn pump_kind(t: &Table<'_>, names: &Names) -> Option<AssetKind> {
    let flow = t.flow("flow");
    let power = t.power("power");
    let starts = t.whole("starts_per_hour_max", 1, 60);
    let run_min = t.duration("run_min", Span::ZERO, Span::hours(6));
    let rest_min = t.duration("rest_min", Span::ZERO, Span::hours(6));
    let needs = t.need("needs_open", "`needs_open = \"penstock\"`").and_then(|n| names.find(&n));
    let start_timeout = t.duration("start_timeout", Span::seconds(1), Span::minutes(30));
    Some(AssetKind::Pump(Pump {
        flow: flow?,
        power: power?,
        starts_per_hour_max: u32::try_from(starts?).ok()?,
        run_min: run_min?,
        rest_min: rest_min?,
        needs_open: AssetId(needs?),
        start_timeout: start_timeout?,
    }))
}

fn lease(node: &Node<'_>) -> Option<Span> {
    let lease = node.duration(Span::ZERO, Span::days(365))?;
    if (LEASE_MIN..=LEASE_MAX).contains(&lease) {
        return Some(lease);
    }
    node.fault(
        codes::LEASE_LENGTH,
        format!("a lease must be from {LEASE_MIN} to {LEASE_MAX} (h:mm:ss)"),
        "write what the controller's timer is set to, like \"120 s\"",
    )
}

fn holder(node: &Node<'_>) -> Option<LeaseHolder> {
    let holder = node.word(&[
        ("device", LeaseHolder::Device),
        ("adapter", LeaseHolder::Adapter),
        ("none", LeaseHolder::None),
    ])?;
    if holder != LeaseHolder::None {
        return Some(holder);
    }
    node.fault(
        codes::LEASE_HOLDER,
        "somebody must end the lease of an asset that passes effluent",
        "write \"device\" once the controller has a timer for it, or \"adapter\"",
    )
}

/// One action for each cause; all four said, and each one that the asset can do.
fn rest(t: &Table<'_>, is_gate: Option<bool>) -> Option<RestActions> {
    let usual = if is_gate == Some(false) { "stop" } else { "close" };
    let shape = format!(
        "`rest = {{ lease_out = {usual:?}, input_end = {usual:?}, trip = {usual:?}, stop = {usual:?} }}`, \
         each as your plant needs it"
    );
    let node = t.need_as(codes::REST_MISSING, "rest", &shape)?;
    let r = node.table(format!("the rest actions of {}", t.what))?;
    let action = |key: &'static str| {
        let n = r.need_as(codes::REST_MISSING, key, &format!("`{key} = {usual:?}` or another"))?;
        fit(&n, n.word(&ACTIONS)?, is_gate)
    };
    let (lease_out, input_end) = (action("lease_out"), action("input_end"));
    let (trip, stop) = (action("trip"), action("stop"));
    r.finish();
    Some(RestActions { lease_out: lease_out?, input_end: input_end?, trip: trip?, stop: stop? })
}

fn fit(node: &Node<'_>, action: RestAction, is_gate: Option<bool>) -> Option<RestAction> {
    use RestAction::{Close, Open, Stop};
    match (is_gate, action) {
        (Some(true), Stop) => node.fault(
            codes::REST_UNFIT,
            "a gate must rest by close, open, hold or hand-to-local",
            "write \"hold\" if it is to stay where it is",
        ),
        (Some(false), Close | Open) => node.fault(
            codes::REST_UNFIT,
            "a pump must rest by stop, hold or hand-to-local",
            "write \"stop\" if it is to stand still",
        ),
        _ => Some(action),
    }
}
