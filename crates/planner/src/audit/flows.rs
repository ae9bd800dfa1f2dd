//! What flowed, worked out from the levels of the plan: step by step on the 5-minute grid.

use model::Setpoint;
use structures::{Friction, Outfall, Pipe, StorageCurve};
use units::{Series, Span, Utc, Window};

use super::{Finding, Reader};

/// Water that rounding may lose in a step, m3.
const ROUNDING_M3: f64 = 1e-5;

/// One step of the grid.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(super) struct GridStep {
    pub window: Window,
    /// What left the storage in it, spills included.
    pub out_m3: f64,
    /// The part of the step that has a release.
    pub releasing: Span,
    /// The most that the targets let pass.
    pub most_m3: f64,
    /// A spill that the plan names touches the step.
    pub spills: bool,
}

impl Reader<'_> {
    /// `None`, with a finding, where the levels cannot be read at all.
    pub(super) fn steps(&self, findings: &mut Vec<Finding>) -> Option<Vec<GridStep>> {
        let level = &self.plan.level;
        let begins = level.start() == self.plan.span.start();
        let reaches = level.last_instant() + level.step() > self.plan.span.end();
        let curve = self.curve().filter(|_| begins && reaches);
        let Some(curve) = curve else {
            findings.push(Finding::Unbalanced { what: "levels", m3: f64::NAN });
            return None;
        };
        let volumes: Vec<f64> = level.values().iter().map(|l| curve.volume_m3(*l)).collect();
        let step = |n: usize| {
            let window = Window::new(level.instant(n), level.instant(n + 1)).ok()?;
            let gained = under(&self.request.inflow, &window);
            let out_m3 = volumes[n] + gained - volumes[n + 1];
            let mut s = GridStep {
                window,
                out_m3,
                releasing: Span::ZERO,
                most_m3: 0.0,
                spills: self.plan.shortfalls.iter().any(|f| f.spill.intersect(&window).is_some()),
            };
            for slot in self.releasing() {
                let Setpoint::Release { target, .. } = slot.setpoint else { continue };
                let Some(part) = slot.window.intersect(&window) else { continue };
                s.releasing += part.length();
                // Targets are rounded down to a litre a second.
                s.most_m3 += (target.get() + 1e-3) * part.length().as_seconds();
            }
            Some(s)
        };
        Some((0..volumes.len() - 1).filter_map(step).collect())
    }

    pub(super) fn curve(&self) -> Option<StorageCurve> {
        let spec = self.site.storage(self.outlet.storage);
        let points: Vec<(f64, f64)> = spec.curve.iter().map(|(l, v)| (l.get(), v.get())).collect();
        StorageCurve::new(&points).ok()
    }

    /// Water leaves only where a release or a spill says so, and no more than the targets.
    pub(super) fn flows(&self, steps: &[GridStep], findings: &mut Vec<Finding>) {
        for s in steps {
            let most = if s.spills { f64::INFINITY } else { s.most_m3 };
            if s.out_m3 < -ROUNDING_M3 || s.out_m3 > most + ROUNDING_M3 {
                findings.push(Finding::Unexplained { at: s.window.start(), m3: s.out_m3 });
            }
        }
        let spec = self.site.storage(self.outlet.storage);
        let first = self.request.level_now.get();
        let least = first.min(spec.level_lowest_working.get()) - 1e-9;
        for (n, level_m) in self.plan.level.values().iter().enumerate() {
            let most = if n == 0 { first } else { spec.level_spill.get() } + 1e-9;
            if *level_m < least || *level_m > most {
                let at = self.plan.level.instant(n);
                findings.push(Finding::LevelOutside { at, level_m: *level_m });
            }
        }
    }

    /// If a flow never changes faster than r, its means over two neighbouring steps of length T
    /// differ by at most r T.
    pub(super) fn ramp(&self, steps: &[GridStep], findings: &mut Vec<Finding>) {
        for pair in steps.windows(2).filter(|p| !p[0].spills && !p[1].spills) {
            let at = pair[1].window.start();
            let near = |t: Utc| self.request.lawful.holding(t);
            let window = near(at).or_else(|| near(at - Span::minutes(5)));
            let Some(cap) = window.and_then(|w| w.ramp_max_per_min) else { continue };
            let minutes = pair[1].window.length().as_minutes();
            let means = pair.iter().map(|s| s.out_m3 / s.window.length().as_seconds());
            let change = means.reduce(|a, b| b - a).unwrap_or(0.0).abs();
            if change > cap.max.get() * minutes + 1e-6 {
                findings.push(Finding::OverRamp { at, m3_s_min: change / minutes });
            }
        }
    }

    /// With gravity alone, no instant of a release lies within the closing lead of a reversal.
    pub(super) fn head(&self, steps: &[GridStep], findings: &mut Vec<Finding>) {
        let p = &self.outlet.pipe;
        let friction = Friction::Darcy(p.friction_f);
        let pipe = Pipe::new(p.diameter.get(), p.length.get(), friction, p.loss_k);
        let outfall = pipe.and_then(|o| Outfall::new(o, p.port_centre.get(), p.density_excess));
        let Ok(outfall) = outfall else { return };
        let open = steps.iter().filter(|s| s.releasing > Span::ZERO && s.out_m3 > ROUNDING_M3);
        for s in open.filter(|s| !self.pumping(&s.window)) {
            let at = s.window.end();
            let until = at + self.request.closing_lead;
            let outer_m = highest(&self.request.outer_level, at, until);
            let inner_m = self.plan.level.at(at).unwrap_or(f64::NEG_INFINITY);
            // In the last step of a release the gate is shut before its end.
            let ends = self.plan.releases.iter().any(|r| s.window.contains(r.window.end()));
            let over = self.plan.releases.iter().any(|r| r.window.end() == at);
            if !ends && !over && outfall.net_head_m(inner_m, outer_m) <= 0.0 {
                findings.push(Finding::HeadGone { at });
            }
        }
    }
}

/// Volume under a series within a window, piece by piece of the series itself.
pub(super) fn under(series: &Series, window: &Window) -> f64 {
    let mut sum = 0.0;
    let first = (window.start() - series.start()).as_micros() / series.step().as_micros();
    for i in first.max(0) as usize..series.values().len() - 1 {
        if series.instant(i) >= window.end() {
            break;
        }
        let Ok(piece) = Window::new(series.instant(i), series.instant(i + 1)) else { continue };
        let Some(part) = piece.intersect(window) else { continue };
        let ends = [part.start(), part.end()].map(|t| series.at(t).unwrap_or(0.0));
        sum += (ends[0] + ends[1]) / 2.0 * part.length().as_seconds();
    }
    sum
}

/// The highest value from one instant to another, the series' last value held after its end.
fn highest(series: &Series, from: Utc, to: Utc) -> f64 {
    let inside = |i: &usize| series.instant(*i) >= from && series.instant(*i) <= to;
    let values = (0..series.values().len()).filter(inside).map(|i| series.values()[i]);
    let ends = [from, to].map(|t| series.at(t.min(series.last_instant())));
    values.chain(ends.into_iter().flatten()).fold(f64::NEG_INFINITY, f64::max)
}
