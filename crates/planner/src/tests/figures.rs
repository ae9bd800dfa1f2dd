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
