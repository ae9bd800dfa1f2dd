//! Forwards from now: the best choice at each slot, carried out minute by minute with the true
//! relation, the ramp, and every cap exact.

use model::ClauseId;
use units::{Span, Utc, Window};

use crate::dp::{Mode, Solved, ToGo, WORTH_M3};
use crate::ledger::Ledger;
use crate::problem::{Problem, SLOT};
use crate::throttle::{Bound, Room, Throttle};
use crate::windows::{Period, SlotData};

/// One slot of a period as it will go.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Step {
    pub slot: Window,
    pub period: usize,
    pub window: Option<usize>,
    pub does: Does,
    pub released_m3: f64,
    pub energy_kwh: f64,
    /// Storage volumes at its start and in its middle.
    pub volume_start: f64,
    pub volume_middle: f64,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) enum Does {
    Idle(Idle),
    /// `target_m3_s`: the most that the flow may be in the slot, heads aside.
    Release {
        pumps: usize,
        target_m3_s: f64,
        bound: Bound,
    },
}

/// Why nothing is released in a slot that lies in a window.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Idle {
    Used(ClauseId),
    Low,
    NoHead,
    Waiting,
    Between,
}

/// The whole trajectory.
#[derive(Clone, PartialEq, Debug, Default)]
pub(crate) struct Path {
    pub steps: Vec<Step>,
    /// (from, to, m3) over the weir.
    pub spills: Vec<(Utc, Utc, f64)>,
    /// (instant, storage volume), in order.
    pub volumes: Vec<(Utc, f64)>,
    /// For each period, the volume that it had, and the longer cap if one made it less.
    pub allotments: Vec<(f64, Option<ClauseId>)>,
    pub cost: f64,
}

impl Path {
    pub(crate) fn released_m3(&self) -> f64 {
        self.steps.iter().map(|s| s.released_m3).sum()
    }
    pub(crate) fn in_period(&self, period: usize) -> f64 {
        let of_period = self.steps.iter().filter(|s| s.period == period);
        of_period.map(|s| s.released_m3).sum()
    }
}

const MINUTE: Span = Span::minutes(1);
/// What is left of a cap or a storage that is as good as nothing for a reason to name it.
const AS_GOOD_AS_NONE_M3: f64 = 250.0;
/// A line is solved again when the storage has strayed from it by so much, by a spill.
const STRAYED_M3: f64 = 20.0;
/// How far a running release may be over the ramp that ends with the window and still be let ramp
/// down: the engine steps by the minute, and a plan is dated back to the grid.
const LATE_S: f64 = 120.0;

/// The state that is carried from minute to minute.
struct Walk<'a> {
    problem: &'a Problem<'a>,
    path: Path,
    volume: f64,
    mode: Mode,
    throttle: Throttle,
    ledgers: Vec<Ledger>,
    /// Released in this period.
    used: f64,
}

/// The line that a period is on, from some slot.
struct OnLine {
    solved: Option<Solved>,
    volume: f64,
    used: f64,
}

pub(crate) fn walk(problem: &Problem, after: &[ToGo]) -> Path {
    let request = problem.request;
    let start = request.span.start();
    let running = request.flow_now.get() > 0.0;
    let ledger = |c| Ledger::new(c, start, running);
    let mut walk = Walk {
        problem,
        path: Path::default(),
        volume: problem.volume_now,
        mode: if running { Mode::Open(0) } else { Mode::Shut },
        throttle: Throttle { flow_m3_s: request.flow_now.get(), closing: None },
        ledgers: request.caps.iter().map(ledger).collect(),
        used: 0.0,
    };
    walk.path.volumes.push((start, walk.volume));
    let mut t = start;
    for (n, period) in problem.periods.iter().enumerate() {
        if period.start() > t {
            walk.shut();
            walk.fill(t, period.start());
        }
        walk.period(n, period, &after[n]);
        t = period.end();
    }
    walk.fill(t, request.span.end());
    let kept = (walk.volume - problem.volume_low).max(0.0);
    walk.path.cost += kept * problem.prices.stored_at_end_m3;
    walk.path
}

