//! What must hold between the parts: outlets and their assets, leases and windows, points, the
//! simulation and the adapters.

use model::{Asset, AssetId, AssetKind, ClauseKind, LeaseHolder, Site};
use units::Span;

use crate::codes;
use crate::raw::{Node, Table};

/// The tables, to show faults at.
pub(crate) struct Tables<'t, 'a> {
    pub root: &'t Table<'a>,
    pub assets: &'t [Table<'a>],
    pub outlets: &'t [Table<'a>],
    pub signals: &'t [Table<'a>],
}

pub(crate) fn check(site: &Site, tables: &Tables<'_, '_>) {
    outlets_hold_together(site, tables);
    every_asset_has_one_outlet(site, tables);
    points_are_single(site, tables);
    simulation_fits(site, tables);
    for outlet in &site.outlets {
        lease_fits(site, outlet.gate, outlet.drain_down, tables);
    }
}

fn outlets_hold_together(site: &Site, tables: &Tables<'_, '_>) {
    for (outlet, t) in site.outlets.iter().zip(tables.outlets) {
        if !matches!(site.asset(outlet.gate).kind, AssetKind::Gate(_))
            && let Some(n) = t.get("gate")
        {
            n.fault::<()>(
                codes::OUTLET_PARTS,
                "the gate of an outlet must be an asset of kind \"gate\"",
                "name the gate here and the pump under `pumps`",
            );
        }
        let nodes = t.get("pumps").and_then(|n| n.list("[]")).unwrap_or_default();
        for (pump, node) in outlet.pumps.iter().zip(&nodes) {
            pump_fits(site, site.asset(*pump), outlet.gate, node);
        }
    }
}

fn pump_fits(site: &Site, asset: &Asset, gate: AssetId, node: &Node<'_>) {
    match &asset.kind {
        AssetKind::Gate(_) => {
            node.fault::<()>(
                codes::OUTLET_PARTS,
                "the pumps of an outlet must be assets of kind \"pump\"",
                "take it out of `pumps`",
            );
        }
        AssetKind::Pump(p) if p.needs_open != gate => {
            node.fault::<()>(
                codes::OUTLET_PARTS,
                format!(
                    "a pump must need its own outlet's gate open, and `{}` needs `{}`",
                    asset.name,
                    site.asset(p.needs_open).name
                ),
                format!("write `needs_open = {:?}` for that pump", site.asset(gate).name),
            );
        }
        AssetKind::Pump(_) => {}
    }
}

fn every_asset_has_one_outlet(site: &Site, tables: &Tables<'_, '_>) {
    for (asset, t) in site.assets.iter().zip(tables.assets) {
        let uses = |o: &model::Outlet| o.gate == asset.id || o.pumps.contains(&asset.id);
        let count = site.outlets.iter().filter(|o| uses(o)).count();
        if count != 1
            && let Some(n) = t.get("name")
        {
            n.fault::<()>(
                codes::OUTLET_PARTS,
                format!("an asset must belong to exactly one outlet, and this one is in {count}"),
                "name it as the gate or a pump of its outlet",
            );
        }
    }
}

fn points_are_single(site: &Site, tables: &Tables<'_, '_>) {
    let twice = |t: &Table<'_>, what: &str, first: &str| {
        if let Some(n) = t.get("point") {
            n.fault::<()>(
                codes::POINT_TWICE,
                format!("a point must stand for one {what} only, and `{first}` has it already"),
                "give each its own point of the adapter",
            );
        }
    };
    for (i, a) in site.assets.iter().enumerate() {
        let same = |o: &&Asset| o.adapter == a.adapter && o.point == a.point;
        if let Some(o) = site.assets[..i].iter().find(same) {
            twice(&tables.assets[i], "asset", &o.name);
        }
    }
    for (i, s) in site.signals.iter().enumerate() {
        let same = |o: &&model::Signal| o.adapter == s.adapter && o.point == s.point;
        if let Some(o) = site.signals[..i].iter().find(same) {
            twice(&tables.signals[i], "signal", &o.name);
        }
    }
}

fn simulation_fits(site: &Site, tables: &Tables<'_, '_>) {
    let simulated = site.all_simulated();
    match (tables.root.get("simulation"), simulated) {
        (Some(n), false) => {
            n.fault::<()>(
                codes::SIMULATION,
                "a site with a real adapter must not have [simulation]",
                "take the section out, or make every adapter simulated",
            );
        }
        (None, true) => {
            tables.root.fault::<()>(
                codes::SIMULATION,
                "a site whose plant is simulated must have [simulation]",
                "add [simulation] with a `seed` and a `level_start`",
            );
        }
        _ => {}
    }
}

/// What a usual window is taken to be, where no clause says a shorter one.
const WINDOW_USUAL: Span = Span::hours(3);

/// Design rule 2: the latest safe start of closing is 1.5 strokes, the lease and the detection
/// before the water turns. Detection is the age limit of the position signal.
fn lease_fits(site: &Site, gate: AssetId, drain_down: Span, tables: &Tables<'_, '_>) {
    let asset = site.asset(gate);
    let AssetKind::Gate(kind) = &asset.kind else { return };
    let detection = site.signal(asset.position).age_max;
    let needed = kind.stroke.scaled(1.5) + asset.lease + detection + drain_down;
    let governing =
        site.licence.clauses.iter().filter(|c| c.governs.iter().any(|g| g.asset == gate));
    let window = governing
        .filter_map(|c| match c.kind {
            ClauseKind::TideWindow { from, to, .. } => Some(to - from),
            _ => None,
        })
        .fold(WINDOW_USUAL, Span::min);
    if needed < window {
        return;
    }
    if let Some(n) = tables.assets[gate.index()].get("lease") {
        n.fault::<()>(
            codes::LEASE_FIT,
            format!(
                "1.5 strokes + lease + age limit of the position + drain-down are {needed} and must \
                 leave something of a window of {window} (h:mm:ss)"
            ),
            "shorten the lease or the age limit, or check the stroke and the window",
        );
    }
}

/// Whether anything of the site keeps automatic away from this asset.
pub(crate) fn lease_in_adapter(asset: &Asset) -> bool {
    asset.lease_holder == LeaseHolder::Adapter
}
