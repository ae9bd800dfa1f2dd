//! Backwards over the slots: the least cost to go from every (storage volume, volume used this
//! tide, mode).
//!
//! Modes: shut; gravity by its age (a flow that ramps up passes less in its first three slots);
//! gravity in full; gravity helped by 1, 2, ... pumps. Outside the release windows the storage only
//! fills, which is one step.

use units::Window;

use crate::problem::Problem;
use crate::windows::ReleaseWindow;

/// The index of a mode: 0 shut, 1 to 3 ramping up, 4 gravity, 5 and up pumps.
pub(crate) type Mode = usize;
pub(crate) const SHUT: Mode = 0;
pub(crate) const GRAVITY: Mode = 4;

/// Prices. Their order is the order of rule 1; within it they are a choice, in the money of the
/// energy price.
const SPILL_PER_M3: f64 = 1000.0;
const ALARM_PER_M3_H: f64 = 0.05;
const OPENING: f64 = 0.02;
const PUMP_START: f64 = 0.50;
/// Full storage costs this an hour, half full a quarter of it.
const STORED_PER_H: f64 = 0.02;
/// And this at the end of the plan.
const STORED_AT_END: f64 = 2.0;

/// Volume steps of the grids; between them the cost is interpolated.
const STORAGE_STEPS: usize = 96;
const USED_STEP_M3: f64 = 250.0;
const USED_STEPS_MOST: usize = 60;

/// Costs on a grid of (mode, used, storage volume).
#[derive(Clone, Debug)]
pub(crate) struct Layer {
    used_step: f64,
    used_count: usize,
    modes: usize,
    values: Vec<f64>,
}

/// The cost to go after every slot of every window, for the forward pass to choose by.
pub(crate) struct Policy {
    pub volume_step: f64,
    /// For each window, one layer a slot: the cost to go from its end.
    pub after: Vec<Vec<Layer>>,
}

/// What one slot does to a state.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Passed {
    pub volume: f64,
    pub used: f64,
    pub cost: f64,
}

pub(crate) fn mode_count(problem: &Problem) -> usize {
    GRAVITY + 1 + problem.pumps.len()
}

/// The mode that follows: a pump may start from any open or shut gate, gravity grows older.
pub(crate) fn choices(problem: &Problem, from: Mode) -> impl Iterator<Item = Mode> {
    let gravity = match from {
        SHUT => 1,
        m if m < GRAVITY => m + 1,
        _ => GRAVITY,
    };
    [SHUT, gravity].into_iter().chain(GRAVITY + 1..mode_count(problem))
}

/// Strokes and starts of going from one mode to another.
pub(crate) fn switching(from: Mode, to: Mode) -> f64 {
    let opening = if from == SHUT && to != SHUT { OPENING } else { 0.0 };
    let starts = to.saturating_sub(GRAVITY.max(from)) as f64;
    opening + PUMP_START * starts
}

