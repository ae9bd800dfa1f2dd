//! An independent reader of a plan: it shares nothing with the making of one but the types.

use core::fmt;

use model::{AssetId, LongCapKind, Plan, PlanRequest, Setpoint, Site};
use structures::StorageCurve;
use units::{Utc, Window};

/// Something in a plan that must not be.
#[derive(Clone, PartialEq, Debug)]
pub enum Finding {
    /// Slots of an asset leave a gap or overlap here.
    Gap {
        asset: AssetId,
        at: Utc,
    },
    /// Flow outside every lawful window, or too late to drain within it.
    OutsideWindow {
        at: Utc,
    },
    OverFlowCap {
        at: Utc,
        m3_s: f64,
    },
    OverTideCap {
        tide: i64,
        m3: f64,
    },
    OverLongCap {
        clause: u16,
        m3: f64,
    },
    PumpWithoutGate {
        asset: AssetId,
        at: Utc,
    },
    /// What came in, went out and stayed does not add up.
    Unbalanced {
        m3: f64,
    },
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Gap { asset, at } => write!(f, "asset {} has no one slot at {at}", asset.0),
            Self::OutsideWindow { at } => write!(f, "a release outside its window at {at}"),
            Self::OverFlowCap { at, m3_s } => write!(f, "{m3_s} m3/s at {at} is over the cap"),
            Self::OverTideCap { tide, m3 } => write!(f, "{m3} m3 on tide {tide} is over its cap"),
            Self::OverLongCap { clause, m3 } => write!(f, "{m3} m3 is over clause no. {clause}"),
            Self::PumpWithoutGate { asset, at } => {
                write!(f, "pump {} runs with the gate shut at {at}", asset.0)
            }
            Self::Unbalanced { m3 } => write!(f, "{m3} m3 are not accounted for"),
        }
    }
}

/// Every finding; an empty list is a plan that may be used.
pub fn audit(site: &Site, request: &PlanRequest, plan: &Plan) -> Vec<Finding> {
    let mut findings = Vec::new();
    gaps(plan, &mut findings);
    releases(site, request, plan, &mut findings);
    pumps(site, request, plan, &mut findings);
    caps(request, plan, &mut findings);
    balance(site, request, plan, &mut findings);
    findings
}

fn gaps(plan: &Plan, findings: &mut Vec<Finding>) {
    for a in &plan.assets {
        let mut at = plan.span.start();
        for slot in &a.slots {
            if slot.window.start() != at {
                findings.push(Finding::Gap { asset: a.asset, at });
            }
            at = slot.window.end();
        }
        if at != plan.span.end() {
            findings.push(Finding::Gap { asset: a.asset, at });
        }
    }
}

fn releases(site: &Site, request: &PlanRequest, plan: &Plan, findings: &mut Vec<Finding>) {
    let outlet = &site.outlets[request.outlet];
    let Some(gate) = plan.assets.iter().find(|a| a.asset == outlet.gate) else { return };
    for slot in &gate.slots {
        let Setpoint::Release { target, .. } = slot.setpoint else { continue };
        let at = slot.window.start();
        let lawful = request.lawful.windows.iter().find(|w| w.window.contains(at));
        let Some(w) = lawful else {
            findings.push(Finding::OutsideWindow { at });
            continue;
        };
        if slot.window.end() + outlet.drain_down > w.window.end() {
            findings.push(Finding::OutsideWindow { at: slot.window.end() });
        }
        if w.flow_max.is_some_and(|c| target > c.max) {
            findings.push(Finding::OverFlowCap { at, m3_s: target.get() });
        }
    }
}

fn pumps(site: &Site, request: &PlanRequest, plan: &Plan, findings: &mut Vec<Finding>) {
    let outlet = &site.outlets[request.outlet];
    for a in plan.assets.iter().filter(|a| outlet.pumps.contains(&a.asset)) {
        for slot in a.slots.iter().filter(|s| s.setpoint == Setpoint::Running) {
            let mut at = slot.window.start();
            while at < slot.window.end() {
                let gate = plan.slot_at(outlet.gate, at);
                let Some(gate) = gate.filter(|g| g.setpoint.is_active()) else {
                    findings.push(Finding::PumpWithoutGate { asset: a.asset, at });
                    break;
                };
                at = gate.window.end();
            }
        }
    }
}

fn caps(request: &PlanRequest, plan: &Plan, findings: &mut Vec<Finding>) {
    for w in &request.lawful.windows {
        let Some(cap) = w.volume_max else { continue };
        let used = request.used_tides.iter().filter(|(t, _)| *t == w.tide);
        let used: f64 = used.map(|(_, v)| v.get()).sum();
        let planned = plan.releases.iter().filter(|r| r.tide == w.tide);
        let m3 = used + planned.map(|r| r.volume.get()).sum::<f64>();
        // A tide that is over already has nothing planned on top.
        if m3 > cap.max.get().max(used) + 1e-6 {
            findings.push(Finding::OverTideCap { tide: w.tide, m3 });
        }
    }
    for cap in &request.caps {
        for r in &plan.releases {
            let window = match cap.kind {
                LongCapKind::Rolling(span) => Window::new(r.window.end() - span, r.window.end()),
                LongCapKind::Fixed(w) => Ok(w),
            };
            let Ok(window) = window else { continue };
            // Whole pieces only, so that no guess about flow inside a piece is needed.
            let inside = |w: &Window| w.start() >= window.start() && w.end() <= window.end();
            let past = cap.past.iter().filter(|(w, _)| inside(w)).map(|(_, v)| v.get());
            let past: f64 = past.sum();
            let planned = plan.releases.iter().filter(|o| inside(&o.window));
            let planned: f64 = planned.map(|o| o.volume.get()).sum();
            if planned > 0.0 && past + planned > cap.volume_max.get() + 1e-3 {
                let m3 = past + planned;
                findings.push(Finding::OverLongCap { clause: cap.clause.0, m3 });
            }
        }
    }
}

fn balance(site: &Site, request: &PlanRequest, plan: &Plan, findings: &mut Vec<Finding>) {
    let spec = site.storage(site.outlets[request.outlet].storage);
    let points: Vec<(f64, f64)> = spec.curve.iter().map(|(l, v)| (l.get(), v.get())).collect();
    let Ok(curve) = StorageCurve::new(&points) else { return };
    let Some(end_m) = plan.level.at(plan.span.end()) else { return };
    let spilled: f64 = plan.shortfalls.iter().map(|s| s.volume.get()).sum();
    let inflow = trapezium(request);
    let start = curve.volume_m3(request.level_now.get());
    let expected = start + inflow - plan.volume_released.get() - spilled;
    let m3 = curve.volume_m3(end_m) - expected;
    if m3.abs() > 1e-6 * (start + inflow).max(1.0) {
        findings.push(Finding::Unbalanced { m3 });
    }
}

/// Inflow over the span by the values of the series themselves.
fn trapezium(request: &PlanRequest) -> f64 {
    let (s, span) = (&request.inflow, &request.span);
    let mut sum = 0.0;
    for i in 0..s.values().len() - 1 {
        let Ok(piece) = Window::new(s.instant(i), s.instant(i + 1)) else { continue };
        let Some(part) = piece.intersect(span) else { continue };
        let (a, b) = (s.at(part.start()), s.at(part.end()));
        let mean = (a.unwrap_or(0.0) + b.unwrap_or(0.0)) / 2.0;
        sum += mean * part.length().as_seconds();
    }
    sum
}
