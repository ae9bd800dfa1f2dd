//! Settings of planning and running, and what the simulated plant is told.

use model::{Settings, SimulatedFault, SimulatedFaultKind, Simulation};
use units::{Percent, Span, Utc, Window};

use crate::codes;
use crate::fields::all;
use crate::names::Names;
use crate::raw::Table;
use crate::signals::Signals;
use crate::text::{Datums, PERCENT};

/// Design, section 3: "a declared grace (30 s unless the site says otherwise)".
const JOURNAL_GRACE: Span = Span::seconds(30);
/// Design, rule 3: "a site limit (15 min if not set)".
const OUTAGE_MAX: Span = Span::minutes(15);

pub(crate) fn settings(root: &Table<'_>) -> Option<Settings> {
    let t = root.need("settings", "a table [settings]")?.table("[settings]")?;
    let or = |key: &'static str, usual: Span, most: Span| match t.get(key) {
        Some(n) => n.duration(Span::ZERO, most),
        None => Some(usual),
    };
    let horizon = t.duration("horizon", Span::hours(26), Span::days(14));
    let flow_aim = t.number("flow_aim", 0.5, 1.0);
    let ramp_aim = t.number("ramp_aim", 0.1, 1.0);
    let clock_margin = t.duration("clock_margin", Span::ZERO, Span::minutes(30));
    let band_sigmas = t.number("band_sigmas", 0.0, 4.0);
    let price = t.number("energy_price_per_kwh", 0.0, 10.0);
    let journal_grace = or("journal_grace", JOURNAL_GRACE, Span::minutes(10));
    let outage_max = or("outage_max", OUTAGE_MAX, Span::hours(24));
    let step = t.quantity("opening_step_min", &PERCENT, 0.0, 20.0);
    let heartbeat = t.has("heartbeat_file").then(|| t.words("heartbeat_file", "heartbeat"));
    t.finish();
    Some(Settings {
        horizon: horizon?,
        flow_aim: flow_aim?,
        ramp_aim: ramp_aim?,
        clock_margin: clock_margin?,
        band_sigmas: band_sigmas?,
        energy_price_per_kwh: price?,
        journal_grace: journal_grace?,
        outage_max: outage_max?,
        opening_step_min: Percent::of(step?),
        heartbeat_file: match heartbeat {
            Some(h) => Some(h?),
            None => None,
        },
    })
}

/// `Some(None)` when there is no such section.
pub(crate) fn simulation(
    root: &Table<'_>,
    datums: &Datums,
    signals: &Signals<'_>,
    assets: &Names,
) -> Option<Option<Simulation>> {
    let Some(node) = root.get("simulation") else { return Some(None) };
    let t = node.table("[simulation]")?;
    let seed = t.whole("seed", 0, u64::MAX >> 1);
    let start = t.get("start").map(|n| n.instant());
    let level_start = t.level("level_start", datums);
    let constants = match t.get("constants") {
        Some(n) => n.table("the constants of [simulation]").and_then(|c| {
            let values = c
                .all()
                .into_iter()
                .map(|(name, at, n)| Some((name.to_owned(), signals.value_named(name, at, &n)?)));
            all(values.collect::<Vec<_>>())
        }),
        None => Some(Vec::new()),
    };
    let faults = t.tables("faults", "simulated fault").into_iter().map(|f| {
        let made = fault(&f, signals, assets);
        f.finish();
        made
    });
    let faults = all(faults.collect::<Vec<_>>());
    t.finish();
    let start = match start {
        Some(s) => Some(s?),
        None => None,
    };
    Some(Some(Simulation {
        seed: seed?,
        start,
        level_start: level_start?,
        constants: constants?,
        faults: faults?,
    }))
}

fn fault(t: &Table<'_>, signals: &Signals<'_>, assets: &Names) -> Option<SimulatedFault> {
    let kind = t.word(
        "kind",
        &[
            ("gate-jam", SimulatedFaultKind::GateJam),
            ("signal-frozen", SimulatedFaultKind::SignalFrozen),
            ("signal-missing", SimulatedFaultKind::SignalMissing),
        ],
    );
    let subject =
        t.need("subject", "`subject` with the asset or signal").and_then(|n| match kind? {
            SimulatedFaultKind::GateJam => {
                assets.find(&n).map(|i| assets.name(usize::from(i)).to_owned())
            }
            _ => signals.knows(&n),
        });
    let window = from_to(t);
    Some(SimulatedFault { kind: kind?, subject: subject?, window: window? })
}

fn from_to(t: &Table<'_>) -> Option<Window> {
    let read = |key: &'static str| -> Option<(crate::raw::Node<'_>, Utc)> {
        let n = t.need(key, &format!("`{key} = \"2027-03-01T06:30:00Z\"`"))?;
        Some((n, n.instant()?))
    };
    let (from, to) = (read("from"), read("to"));
    let ((_, from), (node, to)) = (from?, to?);
    Window::new(from, to).ok().or_else(|| {
        node.fault(
            codes::WINDOW_ORDER,
            format!("a stretch of time must end after it starts, at {from}"),
            "mend the one that is wrong",
        )
    })
}