impl Problem<'_> {
    /// Mean flow of a slot in a mode, m3/s, before volumes limit it.
    pub(crate) fn slot_flow_m3_s(
        &self,
        w: &ReleaseWindow,
        slot: &Window,
        mode: Mode,
        level_m: f64,
    ) -> f64 {
        if mode == SHUT {
            return 0.0;
        }
        let dt = slot.length().as_seconds();
        let middle = slot.start() + slot.length().scaled(0.5);
        let gravity = self.gravity_m3_s(level_m, middle);
        if mode > GRAVITY {
            let pumped = self.pumped_m3_s(mode - GRAVITY);
            return gravity.max(pumped).min(w.flow_aim_m3_s);
        }
        let left_s = (w.flow.end() - middle).as_seconds();
        let mut flow = gravity.min(w.flow_aim_m3_s).min(self.ramp_m3_s2 * left_s);
        if mode < GRAVITY {
            flow = flow.min(self.ramp_m3_s2 * dt * (mode as f64 - 0.5));
        }
        flow
    }

    /// One slot from (volume, used) in a mode: what leaves keeps the storage above its lowest
    /// working level and the tide within its allotment; what is over the weir's crest spills.
    pub(crate) fn pass(
        &self,
        w: &ReleaseWindow,
        slot: &Window,
        mode: Mode,
        volume: f64,
        used: f64,
    ) -> Passed {
        let dt = slot.length().as_seconds();
        let inflow = self.inflow_m3(slot.start(), slot.end());
        let flow = self.slot_flow_m3_s(w, slot, mode, self.storage.level_m(volume));
        let above = (volume + inflow - self.volume_low).max(0.0);
        let released = (flow * dt).min(above).min((w.allotment_m3 - used).max(0.0));
        let mut cost = self.stored_cost(volume, dt);
        if mode > GRAVITY {
            cost += self.pump_kw(mode - GRAVITY) * dt / 3600.0 * self.energy_price;
        }
        let (volume, spilled) = self.spilled(volume + inflow - released);
        Passed { volume, used: used + released, cost: cost + spilled * SPILL_PER_M3 }
    }

    pub(crate) fn spilled(&self, volume: f64) -> (f64, f64) {
        let over = (volume - self.volume_spill).max(0.0);
        (volume - over, over)
    }
    /// Water kept for `dt`: dearer the fuller the storage, and much dearer above the alarm.
    fn stored_cost(&self, volume: f64, dt: f64) -> f64 {
        let share = volume / self.volume_spill;
        let over = (volume - self.volume_alarm).max(0.0);
        (STORED_PER_H * share * share + ALARM_PER_M3_H * over) * dt / 3600.0
    }
    fn end_cost(&self, volume: f64) -> f64 {
        let share = volume / self.volume_spill;
        STORED_AT_END * share * share
    }
    /// Filling from `gap.start()` to `gap.end()` without a release, hour by hour for the prices.
    fn fill(&self, gap: &Window, volume: f64) -> (f64, f64) {
        let (mut v, mut cost) = (volume, 0.0);
        let mut t = gap.start();
        while t < gap.end() {
            let next = (t + units::Span::hours(1)).min(gap.end());
            cost += self.stored_cost(v, (next - t).as_seconds());
            let (kept, spilled) = self.spilled(v + self.inflow_m3(t, next));
            cost += spilled * SPILL_PER_M3;
            (v, t) = (kept, next);
        }
        (v, cost)
    }

    /// Solves backwards and keeps what the forward pass needs.
    pub(crate) fn solve(&self) -> Policy {
        let volume_step = self.volume_spill / STORAGE_STEPS as f64;
        let grid = |i: usize| i as f64 * volume_step;
        let mut to_go: Vec<f64> = (0..=STORAGE_STEPS).map(|i| self.end_cost(grid(i))).collect();
        let mut until = self.request.span.end();
        let mut after: Vec<Vec<Layer>> = vec![Vec::new(); self.windows.len()];
        for (n, w) in self.windows.iter().enumerate().rev() {
            to_go = self.filled(w.flow.end(), until, &to_go, volume_step);
            // A second window of the same tide goes on with what the first has used; it is rare,
            // and taken as having the tide's whole allotment here: the forward pass is exact.
            let mut layer = Layer::level(w, mode_count(self), &to_go);
            for slot in w.slots.iter().rev() {
                let before = self.backward(w, slot, &layer, volume_step);
                after[n].push(layer);
                layer = before;
            }
            after[n].reverse();
            to_go = (0..=STORAGE_STEPS).map(|i| layer.value(SHUT, 0, i)).collect();
            until = w.flow.start();
        }
        Policy { volume_step, after }
    }

    /// The cost to go from `from`, with nothing but inflow until `until`.
    fn filled(&self, from: units::Utc, until: units::Utc, to_go: &[f64], step: f64) -> Vec<f64> {
        let Ok(gap) = Window::new(from, until) else { return to_go.to_vec() };
        let cost = |i: usize| {
            let (v, cost) = self.fill(&gap, i as f64 * step);
            cost + line(to_go, v / step)
        };
        (0..=STORAGE_STEPS).map(cost).collect()
    }

    fn backward(&self, w: &ReleaseWindow, slot: &Window, next: &Layer, step: f64) -> Layer {
        let modes = mode_count(self);
        let mut layer = Layer { values: vec![0.0; next.values.len()], ..next.clone() };
        let mut in_mode = vec![0.0; modes];
        for used in 0..next.used_count {
            for i in 0..=STORAGE_STEPS {
                let (v, u) = (i as f64 * step, used as f64 * next.used_step);
                for (mode, cost) in in_mode.iter_mut().enumerate() {
                    let p = self.pass(w, slot, mode, v, u);
                    *cost = p.cost + next.at(mode, p.used, p.volume / step);
                }
                for from in 0..modes {
                    let best = choices(self, from)
                        .map(|to| in_mode[to] + switching(from, to))
                        .fold(f64::INFINITY, f64::min);
                    layer.set(from, used, i, best);
                }
            }
        }
        layer
    }
}

impl Layer {
    /// The same cost whatever has been used and in whatever mode.
    fn level(w: &ReleaseWindow, modes: usize, to_go: &[f64]) -> Self {
        let wanted = (w.allotment_m3.min(1e6) / USED_STEP_M3).ceil() as usize;
        let steps = wanted.clamp(1, USED_STEPS_MOST);
        let used_step = w.allotment_m3.min(1e6).max(1.0) / steps as f64;
        let used_count = steps + 1;
        let values = to_go.repeat(modes * used_count);
        Self { used_step, used_count, modes, values }
    }
    fn index(&self, mode: Mode, used: usize, i: usize) -> usize {
        debug_assert!(mode < self.modes && used < self.used_count);
        (mode * self.used_count + used) * (STORAGE_STEPS + 1) + i
    }
    fn value(&self, mode: Mode, used: usize, i: usize) -> f64 {
        self.values[self.index(mode, used, i)]
    }
    fn set(&mut self, mode: Mode, used: usize, i: usize, value: f64) {
        let at = self.index(mode, used, i);
        self.values[at] = value;
    }
    /// Straight between the grid's points in both volumes; `steps` is the storage volume in steps.
    pub(crate) fn at(&self, mode: Mode, used: f64, steps: f64) -> f64 {
        let u = (used / self.used_step).clamp(0.0, (self.used_count - 1) as f64);
        let low = (u.floor() as usize).min(self.used_count - 1);
        let high = (low + 1).min(self.used_count - 1);
        let row = |n: usize| {
            let start = self.index(mode, n, 0);
            line(&self.values[start..=start + STORAGE_STEPS], steps)
        };
        let (a, share) = (row(low), u - low as f64);
        if share == 0.0 { a } else { a + (row(high) - a) * share }
    }
}

/// A value between the points of a line, the ends held.
fn line(values: &[f64], at: f64) -> f64 {
    let last = values.len() - 1;
    let x = at.clamp(0.0, last as f64);
    let low = (x.floor() as usize).min(last.saturating_sub(1));
    let share = x - low as f64;
    values[low] + (values[low + 1] - values[low]) * share
}
