//! Forwards from now: the best choice at each slot, carried out minute by minute with the true
//! relation, the ramp, and volumes exact.

use model::TideNumber;
use units::{Span, Utc, Window};

use crate::dp::{GRAVITY, Mode, Policy, SHUT, choices, switching};
use crate::problem::Problem;
use crate::windows::ReleaseWindow;

/// One slot as it will go.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Step {
    pub slot: Window,
    /// Which release window it belongs to.
    pub window: usize,
    pub mode: Mode,
    /// What the slot aims at, m3/s.
    pub target_m3_s: f64,
    pub released_m3: f64,
    pub energy_kwh: f64,
    pub limited: Limited,
    /// The storage level in the middle of it.
    pub level_m: f64,
}

/// What keeps a slot's flow from being more.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Limited {
    Shut,
    Cap,
    Head,
    Pump,
    Ramp,
    Allotment,
    StorageLow,
}

/// The whole trajectory.
#[derive(Clone, PartialEq, Debug, Default)]
pub(crate) struct Path {
    pub steps: Vec<Step>,
    /// (from, to, m3) over the weir.
    pub spills: Vec<(Utc, Utc, f64)>,
    /// (instant, storage volume), in order.
    pub volumes: Vec<(Utc, f64)>,
    pub inflow_m3: f64,
}

impl Path {
    pub(crate) fn released_m3(&self) -> f64 {
        self.steps.iter().map(|s| s.released_m3).sum()
    }
    pub(crate) fn in_tide(&self, windows: &[ReleaseWindow], tide: TideNumber) -> f64 {
        let of_tide = self.steps.iter().filter(|s| windows[s.window].tide == tide);
        of_tide.map(|s| s.released_m3).sum()
    }
}

const MINUTE: Span = Span::minutes(1);
const SLOT: Span = crate::problem::SLOT;

/// The state that is carried from minute to minute.
struct Walk<'a> {
    problem: &'a Problem<'a>,
    path: Path,
    volume: f64,
    flow: f64,
}

pub(crate) fn walk(problem: &Problem, policy: &Policy) -> Path {
    let flow = problem.request.flow_now.get();
    let mut walk = Walk { problem, path: Path::default(), volume: problem.volume_now, flow };
    let mut t = problem.request.span.start();
    walk.path.volumes.push((t, walk.volume));
    let mut mode = if flow > 0.0 { GRAVITY } else { SHUT };
    for (n, w) in problem.windows.iter().enumerate() {
        if w.flow.start() > t {
            walk.fill(t, w.flow.start());
            (mode, walk.flow) = (SHUT, 0.0);
        }
        let same_tide = problem.windows[..n].iter().any(|o| o.tide == w.tide);
        let mut used = if same_tide { walk.path.in_tide(&problem.windows, w.tide) } else { 0.0 };
        for (slot, after) in w.slots.iter().zip(&policy.after[n]) {
            let state = (walk.volume, used);
            mode = best(problem, w, slot, mode, state, after, policy.volume_step);
            used += walk.slot(n, slot, mode, used);
        }
        t = w.flow.end();
    }
    walk.fill(t, problem.request.span.end());
    walk.path
}

/// The cheapest choice; of equal ones the first, which is to stay shut.
fn best(
    problem: &Problem,
    w: &ReleaseWindow,
    slot: &Window,
    from: Mode,
    (volume, used): (f64, f64),
    after: &crate::dp::Layer,
    step: f64,
) -> Mode {
    let mut best = (f64::INFINITY, SHUT);
    for to in choices(problem, from) {
        let p = problem.pass(w, slot, to, volume, used);
        let cost = p.cost + after.at(to, p.used, p.volume / step) + switching(from, to);
        if cost < best.0 - 1e-12 {
            best = (cost, to);
        }
    }
    best.1
}

