//! From a site and the plant's record to what `oracle` judges: the licence by its own words on the
//! true tide, and the works as it truly is.

use model::{AssetKind, ClauseKind, Site};
use oracle::{Asset, EventKind, FixedCap, Foresight, GateHead, LawfulWindow, Rules, Run, TideCap};
use plant::Truth;
use structures::{Friction, Outfall, Pipe};
use units::{Series, Span, Utc, Window};

/// The plant's record in the judge's own types.
pub fn run_of(record: &plant::Record) -> Run {
    let sample = |s: &plant::Sample| oracle::Sample {
        utc: s.utc,
        boot: s.boot,
        level_m: s.level_m,
        outer_m: s.outer_m,
        gate_percent: s.gate_percent,
        pumps_run: s.pumps_run.iter().map(|on| u32::from(*on)).sum(),
        ports_m3_s: s.ports_m3_s,
        inflow_m3_s: s.inflow_m3_s,
        released_m3: s.totals.released_m3,
        spilled_m3: s.totals.spilled_m3,
    };
    let event =
        |e: &plant::Event| Some(oracle::Event { utc: e.utc, boot: e.boot, kind: kind(&e.kind)? });
    Run {
        samples: record.samples.iter().map(sample).collect(),
        events: record.events.iter().filter_map(event).collect(),
    }
}

fn kind(kind: &plant::EventKind) -> Option<EventKind> {
    use plant::{EventKind as P, FaultKind};
    Some(match *kind {
        P::DriveReceived { asset, setting_percent, lease_end, .. } => {
            EventKind::Driven { asset, setting_percent, lease_end }
        }
        P::DriveRefused { asset, .. } => EventKind::DriveRefused { asset },
        P::Renewed { asset, lease_end, .. } => EventKind::Renewed { asset, lease_end },
        P::RestTold { asset, .. } => EventKind::RestTold { asset },
        P::RestBegun { asset, .. } => EventKind::RestBegun { asset },
        P::RestDone { asset } => EventKind::RestDone { asset },
        P::ProtectionStopped { asset, .. } => EventKind::ProtectionStopped { asset },
        P::LocalTaken { asset } => EventKind::LocalTaken { asset },
        P::LocalGiven { asset } => EventKind::LocalGiven { asset },
        P::FaultBegun { kind: FaultKind::GateJam } => EventKind::JamBegun,
        P::FaultEnded { kind: FaultKind::GateJam } => EventKind::JamEnded,
        P::PortsFlow => EventKind::PortsFlow,
        P::PortsStill => EventKind::PortsStill,
        P::LeaseOut { .. }
        | P::FaultBegun { .. }
        | P::FaultEnded { .. }
        | P::SpillBegun
        | P::SpillEnded => return None,
    })
}

/// The rules of the site's one outlet, with lawful windows by each clause's own words: high water
/// as predicted, and the current as it truly ran (`current`: instant and m/s, seaward positive).
pub fn rules_for(site: &Site, span: &Window, current: &[(Utc, f64)]) -> Rules {
    let outlet = &site.outlets[0];
    let day = Span::days(1);
    let wide = Window::new(span.start() - day, span.end() + day).unwrap();
    let mut forecast = nowcast::forecast(site, span.start(), wide).unwrap();
    let truth = minutes(current);
    forecast.places[outlet.place.index()].current = Some(truth);
    let lawful = licence::lawful(site, &forecast, outlet.gate);
    let window = |w: &model::LawfulWindow| LawfulWindow {
        window: w.window,
        tide: w.tide,
        flow_max_m3_s: w.flow_max.expect("clause 2.4 caps every flow").max.get(),
    };
    // A tide with no window at all may pass nothing, whatever its range.
    let cap = |t: &model::Tide| TideCap {
        window: t.window,
        tide: t.number,
        volume_max_m3: lawful
            .windows
            .iter()
            .find(|w| w.tide == t.number)
            .map_or(0.0, |w| w.volume_max.expect("clause 2.5 caps every tide").max.get()),
    };
    let storage = site.storage(outlet.storage);
    let mut rules = Rules {
        lawful: lawful.windows.iter().map(window).collect(),
        tides: forecast.tides.iter().map(cap).collect(),
        fixed: Vec::new(),
        rolling: None,
        averaging: Span::minutes(15),
        ramp_max_m3_s: None,
        still_m3_s: 0.005,
        assets: std::iter::once(&outlet.gate)
            .chain(&outlet.pumps)
            .map(|a| match &site.asset(*a).kind {
                AssetKind::Gate(g) => Asset { stroke: g.stroke },
                AssetKind::Pump(_) => Asset { stroke: Span::ZERO },
            })
            .collect(),
        head: GateHead {
            port_centre_m: outlet.pipe.port_centre.get(),
            density_excess: outlet.pipe.density_excess,
        },
        assist_within: Span::minutes(3),
        way_open_min_percent: 5.0,
        level_lowest_working_m: storage.level_lowest_working.get(),
        instruments_m: 0.02,
        known_within: Span::seconds(60),
        barred: Vec::new(),
    };
    long_caps(site, span, &mut rules);
    rules
}

