//! Slots as such: gapless, fitting, lawful in time; pumps' runs and rests.

use model::{AssetId, AssetKind, EdgeAnchor, LawfulWindow, Setpoint, Slot, SlotReason};
use units::{Span, Utc, Window};

use super::{Finding, Reader};

impl Reader<'_> {
    pub(super) fn assets(&self, findings: &mut Vec<Finding>) {
        for asset in core::iter::once(&self.outlet.gate).chain(&self.outlet.pumps) {
            let mut at = self.plan.span.start();
            for slot in self.slots(*asset) {
                if slot.window.start() != at {
                    findings.push(Finding::Gap { asset: *asset, at });
                }
                at = slot.window.end();
                self.fits(*asset, slot, findings);
            }
            if at != self.plan.span.end() {
                findings.push(Finding::Gap { asset: *asset, at });
            }
        }
    }

    fn fits(&self, asset: AssetId, slot: &Slot, findings: &mut Vec<Finding>) {
        let at = slot.window.start();
        let gate = matches!(self.site.asset(asset).kind, AssetKind::Gate(_));
        let (kind_fits, why_fits) = match slot.setpoint {
            Setpoint::Release { .. } => (gate, matches!(slot.why, SlotReason::Releasing { .. })),
            Setpoint::Running => (!gate, slot.why == SlotReason::Assisting),
            Setpoint::Shut => (gate, is_rest(&slot.why)),
            Setpoint::Stopped => (!gate, is_rest(&slot.why)),
        };
        let active = slot.setpoint.is_active();
        if !kind_fits || !why_fits || (active && slot.tide.is_none()) {
            findings.push(Finding::WrongSetpoint { asset, at });
        }
        let available = self.request.available.get(asset.index()).copied().unwrap_or(false);
        if active && !available {
            findings.push(Finding::Unavailable { asset, at });
        }
    }

    /// Every release lies in its tide's window, from its margin on, and has drained by its end.
    pub(super) fn windows(&self, findings: &mut Vec<Finding>) {
        let settings = &self.site.settings;
        let band = |anchor: EdgeAnchor, sd: Span| match anchor {
            EdgeAnchor::Modelled => sd.scaled(settings.band_sigmas),
            EdgeAnchor::Predicted | EdgeAnchor::SpanEnd => Span::ZERO,
        };
        let runs_on = self.request.flow_now.get() > 0.0;
        for slot in self.releasing() {
            let (at, end) = (slot.window.start(), slot.window.end());
            let held = |w: &&LawfulWindow| w.window.contains(at) && Some(w.tide) == slot.tide;
            let Some(w) = self.request.lawful.windows.iter().find(held) else {
                findings.push(Finding::OutsideWindow { at });
                continue;
            };
            let opens =
                w.window.start() + settings.clock_margin + band(w.opens.anchor, w.opens.time_sd);
            // A release that runs on from before the plan has opened already.
            let carried = runs_on && at == self.plan.span.start();
            if at < opens && !carried {
                findings.push(Finding::OutsideWindow { at });
            }
            let shuts =
                w.window.end() - settings.clock_margin - band(w.shuts.anchor, w.shuts.time_sd);
            if end + self.outlet.drain_down > shuts {
                findings.push(Finding::OutsideWindow { at: end });
            }
            if let Setpoint::Release { target, .. } = slot.setpoint
                && w.flow_max.is_some_and(|c| target > c.max)
            {
                findings.push(Finding::OverFlowCap { at, m3_s: target.get() });
            }
        }
    }

    pub(super) fn pumps(&self, findings: &mut Vec<Finding>) {
        for asset in &self.outlet.pumps {
            let runs = joined(self.slots(*asset));
            self.with_gate(*asset, &runs, findings);
            let AssetKind::Pump(pump) = &self.site.asset(*asset).kind else { continue };
            let short = |from: Utc, to: Utc, least: Span| {
                let length = to - from;
                (length < least).then_some(Finding::TooShort { asset: *asset, at: from, length })
            };
            for run in runs.iter().filter(|r| r.end() < self.plan.span.end()) {
                findings.extend(short(run.start(), run.end(), pump.run_min));
            }
            for pair in runs.windows(2) {
                findings.extend(short(pair[0].end(), pair[1].start(), pump.rest_min));
            }
            for run in &runs {
                let at = run.start();
                let hour = |r: &&Window| r.start() <= at && r.start() > at - Span::hours(1);
                if runs.iter().filter(hour).count() > pump.starts_per_hour_max as usize {
                    findings.push(Finding::TooManyStarts { asset: *asset, at });
                }
            }
        }
    }

    fn with_gate(&self, asset: AssetId, runs: &[Window], findings: &mut Vec<Finding>) {
        for run in runs {
            let mut at = run.start();
            while at < run.end() {
                let gate = self.plan.slot_at(self.outlet.gate, at);
                let Some(gate) = gate.filter(|g| g.setpoint.is_active()) else {
                    findings.push(Finding::PumpWithoutGate { asset, at });
                    break;
                };
                at = gate.window.end();
            }
        }
    }
}

fn is_rest(why: &SlotReason) -> bool {
    !matches!(why, SlotReason::Releasing { .. } | SlotReason::Assisting)
}

/// Stretches of running, joined over the slots that they are cut into.
fn joined(slots: &[Slot]) -> Vec<Window> {
    let running = slots.iter().filter(|s| s.setpoint == Setpoint::Running).map(|s| s.window);
    running.collect::<units::Windows>().as_slice().to_vec()
}
