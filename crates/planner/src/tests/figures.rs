//! What plans come to, on tides and weather that a person can follow.

use super::fixture::*;
use crate::{audit, plan};

/// Neap tides at 4,800 m3 each: every tide's volume is used to the last, in one release.
#[test]
fn each_neap_tide_is_used_to_its_cap_in_one_release() {
    let site = site();
    let request = request(&site, &Case::dry(3.5, 5.0));
    let plan = plan(&site, &request).unwrap();
    assert_eq!(audit(&site, &request, &plan), []);
    assert_eq!(plan.releases.len(), 6);
    for r in &plan.releases {
        assert!((r.volume.get() - 4800.0).abs() < 1e-6, "{r:?}");
    }
    assert_eq!(plan.shortfalls, []);
}

#[test]
fn look() {
    let case = Case {
        ranges: vec![5.944394164605959; 10],
        rain: Some((3.8971558259985883, 39.86168157745792, 19.62964977712568)),
        start_h: 52.0 / 12.0,
        available: [true, false, false],
        ..Case::dry(9.5, 3.745018943444302)
    };
    let site = site();
    for surge_m in [0.0] {
        let r = request(&site, &Case { surge_m, ..case.clone() });
        let p = plan(&site, &r).unwrap();
        let g = super::greedy::greedy(&site, &r);
        println!(
            "released {} greedy {} spilled {}",
            p.volume_released, g.released_m3, g.spilled_m3
        );
        for x in &p.releases {
            println!("   {} {} {}", x.tide, x.window, x.volume);
        }
        for x in p.assets[0].slots.iter().take(30) {
            println!(
                "   s {} {:?} {:?} lev {:?}",
                x.window,
                x.setpoint,
                x.why,
                p.level.at(x.window.end())
            );
        }
        for x in &p.shortfalls {
            println!("   {} {} {:?}", x.spill, x.volume, x.clauses);
        }
    }
}
