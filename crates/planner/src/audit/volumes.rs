//! Volumes: that they add up, and that they keep within every cap.

use model::{LongCap, LongCapKind};
use units::{Utc, Window};

use super::flows::{GridStep, under};
use super::{Finding, Reader};

/// What sums of hundreds of steps may be out by, m3.
const ROUNDING_M3: f64 = 1e-4;

impl Reader<'_> {
    /// Each release is what left in its steps, and all of it together is what is missing.
    pub(super) fn balance(&self, steps: &[GridStep], findings: &mut Vec<Finding>) {
        let mut off = |what: &'static str, m3: f64| {
            if m3.abs() > ROUNDING_M3 || m3.is_nan() {
                findings.push(Finding::Unbalanced { what, m3 });
            }
        };
        let plan = self.plan;
        for r in &plan.releases {
            let of_release = || steps.iter().filter(|s| s.window.intersect(&r.window).is_some());
            if of_release().all(|s| !s.spills) && r.window.end() <= plan.level.last_instant() {
                off("release", of_release().map(|s| s.out_m3).sum::<f64>() - r.volume.get());
            }
        }
        let released: f64 = plan.releases.iter().map(|r| r.volume.get()).sum();
        off("volume released", plan.volume_released.get() - released);
        let spilled: f64 = plan.shortfalls.iter().map(|s| s.volume.get()).sum();
        let (Some(curve), Some(end)) = (self.curve(), plan.level.values().last()) else { return };
        let Ok(span) = Window::new(plan.span.start(), plan.level.last_instant()) else { return };
        let start_m3 = curve.volume_m3(self.request.level_now.get());
        let stayed = curve.volume_m3(*end);
        let expected = start_m3 + under(&self.request.inflow, &span) - released - spilled;
        // A span that ends off the grid has a last bit that no level shows.
        if plan.level.last_instant() == plan.span.end() {
            off("storage", stayed - expected);
        }
    }

    pub(super) fn tide_caps(&self, findings: &mut Vec<Finding>) {
        let mut seen = None;
        for w in &self.request.lawful.windows {
            let Some(cap) = w.volume_max.filter(|_| seen != Some(w.tide)) else { continue };
            seen = Some(w.tide);
            let of_tide = self.plan.releases.iter().filter(|r| r.tide == w.tide);
            let planned: f64 = of_tide.map(|r| r.volume.get()).sum();
            let before = self.used_before(w.tide);
            if planned > 0.0 && before + planned > cap.max.get() + ROUNDING_M3 {
                findings.push(Finding::OverTideCap { tide: w.tide, m3: before + planned });
            }
        }
    }

    /// Used before the plan begins. What the running release lets out from then on is in the plan.
    fn used_before(&self, tide: i64) -> f64 {
        let used = self.request.used_tides.iter().filter(|(t, _)| *t == tide);
        let used: f64 = used.map(|(_, v)| v.get()).sum();
        let start = self.plan.span.start();
        let runs = self.request.lawful.holding(start).is_some_and(|w| w.tide == tide);
        let again = |c: &LongCap| -> f64 {
            c.past.iter().filter(|p| self.again(p.0)).map(|p| p.1.get()).sum()
        };
        let again = self.request.caps.iter().map(again).fold(0.0, f64::max);
        if runs { (used - again).max(0.0) } else { used }
    }

    /// Whether a past piece lies within the plan, of a release that the plan counts itself.
    fn again(&self, piece: Window) -> bool {
        self.request.flow_now.get() > 0.0 && piece.start() >= self.plan.span.start()
    }

    /// At the end of every piece with flow. Only pieces that lie wholly within the cap's span are
    /// summed, so that nothing is guessed of the flow within a piece; a cap that is broken by less
    /// than the piece at the far edge is not seen.
    pub(super) fn long_caps(&self, steps: &[GridStep], findings: &mut Vec<Finding>) {
        for cap in &self.request.caps {
            let past = cap.past.iter().filter(|p| !self.again(p.0)).map(|p| (p.0, p.1.get()));
            let planned = steps.iter().filter(|s| s.releasing > units::Span::ZERO && !s.spills);
            let planned: Vec<(Window, f64)> = planned.map(|s| (s.window, s.out_m3)).collect();
            let all: Vec<(Window, f64)> = past.chain(planned.iter().copied()).collect();
            for (piece, _) in planned.iter().filter(|p| p.1 > ROUNDING_M3) {
                let Some((from, to)) = reach(cap, piece) else { continue };
                let inside = all.iter().filter(|(w, _)| w.start() >= from && w.end() <= to);
                let m3: f64 = inside.map(|(_, v)| v).sum();
                if m3 > cap.volume_max.get() + ROUNDING_M3 {
                    findings.push(Finding::OverLongCap { clause: cap.clause, at: piece.end(), m3 });
                    break;
                }
            }
        }
    }
}

fn reach(cap: &LongCap, piece: &Window) -> Option<(Utc, Utc)> {
    match cap.kind {
        LongCapKind::Rolling(span) => Some((piece.end() - span, piece.end())),
        LongCapKind::Fixed(w) => w.intersect(piece).map(|_| (w.start(), piece.end())),
    }
}