impl Walk<'_> {
    fn fill(&mut self, from: Utc, to: Utc) {
        let mut t = from;
        while t < to {
            let next = (t.floor_to(SLOT) + SLOT).min(to);
            self.add_inflow(t, next, 0.0);
            t = next;
        }
    }

    fn add_inflow(&mut self, from: Utc, to: Utc, released: f64) {
        let inflow = self.problem.inflow_m3(from, to);
        self.path.inflow_m3 += inflow;
        let (kept, spilled) = self.problem.spilled(self.volume + inflow - released);
        if spilled > 0.0 {
            match self.path.spills.last_mut().filter(|s| s.1 == from) {
                Some(spill) => (spill.1, spill.2) = (to, spill.2 + spilled),
                None => self.path.spills.push((from, to, spilled)),
            }
        }
        self.volume = kept;
        self.path.volumes.push((to, kept));
    }

    /// One slot, minute by minute; gives what was released.
    fn slot(&mut self, n: usize, slot: &Window, mode: Mode, used: f64) -> f64 {
        let p = self.problem;
        let w = &p.windows[n];
        let level_m = p.storage.level_m(self.volume);
        let (mut released, mut kwh) = (0.0, 0.0);
        let (mut target, mut limited) = (0.0, Limited::Shut);
        let mut t = slot.start();
        while t < slot.end() {
            let next = (t + MINUTE).min(slot.end());
            let dt = (next - t).as_seconds();
            let (aim, why) = self.aim(w, t, mode, used + released);
            let inflow = p.inflow_m3(t, next);
            let above = (self.volume + inflow - p.volume_low).max(0.0);
            let left = (w.allotment_m3 - used - released).max(0.0);
            let volume = (aim * dt).min(above).min(left);
            let why = if volume >= aim * dt { why } else { short(above, left, why) };
            if aim > target || limited == Limited::Shut {
                (target, limited) = (aim, why);
            }
            self.flow = volume / dt;
            released += volume;
            if mode > GRAVITY {
                kwh += p.pump_kw(mode - GRAVITY) * dt / 3600.0;
            }
            self.add_inflow(t, next, volume);
            t = next;
        }
        self.path.steps.push(Step {
            slot: *slot,
            window: n,
            mode,
            target_m3_s: target,
            released_m3: released,
            energy_kwh: kwh,
            limited,
            level_m,
        });
        released
    }

    /// The flow to aim at in this minute, and what limits it.
    fn aim(&self, w: &ReleaseWindow, t: Utc, mode: Mode, used: f64) -> (f64, Limited) {
        let p = self.problem;
        if mode == SHUT {
            return (0.0, Limited::Shut);
        }
        let level_m = p.storage.level_m(self.volume);
        let gravity = p.gravity_m3_s(level_m, t);
        let pumped = if mode > GRAVITY { p.pumped_m3_s(mode - GRAVITY) } else { 0.0 };
        let able = gravity.max(pumped);
        let mut best = if able < w.flow_aim_m3_s {
            (able, if pumped >= gravity { Limited::Pump } else { Limited::Head })
        } else {
            (w.flow_aim_m3_s, Limited::Cap)
        };
        // A fixed-speed pump cannot be ramped; everything else is.
        if pumped < gravity || pumped == 0.0 {
            let middle = t + Span::seconds(30);
            let ramp = p.ramp_m3_s2;
            let left_s = (w.flow.end() - middle).as_seconds().max(0.0);
            let rising = self.flow + ramp * 60.0;
            let tail = (2.0 * ramp * (w.allotment_m3 - used).max(0.0)).sqrt();
            for (limit, why) in [
                (ramp * left_s, Limited::Ramp),
                (rising, Limited::Ramp),
                (tail, Limited::Allotment),
            ] {
                if limit < best.0 {
                    best = (limit, why);
                }
            }
        }
        best
    }
}

const fn short(above: f64, left: f64, otherwise: Limited) -> Limited {
    if left <= above {
        Limited::Allotment
    } else if above.is_finite() {
        Limited::StorageLow
    } else {
        otherwise
    }
}
