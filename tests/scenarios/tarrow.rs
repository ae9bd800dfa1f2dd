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

fn released(run: &Run) -> f64 {
    run.record.samples.last().unwrap().totals.released_m3
}

#[test]
fn three_days_release_the_lagoon_on_the_ebb() {
    let start = at("2027-05-01T00:00:00Z");
    let mut w = World::new(setup(tarrow(), start, 3));
    let mut n = 0;
    while w.next().unwrap() && n < 60000 {
        n += 1;
        if n % 200 == 0 { eprintln!("{n} {} {}", w.now(), w.now().as_micros()); }
    }
    let run = w.run().unwrap();
    for (stamp, e) in &run.entries {
        println!("{} {e:?}", stamp.utc);
    }
    println!("{} steps, released {:.0}", run.steps, released(&run));
    for s in run.record.samples.iter().step_by(15) {
        println!("{} level {:.2} outer {:.2} gate {:.0} pumps {:?} flow {:.2}", s.utc, s.level_m, s.outer_m, s.gate_percent, s.pumps_run, s.ports_m3_s);
    }
}
