//! The forward pass's choice at the start of each slot.

use units::Span;

use crate::dp::{Mode, Solved, WORTH_M3};
use crate::windows::{Period, SlotData};

use super::{OnLine, Walk};

/// How far a running release may be over the ramp that ends with the window and still be let ramp
/// down: the engine steps by the minute, and a plan is dated back to the grid.
const LATE_S: f64 = 120.0;

impl Walk<'_> {
    pub(super) fn decide(&mut self, period: &Period, i: usize, on: &OnLine, left: f64) {
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
                let carried = self.volume > s.volume_head
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
        self.volume - drawn <= p.volume_head(p.outer_most_m(s.slot.start(), until))
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
        if self.mode == Mode::Shut && !self.opens_for_good(period, i) {
            return None;
        }
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

    /// Whether an opening now is not soon cut short by a longer cap that only has to age. If less
    /// than half of what the tide will have may leave at once, it waits rather than open twice.
    fn opens_for_good(&self, period: &Period, i: usize) -> bool {
        let s = &period.slots[i];
        let (now, end) = (s.slot.start(), period.end());
        let aim = s.window.map_or(0.0, |w| self.problem.windows[w].flow_aim_m3_s);
        let tide = period.allotment_m3.min(self.limit) - self.used;
        let all = self.ledgers.iter().map(|l| l.left_later(now, end)).fold(tide, f64::min);
        let at_once = self.left(period, &s.slot).0 >= all / 2.0;
        at_once
            || period.slots[i..].iter().all(|later| {
                let at = later.slot.end();
                let wanted = all.min(aim * (at - now).as_seconds());
                self.ledgers.iter().all(|l| l.left_later(now, at) + 1.0 >= wanted)
            })
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
}
