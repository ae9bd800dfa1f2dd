//! Places along the channel, and how the port's tide comes to them.

use model::{CurrentDifferences, Differences, LowLevel, NeapSpring, Place, PlaceId};
use units::{Metres, MetresPerSecond, Span};

use crate::codes;
use crate::fields::all;
use crate::names::Names;
use crate::raw::{Node, Table};
use crate::signals::{Signals, Use};
use crate::text::{Datums, LENGTH, SPEED};

/// The farthest that a tide of any river lags behind its port.
const LAG_MAX: Span = Span::hours(12);

pub(crate) fn places(
    tables: &mut [Table<'_>],
    datums: &Datums,
    signals: &Signals<'_>,
) -> (Names, Option<Vec<Place>>) {
    let names = Names::of("place", tables);
    let made: Vec<_> = tables
        .iter()
        .enumerate()
        .map(|(i, t)| {
            let made = place(PlaceId(i as u16), names.name(i), t, datums, signals);
            t.finish();
            made
        })
        .collect();
    (names, all(made))
}

fn place(
    id: PlaceId,
    name: &str,
    t: &Table<'_>,
    datums: &Datums,
    signals: &Signals<'_>,
) -> Option<Place> {
    let chainage = t.length("chainage", 0.0, 1_000_000.0);
    let gauge = t.get("gauge").map(|n| signals.find_as(&n, Use::Level));
    let differences = t
        .need("differences", "a table [places.differences]")
        .and_then(|n| n.table(format!("the differences of {}", t.what)))
        .and_then(|d| {
            let made = differences(&d, datums);
            d.finish();
            made
        });
    Some(Place {
        id,
        name: name.to_owned(),
        chainage: chainage?,
        differences: differences?,
        gauge: match gauge {
            Some(g) => Some(g?),
            None => None,
        },
    })
}

fn differences(t: &Table<'_>, datums: &Datums) -> Option<Differences> {
    let lag = |n: &Node<'_>| n.offset(LAG_MAX);
    let range = range(t);
    let high_lag = t.neap_spring("high_lag", "\"+0:04\"", lag);
    let high_rise = t.neap_spring("high_rise", "\"+0.3 m\"", rise);
    let low_lag = t.neap_spring("low_lag", "\"+0:46\"", lag);
    let low_level = low_level(t, datums);
    let current = t.get("current").map(|n| {
        let c = n.table(format!("the current in {}", t.what))?;
        let made = current(&c);
        c.finish();
        made
    });
    let time_sd = t.duration("time_sd", Span::seconds(1), Span::hours(3));
    let level_sd = t.length("level_sd", 0.001, 5.0);
    Some(Differences {
        range: range?,
        high_lag: high_lag?,
        high_rise: high_rise?,
        low_lag: low_lag?,
        low_level: low_level?,
        current: match current {
            Some(c) => Some(c?),
            None => None,
        },
        time_sd: time_sd?,
        level_sd: level_sd?,
    })
}

fn rise(n: &Node<'_>) -> Option<Metres> {
    n.quantity(&LENGTH, -20.0, 20.0).map(Metres::of)
}

/// The ranges at the port that the columns stand for: spring above neap.
fn range(t: &Table<'_>) -> Option<NeapSpring<Metres>> {
    let read = |n: &Node<'_>| n.quantity(&LENGTH, 0.05, 20.0).map(Metres::of);
    let range = t.neap_spring("range", "\"4.0 m\"", read)?;
    if range.spring.get() - range.neap.get() >= 0.05 {
        return Some(range);
    }
    t.get("range")?.fault(
        codes::NEAP_SPRING,
        "the spring range must be at least 0.05 m above the neap range",
        format!("check both; neap is {} and spring {}", range.neap, range.spring),
    )
}

/// Either the level itself or its rise over the port's low water.
fn low_level(t: &Table<'_>, datums: &Datums) -> Option<NeapSpring<LowLevel>> {
    if t.has("low_rise") && !t.has("low_level") {
        let as_rise = |n: &Node<'_>| rise(n).map(LowLevel::RiseOverPort);
        return t.neap_spring("low_rise", "\"+0.2 m\"", as_rise);
    }
    t.neap_spring("low_level", "\"-2.1 m HD\"", |n| datums.level(n).map(LowLevel::At))
}

fn current(t: &Table<'_>) -> Option<CurrentDifferences> {
    let lag = |n: &Node<'_>| n.offset(LAG_MAX);
    let speed = |n: &Node<'_>| n.quantity(&SPEED, 0.01, 10.0).map(MetresPerSecond::of);
    let seaward = t.neap_spring("seaward_after_port_high", "\"+0:30\"", lag);
    let landward = t.neap_spring("landward_after_port_low", "\"+0:56\"", lag);
    let ebb = t.neap_spring("peak_ebb", "\"1.2 m/s\"", speed);
    let flood = t.neap_spring("peak_flood", "\"1.9 m/s\"", speed);
    Some(CurrentDifferences {
        seaward_after_port_high: seaward?,
        landward_after_port_low: landward?,
        peak_ebb: ebb?,
        peak_flood: flood?,
    })
}
