//! Tarrow Works through the engine, the planner and the simulated plant, in one process.

use std::path::PathBuf;
use std::sync::Arc;

use engine::{Act, ActKind, Carried, Mode};
use model::Site;
use plant::Plant;
use units::{Mono, Span, Utc, Window};
use world::{Run, Setup, World};

pub fn tarrow() -> Site {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../deploy/sites/tarrow-works");
    site::load(&folder).expect("the demonstration site loads")
}

pub fn at(text: &str) -> Utc {
    Utc::parse(text).unwrap()
}

pub fn act(kind: ActKind) -> Act {
    Act { by: "A. Reeve".to_owned(), reason: "test".to_owned(), peer: "test".to_owned(), kind }
}

pub fn setup(site: Site, start: Utc, days: i64) -> Setup {
    let span = Window::new(start, start + Span::days(days)).unwrap();
    let boot = Mono::from_nanos(1_000_000_000_000);
    let wide = Window::new(start, start + Span::days(days + 1)).unwrap();
    let config = simulated_plant::plant_for(&site, &wide, boot).unwrap();
    let points = site
        .signals
        .iter()
        .map(|s| simulated_plant::point_of(&site, s.id).expect("the plant has a source"))
        .collect();
    Setup {
        plant: Plant::new(config).unwrap(),
        points,
        span,
        sense_every: Span::seconds(15),
        acts: vec![(start + Span::minutes(30), act(ActKind::Mode(Mode::Automatic)))],
        faults: Vec::new(),
        carry: |_, _| Carried::default(),
        site: Arc::new(site),
    }
}

/// Stretches in which water left the ports: (start, end, m3).
fn releases(run: &Run) -> Vec<(Utc, Utc, f64)> {
    let mut list: Vec<(Utc, Utc, f64)> = Vec::new();
    for pair in run.record.samples.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        if a.ports_m3_s <= 0.005 && b.ports_m3_s <= 0.005 {
            continue;
        }
        let m3 = b.totals.released_m3 - a.totals.released_m3;
        match list.last_mut().filter(|r| r.1 == a.utc) {
            Some(r) => (r.1, r.2) = (b.utc, r.2 + m3),
            None => list.push((a.utc, b.utc, m3)),
        }
    }
    list
}

#[test]
fn scen_three_days_release_the_lagoon_on_the_ebb_and_nothing_outside_it() {
    let site = tarrow();
    let start = at("2027-05-01T00:00:00Z");
    let span = Window::new(start, start + Span::days(3)).unwrap();
    let wide = Window::new(start - Span::days(1), span.end() + Span::days(1)).unwrap();
    let forecast = nowcast::forecast(&site, start, wide).unwrap();
    let gate = site.asset_named("penstock").unwrap().id;
    let lawful = licence::lawful(&site, &forecast, gate);
    let run = World::new(setup(site, start, 3)).run().unwrap();
    let list = releases(&run);
    for (from, to, m3) in &list {
        println!("{from} to {to}: {m3:.0} m3");
        let window = lawful.holding(*from + Span::minutes(2)).expect("it begins in a window");
        assert!(window.window.start() <= *from && *to <= window.window.end() + Span::minutes(1));
        assert!(*m3 <= window.volume_max.unwrap().max.get());
    }
    assert_eq!(list.len(), 6, "one release a tide");
    // No step of the penstock while the flow stands: a stroke has its price.
    let strokes = run.entries.iter().filter(|(_, e)| matches!(e, engine::Entry::Intent { .. }));
    let strokes = strokes.count();
    println!("{strokes} strokes, {} steps of the engine", run.steps);
    assert!(strokes <= 6 * 60, "{strokes} strokes");
}

#[test]
fn prop_the_same_setup_gives_the_same_run() {
    let start = at("2027-05-01T00:00:00Z");
    let go = || World::new(setup(tarrow(), start, 1)).run().unwrap();
    let (a, b) = (go(), go());
    assert_eq!(a.entries, b.entries);
    assert_eq!(a.record, b.record);
}

#[test]
fn scen_observe_commands_nothing_for_a_week() {
    let start = at("2027-05-01T00:00:00Z");
    let mut setup = setup(tarrow(), start, 7);
    setup.acts.clear();
    let run = World::new(setup).run().unwrap();
    let commands = run
        .entries
        .iter()
        .filter(|(_, e)| matches!(e, engine::Entry::Intent { .. } | engine::Entry::Rest { .. }));
    assert_eq!(commands.count(), 0);
    assert_eq!(run.record.samples.last().unwrap().totals.released_m3, 0.0);
}
