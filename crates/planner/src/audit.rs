//! An independent reader of a plan: it shares no code with the making of one but the types, the
//! storage curve, the outfall's head and the request's digest. What flowed it works out itself,
//! from the levels that the plan says and the inflow that the request says.

mod assets;
mod finding;
mod flows;
mod volumes;

use model::{AssetId, Outlet, Plan, PlanRequest, Setpoint, Site, Slot};
use units::Window;

pub use finding::Finding;

/// What the reader looks at.
struct Reader<'a> {
    site: &'a Site,
    request: &'a PlanRequest,
    plan: &'a Plan,
    outlet: &'a Outlet,
}

/// Every finding; an empty list is a plan that may be used.
///
/// Reads: one slot at each instant for each asset, with a setpoint and a reason that fit it; no
/// release outside a lawful window less its margins and draining; flow, ramp, tide and longer caps;
/// head that lasts over the closing lead; pumps only with the gate open, for their least run and
/// rest and within their starts; and that inflow, level, releases and spills add up at each step.
pub fn audit(site: &Site, request: &PlanRequest, plan: &Plan) -> Vec<Finding> {
    let mut findings = Vec::new();
    let Some(outlet) = site.outlets.get(request.outlet) else {
        return vec![Finding::OtherRequest { what: "outlet" }];
    };
    let reader = Reader { site, request, plan, outlet };
    reader.request(&mut findings);
    reader.assets(&mut findings);
    reader.pumps(&mut findings);
    reader.windows(&mut findings);
    if let Some(steps) = reader.steps(&mut findings) {
        reader.flows(&steps, &mut findings);
        reader.ramp(&steps, &mut findings);
        reader.head(&steps, &mut findings);
        reader.balance(&steps, &mut findings);
        reader.tide_caps(&mut findings);
        reader.long_caps(&steps, &mut findings);
    }
    findings
}

impl Reader<'_> {
    /// The plan answers this request.
    fn request(&self, findings: &mut Vec<Finding>) {
        let (plan, request) = (self.plan, self.request);
        let same = [
            ("id", plan.id == request.id),
            ("parent", plan.parent == request.parent),
            ("as_of", plan.as_of == request.as_of),
            ("span", plan.span == request.span),
            ("forecast digest", plan.forecast_digest == request.forecast_digest),
            ("request digest", plan.request_digest == crate::digest::digest(request)),
        ];
        let other = same.iter().filter(|(_, same)| !same);
        findings.extend(other.map(|(what, _)| Finding::OtherRequest { what }));
    }
    fn slots(&self, asset: AssetId) -> &[Slot] {
        self.plan.assets.iter().find(|a| a.asset == asset).map_or(&[], |a| a.slots.as_slice())
    }
    /// The gate's slots with a release.
    fn releasing(&self) -> impl Iterator<Item = &Slot> {
        let open = |s: &&Slot| matches!(s.setpoint, Setpoint::Release { .. });
        self.slots(self.outlet.gate).iter().filter(open)
    }
    /// Whether any pump runs at some instant of the window.
    fn pumping(&self, window: &Window) -> bool {
        let runs =
            |s: &Slot| s.setpoint == Setpoint::Running && s.window.intersect(window).is_some();
        self.outlet.pumps.iter().any(|p| self.slots(*p).iter().any(runs))
    }
}
