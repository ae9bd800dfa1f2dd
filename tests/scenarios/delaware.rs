//! The same program on a real river's tide: the port at Lewes and the place at Philadelphia by NOAA's
//! published constants, thirty days. The works, its licence and the currents are invented.

use std::path::PathBuf;

use engine::Entry;
use units::{Span, Window};
use world::World;

use super::tarrow::{at, setup};

#[test]
fn scen_thirty_days_on_the_tide_of_the_delaware() {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("sites/delaware");
    let site = site::load(&folder).expect("the second site loads");
    let start = at("2027-05-03T00:00:00Z");
    let span = Window::new(start, start + Span::days(30)).unwrap();
    let wide = Window::new(start - Span::days(2), span.end() + Span::days(2)).unwrap();
    let forecast = nowcast::forecast(&site, start, wide).unwrap();
    let gate = site.outlets[0].gate;
    let lawful = licence::lawful(&site, &forecast, gate);
    let run = World::new(setup(site, start, 30)).run().unwrap();
    let samples = &run.record.samples;
    // The predicted window is the licence's; what the true current makes of its modelled edge is
    // judged at Tarrow. Here: no water outside what the forecast calls lawful.
    let outside: f64 = samples
        .windows(2)
        .filter(|p| p[0].ports_m3_s > 0.005 && lawful.holding(p[0].utc).is_none())
        .map(|p| p[1].totals.released_m3 - p[0].totals.released_m3)
        .sum();
    let began = |p: &&[plant::Sample]| p[0].ports_m3_s <= 0.005 && p[1].ports_m3_s > 0.005;
    let releases = samples.windows(2).filter(began).count();
    let last = samples.last().unwrap().totals;
    let trips = run.entries.iter().filter(|(_, e)| matches!(e, Entry::Latched { .. })).count();
    println!(
        "{releases} releases, {:.0} m3 of {:.0} m3 inflow, spilled {:.0}, outside {outside:.1}, \
         trips {trips}, {} steps",
        last.released_m3, last.inflow_m3, last.spilled_m3, run.steps
    );
    assert!(releases >= 50, "{releases}");
    assert_eq!(outside, 0.0);
    assert_eq!((last.spilled_m3, trips), (0.0, 0));
    // All that comes in goes out again, but for what the lagoon holds at the end.
    assert!(last.released_m3 >= 0.95 * last.inflow_m3, "{last:?}");
}