impl Walk<'_> {
    fn shut(&mut self) {
        self.mode = Mode::Shut;
        self.throttle = Throttle::SHUT;
    }

    fn fill(&mut self, from: Utc, to: Utc) {
        let mut t = from;
        while t < to {
            let next = (t.floor_to(SLOT) + SLOT).min(to);
            self.gain(t, next, 0.0);
            t = next;
        }
    }

    fn gain(&mut self, from: Utc, to: Utc, released: f64) {
        let gain = self.problem.inflow_m3(from, to) - released;
        let spilled = self.problem.spilled(self.volume + gain).1;
        let (kept, cost) = self.problem.kept(self.volume, gain, (to - from).as_hours());
        if spilled > 0.0 {
            match self.path.spills.last_mut().filter(|s| s.1 == from) {
                Some(spill) => (spill.1, spill.2) = (to, spill.2 + spilled),
                None => self.path.spills.push((from, to, spilled)),
            }
        }
        self.volume = kept;
        self.path.cost += cost;
        self.path.volumes.push((to, kept));
    }

    fn period(&mut self, n: usize, period: &Period, after: &ToGo) {
        self.used = 0.0;
        let whole = Window::new(period.start(), period.end()).expect("a period has slots");
        let by_long = self.ledgers.iter().map(|l| (l.left_by_end(&whole), Some(l.clause)));
        let least = by_long.fold((period.allotment_m3, None), |a, b| if b.0 < a.0 { b } else { a });
        self.path.allotments.push(least);
        let mut on = OnLine { solved: None, volume: f64::NAN, used: 0.0 };
        let mut inflow = 0.0;
        for (i, s) in period.slots.iter().enumerate() {
            let strayed = (self.volume + self.used - inflow - on.volume - on.used).abs();
            if i == 0 || strayed > STRAYED_M3 {
                let left = least.0 - self.used;
                let begun = period.begun || self.used > 0.0;
                let solved = self.problem.solve_line(period, i, self.volume, left, begun, after);
                on = OnLine { solved, volume: self.volume, used: self.used };
                inflow = 0.0;
            }
            self.slot(n, period, i, &on);
            inflow += s.inflow_m3;
        }
        self.used = 0.0;
    }

    /// What is left for a release in this piece, and the cap that leaves no more.
    fn left(&self, period: &Period, piece: &Window) -> (f64, Option<ClauseId>) {
        let tide = ((period.allotment_m3 - self.used).max(0.0), period.volume_by);
        let long = self.ledgers.iter().map(|l| (l.left(piece), Some(l.clause)));
        long.fold(tide, |a, b| if b.0 < a.0 { b } else { a })
    }

    /// Decides on one slot and carries it out.
    fn slot(&mut self, n: usize, period: &Period, i: usize, on: &OnLine) {
        let s = &period.slots[i];
        let left = self.left(period, &s.slot);
        self.decide(period, i, on, left.0);
        let volume_start = self.volume;
        let step = Step {
            slot: s.slot,
            period: n,
            window: s.window,
            does: Does::Idle(self.idle(s, left)),
            released_m3: 0.0,
            energy_kwh: 0.0,
            volume_start,
            volume_middle: volume_start,
        };
        let step = match self.mode {
            Mode::Shut => {
                self.gain(s.slot.start(), s.slot.end(), 0.0);
                step
            }
            Mode::Open(pumps) => self.release(period, s, pumps, step),
        };
        self.path.steps.push(step);
    }

    fn idle(&self, s: &SlotData, (left, clause): (f64, Option<ClauseId>)) -> Idle {
        let none = AS_GOOD_AS_NONE_M3;
        match clause {
            _ if s.window.is_none() => Idle::Between,
            Some(clause) if left < none => Idle::Used(clause),
            _ if self.volume - self.problem.volume_low < none => Idle::Low,
            _ if !self.problem.head_lasts(self.volume, s.outer_most_m) => Idle::NoHead,
            _ => Idle::Waiting,
        }
    }

    fn decide(&mut self, period: &Period, i: usize, on: &OnLine, left: f64) {
        let s = &period.slots[i];
        let Some(w) = s.window else { return self.shut() };
        let flow = self.throttle.flow_m3_s;
        let left_s = (self.problem.windows[w].flow.end() - s.slot.start()).as_seconds();
        // Too late to ramp down in time: the engine shuts it, and the plan asks for nothing.
        if flow > self.problem.ramp_m3_s2 * (left_s + LATE_S) {
            return self.shut();
        }
        let (ramp, able) = (self.problem.ramp_m3_s2, self.able_m3_s(period, s));
        match self.mode {
            Mode::Open(pumps) if self.throttle.closing.is_some() || self.must_close(s, pumps) => {
                self.throttle.close(ramp, able);
                let carried = self.problem.head_lasts(self.volume, s.outer_most_m)
                    && self.problem.may_change(s, period.tide, pumps, 0, self.volume);
                self.mode = Mode::Open(if carried { 0 } else { pumps });
            }
            _ => match self.best(period, i, on, left) {
                Mode::Shut if self.mode == Mode::Shut => {}
                Mode::Shut => self.throttle.close(ramp, able),
                open => self.open(open),
            },
        }
        if self.throttle.is_shut() {
            self.shut();
        }
    }

    /// What head and running pumps give at the slot's start.
    fn able_m3_s(&self, period: &Period, s: &SlotData) -> f64 {
        let pumps = if let Mode::Open(pumps) = self.mode { pumps } else { 0 };
        let gravity = self.problem.gravity_m3_s(self.volume, self.problem.outer_m(s.slot.start()));
        gravity.max(self.problem.pumped_m3_s(pumps, period.tide))
    }

    /// Gravity alone, and the head may be gone by the time that a closing begun after this slot has
    /// ended and the lead is over.
    fn must_close(&self, s: &SlotData, pumps: usize) -> bool {
        if pumps > 0 {
            return false;
        }
        let p = self.problem;
        let ramp_s = self.throttle.flow_m3_s / p.ramp_m3_s2;
        let until = s.slot.end() + p.request.closing_lead + Span::from_seconds_f64(ramp_s);
        let drawn = self.throttle.flow_m3_s * (s.slot.length().as_seconds() + ramp_s);
        !p.head_lasts(self.volume - drawn, p.outer_most_m(s.slot.start(), until))
    }

    /// Counts strokes and starts.
    fn open(&mut self, to: Mode) {
        let prices = &self.problem.prices;
        let count = |m| if let Mode::Open(p) = m { p } else { 0 };
        if self.mode == Mode::Shut {
            self.path.cost += if self.used > 0.0 { prices.reopening } else { prices.opening };
        }
        let starts = count(to).saturating_sub(count(self.mode));
        self.path.cost += prices.pump_start * starts as f64;
        self.mode = to;
    }

    /// The cheapest choice; of equal ones the first, which is to stay shut.
    fn best(&self, period: &Period, i: usize, on: &OnLine, left: f64) -> Mode {
        let Some(solved) = on.solved.as_ref().filter(|_| left >= WORTH_M3) else {
            return Mode::Shut;
        };
        debug_assert!(i >= solved.first_slot());
        let (p, s) = (self.problem, &period.slots[i]);
        let used = self.used - on.used;
        let hours = s.slot.length().as_hours();
        let cost_shut =
            p.kept(self.volume, s.inflow_m3, hours).1 + solved.at(i + 1, Mode::Shut, used);
        let mut best = match self.mode {
            Mode::Open(pumps) if pumps > 0 && !s.pumps_may_change => (f64::INFINITY, Mode::Shut),
            _ => (cost_shut, Mode::Shut),
        };
        for to in 0..=p.pumps.len() {
            let Some(cost) = self.cost_open(period, i, solved, used, to, left) else { continue };
            if cost < best.0 - 1e-9 {
                best = (cost, Mode::Open(to));
            }
        }
        best.1
    }

    /// Cost of having `to` pumps in slot `i`, or of opening with them; `None` if it may not be.
    fn cost_open(
        &self,
        period: &Period,
        i: usize,
        solved: &Solved,
        used: f64,
        to: usize,
        left: f64,
    ) -> Option<f64> {
        let p = self.problem;
        let s = &period.slots[i];
        let from = if let Mode::Open(from) = self.mode { from } else { 0 };
        if !p.may_change(s, period.tide, from, to, self.volume)
            || (to > from && !self.runs_long(period, s, to, left))
        {
            return None;
        }
        let (slots, m3, cost) = match self.mode {
            // An opening is followed along its ramp, as the backward pass did.
            Mode::Shut => {
                let slots = p.ramp_slots(period, i);
                let of_ramp = &period.slots[i..i + slots];
                let (m3, cost) = p.opened(of_ramp, period.tide, to, self.volume)?;
                (slots, m3, cost)
            }
            Mode::Open(_) => {
                let passed = p.passes(s, period.tide, to, self.volume, None)?;
                let gain = s.inflow_m3 - passed.m3;
                let kept = p.kept(self.volume, gain, s.slot.length().as_hours()).1;
                (1, passed.m3, kept + p.energy(s, period.tide, to) + p.trickle(&passed))
            }
        };
        let prices = &p.prices;
        let again = period.begun || self.used > 0.0;
        let stroke = match self.mode {
            Mode::Open(_) => 0.0,
            Mode::Shut if again => prices.reopening,
            Mode::Shut => prices.opening,
        };
        let starts = prices.pump_start * to.saturating_sub(from) as f64;
        Some(cost + stroke + starts + solved.at(i + slots, Mode::Open(to), used + m3))
    }

    /// Whether what is left lets a pump that starts now run for its least time.
    fn runs_long(&self, period: &Period, s: &SlotData, pumps: usize, left: f64) -> bool {
        let p = self.problem;
        let Some(w) = s.window else { return false };
        let flow = p.pumped_m3_s(pumps, period.tide).max(self.throttle.flow_m3_s);
        let (ramp_s, run_s) = (flow / p.ramp_m3_s2, p.pump_run_min.as_seconds());
        let needs_m3 = flow * (run_s + ramp_s / 2.0);
        let left_s = (p.windows[w].flow.end() - s.slot.start()).as_seconds();
        left >= needs_m3 && self.volume - p.volume_low >= needs_m3 && left_s >= run_s + ramp_s
    }

    /// One slot of flow, minute by minute.
    fn release(&mut self, period: &Period, s: &SlotData, pumps: usize, step: Step) -> Step {
        let p = self.problem;
        let w = &p.windows[s.window.expect("a release lies in a window")];
        let pumped = p.pumped_m3_s(pumps, period.tide);
        let target_m3_s = self.throttle.most(p.ramp_m3_s2, w, &s.slot);
        let (mut released, mut most, mut volume_middle) = (0.0, (0.0, Bound::Ramp), self.volume);
        let mut ran = Span::ZERO;
        let mut t = s.slot.start();
        while t < s.slot.end() && self.mode != Mode::Shut {
            let piece = Window::new(t, (t + MINUTE).min(s.slot.end())).expect("a minute");
            let (left, clause) = self.left(period, &piece);
            let room = Room {
                volume: self.volume,
                inflow_m3: p.inflow_m3(piece.start(), piece.end()),
                left_m3: left,
                left_by: clause,
                pumped_m3_s: pumped,
            };
            let (out, bound) = self.throttle.pass(p, w, &piece, &room);
            self.ledgers.iter_mut().for_each(|l| l.add(&piece, out));
            self.used += out;
            released += out;
            if out > most.0 {
                most = (out, bound);
            }
            self.gain(piece.start(), piece.end(), out);
            if piece.start() <= s.slot.start() + s.slot.length().scaled(0.5) {
                volume_middle = self.volume;
            }
            ran += piece.length();
            t = piece.end();
            if self.throttle.is_shut() {
                self.shut();
            }
        }
        if t < s.slot.end() {
            self.gain(t, s.slot.end(), 0.0);
        }
        let energy_kwh = p.pump_kw(pumps, period.tide) * ran.as_hours();
        self.path.cost += energy_kwh * p.prices.energy_per_kwh;
        if released <= 0.0 {
            return step;
        }
        let does = Does::Release { pumps, target_m3_s, bound: most.1 };
        Step { does, released_m3: released, energy_kwh, volume_middle, ..step }
    }
}
