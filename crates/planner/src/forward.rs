//! Forwards from now: the best choice at each slot, carried out minute by minute with the true
//! relation, the ramp, and every cap exact.

mod decide;

use model::{ClauseId, PlanRequest};
use units::{Span, Utc, Window};

use crate::dp::{Mode, Solved, ToGo};
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

/// The state that is carried from minute to minute.
struct Walk<'a> {
    problem: &'a Problem<'a>,
    path: Path,
    volume: f64,
    mode: Mode,
    throttle: Throttle,
    ledgers: Vec<Ledger>,
    /// Released in this period, and the most that may be.
    used: f64,
    limit: f64,
}

/// The line that a period is on, from some slot.
struct OnLine {
    solved: Option<Solved>,
    volume: f64,
    used: f64,
}

/// `limits_m3`: what each period may release at the most, whatever its caps.
pub(crate) fn walk(problem: &Problem, after: &[ToGo], limits_m3: &[f64]) -> Path {
    let request = problem.request;
    let start = request.span.start();
    let running = request.flow_now.get() > 0.0;
    let ledger = |c| Ledger::new(c, start, running);
    let mut walk = Walk {
        problem,
        path: Path::default(),
        volume: problem.volume_now,
        mode: if running { Mode::Open(0) } else { Mode::Shut },
        throttle: Throttle { flow_m3_s: lawful_now(request), closing: None },
        ledgers: request.caps.iter().map(ledger).collect(),
        used: 0.0,
        limit: f64::INFINITY,
    };
    walk.path.volumes.push((start, walk.volume));
    let mut t = start;
    for (n, period) in problem.periods.iter().enumerate() {
        if period.start() > t {
            walk.shut();
            walk.fill(t, period.start());
        }
        walk.limit = limits_m3[n];
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
        let later = |l: &Ledger| l.left_later(period.start(), period.end());
        let by_long = self.ledgers.iter().map(|l| (later(l), Some(l.clause)));
        let least = by_long.fold((period.allotment_m3.min(self.limit), None), |a, b| {
            if b.0 < a.0 { b } else { a }
        });
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
        // Held back for a later tide's sake: then the longer cap is the reason.
        let tide = if self.limit < period.allotment_m3 {
            let later = |l: &&Ledger| l.left_later(piece.start(), period.end());
            let least = self.ledgers.iter().min_by(|a, b| later(a).total_cmp(&later(b)));
            (self.limit, least.map(|l| l.clause))
        } else {
            (period.allotment_m3, period.volume_by)
        };
        let tide = ((tide.0 - self.used).max(0.0), tide.1);
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
            _ if self.volume <= s.volume_head => Idle::NoHead,
            _ => Idle::Waiting,
        }
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

/// The flow to go on from: a running one that stands over its window's cap (a meter's error, or a
/// smaller tide begun) is taken down to it at once; no plan asks for more than a clause allows.
fn lawful_now(request: &PlanRequest) -> f64 {
    let window = request.lawful.holding(request.span.start());
    let cap = window.and_then(|w| w.flow_max).map_or(f64::INFINITY, |c| c.max.get());
    request.flow_now.get().min(cap)
}