/// Clauses 2.4, 2.6 and 2.7, read from the licence as data.
fn long_caps(site: &Site, span: &Window, rules: &mut Rules) {
    for clause in &site.licence.clauses {
        match &clause.kind {
            ClauseKind::Rate { averaging, ramp_max_per_min, .. } => {
                rules.averaging = *averaging;
                rules.ramp_max_m3_s = ramp_max_per_min.map(|r| r.get());
            }
            ClauseKind::RollingVolume { span, volume_max } => {
                rules.rolling = Some((*span, volume_max.get()));
            }
            ClauseKind::MonthVolume { volume_max } => {
                let mut at = span.start();
                while at < span.end() {
                    let (from, to) = site.zone.month_of(at);
                    let window = Window::new(from, to).unwrap();
                    rules.fixed.push(FixedCap { window, volume_max_m3: volume_max.get() });
                    at = to;
                }
            }
            _ => {}
        }
    }
}

/// On whole minutes, straight over gaps (a plant that was down).
fn minutes(points: &[(Utc, f64)]) -> Series {
    let (first, last) = (points[0].0, points[points.len() - 1].0);
    let minute = Span::minutes(1);
    let span = Window::new(first.ceil_to(minute), last.floor_to(minute)).unwrap();
    let mut near = 0;
    Series::sampled(&span, minute, |t| {
        while points[near + 1].0 < t {
            near += 1;
        }
        let ((t0, a), (t1, b)) = (points[near], points[near + 1]);
        a + (b - a) * (t - t0).as_seconds() / (t1 - t0).as_seconds()
    })
    .unwrap()
}

/// What perfect foresight could lawfully have moved, in the works as its drawn truth makes it.
pub fn foresight_m3(site: &Site, truth: &Truth, run: &Run, rules: &Rules) -> f64 {
    let outlet = &site.outlets[0];
    let p = &outlet.pipe;
    let friction = Friction::Darcy(p.friction_f * truth.friction_factor);
    let loss_k = p.loss_k * truth.loss_factor;
    let pipe = Pipe::new(p.diameter.get(), p.length.get(), friction, loss_k).unwrap();
    let outfall = Outfall::new(pipe, p.port_centre.get(), p.density_excess).unwrap();
    let rated = |a: &model::AssetId| match &site.asset(*a).kind {
        AssetKind::Pump(pump) => pump.flow.get() * truth.pump_factor,
        AssetKind::Gate(_) => 0.0,
    };
    let pumped: f64 = outlet.pumps.iter().map(rated).sum();
    let capacity =
        |inner_m: f64, outer_m: f64| outfall.flow_with_pumps_m3_s(inner_m, outer_m, 1.0, pumped);
    let curve = &site.storage(outlet.storage).curve;
    // Above the crest it runs over the weir.
    let crest_m = site.storage(outlet.storage).level_spill.get();
    let kept = curve.iter().filter(|(l, _)| l.get() <= crest_m);
    let storage: Vec<(f64, f64)> = kept.map(|(l, v)| (l.get(), v.get())).collect();
    oracle::foresight(run, rules, &Foresight { storage: &storage, capacity_m3_s: &capacity })
}
