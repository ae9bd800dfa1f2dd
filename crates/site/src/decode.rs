//! The two files as a whole: every part is read before any is missed, so that all faults come at
//! once.

use model::{Licence, Site};

use crate::assets::assets;
use crate::clauses::{Known, licence};
use crate::codes;
use crate::cross;
use crate::keeping::keeping;
use crate::names::proper_name;
use crate::places::places;
use crate::port::port;
use crate::raw::Table;
use crate::settings::{settings, simulation};
use crate::signals::{Signals, adapters};
use crate::storages::{OutletNames, outlets, storages};
use crate::text::{Datums, LENGTH};
use crate::zone::zone;

/// BLAKE3 of the site file and of the licence file, hex.
pub(crate) struct Digests {
    pub site: String,
    pub licence: String,
}

/// The checked site, unless a fault was noted. `law` is absent where the licence file could not be
/// read at all.
pub(crate) fn site(root: &Table<'_>, law: Option<&Table<'_>>, digests: Digests) -> Option<Site> {
    let name = root
        .need("name", "`name = \"tarrow-works\"`")
        .and_then(|n| proper_name(&n))
        .map(str::to_owned);
    let title = root.words("title", "Tarrow Works, River Harl");
    let datum = root.words("datum", "HD");
    let datums = datums(root, datum.as_deref());
    let zone = root.need("zone", "`zone = \"Europe/London\"`").and_then(|n| zone(&n));

    let mut adapter_tables = root.some_tables("adapters", "adapter");
    let mut signal_tables = root.some_tables("signals", "signal");
    let mut place_tables = root.some_tables("places", "place");
    let mut storage_tables = root.some_tables("storages", "storage");
    let mut asset_tables = root.some_tables("assets", "asset");
    let mut outlet_tables = root.some_tables("outlets", "outlet");

    let (adapter_names, adapters) = adapters(&mut adapter_tables);
    let signals = Signals::of(&mut signal_tables, &adapter_names, &datums);
    let (place_names, places) = places(&mut place_tables, &datums, &signals);
    let (storage_names, storages) = storages(&mut storage_tables, &datums, &signals);
    let (asset_names, assets) = assets(&mut asset_tables, &adapter_names, &signals);
    let known =
        OutletNames { storages: &storage_names, places: &place_names, assets: &asset_names };
    let outlets = outlets(&mut outlet_tables, &known, &datums, &signals);
    let port = port(root, &datums, &signals);
    let settings = settings(root);
    let keeping = keeping(root, zone.as_ref());
    let simulation = simulation(root, &datums, &signals, &asset_names);
    root.finish();
    let known = Known {
        assets: &asset_names,
        places: &place_names,
        made_places: places.as_deref(),
        signals: &signals,
    };
    let licence = law.and_then(|law| licence(law, &known));

    let made = Site {
        name: name?,
        title: title?,
        datum: datum?,
        zone: zone?,
        port: port?,
        places: places?,
        storages: storages?,
        outlets: outlets?,
        assets: assets?,
        signals: signals.list?,
        adapters: adapters?,
        // Without a sound licence the site is refused, but its parts can still be held together.
        licence: licence.clone().unwrap_or_else(no_licence),
        settings: settings?,
        keeping: keeping?,
        simulation: simulation?,
        site_digest: digests.site,
        licence_digest: digests.licence,
    };
    let tables = cross::Tables {
        root,
        assets: &asset_tables,
        outlets: &outlet_tables,
        signals: &signal_tables,
    };
    cross::check(&made, &tables);
    licence.map(|_| made)
}

fn no_licence() -> Licence {
    Licence { reference: String::new(), title: String::new(), clauses: Vec::new() }
}

/// `[datums]`: each datum's zero above the site datum.
fn datums(root: &Table<'_>, site_datum: Option<&str>) -> Datums {
    let mut list = Vec::new();
    let shape = format!("a table [datums] with `{:?} = \"0 m\"`", site_datum.unwrap_or("HD"));
    let Some(t) = root.need("datums", &shape).and_then(|n| n.table("[datums]")) else {
        return Datums { list };
    };
    for (name, _, node) in t.all() {
        // A wrong height has been noted; its name still counts as known, so that not every level
        // that uses it is a fault too.
        let offset_m = node.quantity(&LENGTH, -100.0, 100.0);
        let is_site_datum = Some(name) == site_datum;
        if is_site_datum && offset_m.is_some_and(|o| o != 0.0) {
            node.fault::<()>(
                codes::SITE_DATUM,
                "the site datum must lie 0 m above itself",
                "write \"0 m\", and put every other datum relative to it",
            );
        }
        let offset_m = offset_m.filter(|_| !is_site_datum).unwrap_or(0.0);
        list.push((name.to_owned(), offset_m));
    }
    if let Some(datum) = site_datum
        && !list.iter().any(|d| d.0 == datum)
    {
        t.fault::<()>(
            codes::SITE_DATUM,
            format!("[datums] must have the site datum {datum:?}"),
            format!("add `{datum:?} = \"0 m\"`"),
        );
    }
    Datums { list }
}
