//! Backwards over the slots: the least cost to go from every storage volume, volume used this tide
//! and mode (shut; open with 0, 1, 2, ... pumps).
//!
//! While nothing spills, storage volume + volume used = the volume at the tide's beginning + inflow,
//! whatever is decided. So the states of a tide fall into *lines*, one for each volume that it may
//! begin with, and along a line the volume used is the only coordinate: the costs are exact in the
//! one and interpolated in the other. Where it spills, the storage stands at the crest, and what the
//! line then says is on the safe side; the forward pass solves its own line anew.
//!
//! Opening takes several slots at one stroke, until the ramp has reached the flow aimed at. Closing
//! is taken as immediate here, except towards the window's end; the forward pass ramps it.

use crate::actions::Passed;
use crate::problem::Problem;
use crate::windows::Period;

/// What the gate does, and how many pumps help.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Mode {
    Shut,
    Open(usize),
}

/// Least cost to go by storage volume, straight between the points and held beyond them.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct ToGo {
    low: f64,
    step: f64,
    values: Vec<f64>,
}

impl ToGo {
    pub(crate) fn at(&self, volume: f64) -> f64 {
        line(&self.values, (volume - self.low) / self.step)
    }
}

/// Grid of storage volumes between tides, m3.
const GAP_STEP_M3: f64 = 250.0;
/// Grid of the backward pass, m3; the forward pass solves its one line finer.
const STEP_M3: f64 = 250.0;
const FINE_STEP_M3: f64 = 100.0;
/// Less than this is not worth planning a release for.
pub(crate) const WORTH_M3: f64 = 25.0;

/// Which lines of a period to solve.
struct Lines {
    first_slot: usize,
    /// Volume at the first slot with nothing used, on line 0.
    base: f64,
    count: usize,
    /// Steps of the volume used, and their size.
    nodes: usize,
    step: f64,
    begun: bool,
}

/// Costs of a period from one slot on: at each slot's start, by mode, line and volume used.
pub(crate) struct Solved {
    lines: Lines,
    pumps: usize,
    /// One for each slot from the first, and one for the end.
    layers: Vec<Vec<f64>>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
struct Move {
    /// Whole steps of the volume used, and the rest of one.
    steps: usize,
    rest: f64,
    /// Not finite where the action is not allowed.
    cost: f64,
}

/// One action in one slot from each volume that a line can have: what is released and its cost.
struct Moves {
    each: Vec<Move>,
    /// How many slots it takes.
    slots: usize,
}

impl Problem<'_> {
    /// Least costs after each period, for the forward pass.
    pub(crate) fn solve(&self, allotments_m3: &[f64]) -> Vec<ToGo> {
        let mut after = Vec::with_capacity(self.periods.len());
        let kept = self.volume_spill - self.volume_low;
        let mut to_go = ToGo {
            low: self.volume_low,
            step: kept,
            values: vec![0.0, self.prices.stored_at_end_m3 * kept],
        };
        let mut until = self.request.span.end();
        for (period, allotment) in self.periods.iter().zip(allotments_m3).rev() {
            to_go = self.filled(period.end(), until, &to_go);
            after.push(to_go.clone());
            until = period.start();
            to_go = match self.lines_of(period, *allotment) {
                None => self.filled(period.start(), period.end(), &to_go),
                Some(lines) => self.solve_lines(period, lines, &to_go).beginnings(),
            };
        }
        after.reverse();
        after
    }

    fn lines_of(&self, period: &Period, allotment: f64) -> Option<Lines> {
        let allotment = self.possible(period, 0, self.volume_spill).min(allotment);
        if allotment < WORTH_M3 {
            return None;
        }
        let nodes = (allotment / STEP_M3).ceil().max(1.0) as usize;
        let step = allotment / nodes as f64;
        let count = ((self.volume_spill - self.volume_low) / step).ceil() as usize + 1;
        let (base, begun) = (self.volume_low, period.begun);
        Some(Lines { first_slot: 0, base, count, nodes, step, begun })
    }

    /// The one line that a period is on at slot `first_slot`, with `volume` in the storage and
    /// `allotment` left; `None` where nothing is worth releasing.
    pub(crate) fn solve_line(
        &self,
        period: &Period,
        first_slot: usize,
        volume: f64,
        allotment: f64,
        begun: bool,
        after: &ToGo,
    ) -> Option<Solved> {
        let allotment = self.possible(period, first_slot, volume).min(allotment);
        if allotment < WORTH_M3 {
            return None;
        }
        let nodes = (allotment / FINE_STEP_M3).ceil().max(1.0) as usize;
        let step = allotment / nodes as f64;
        let lines = Lines { first_slot, base: volume, count: 1, nodes, step, begun };
        Some(self.solve_lines(period, lines, after))
    }

    /// The most that the rest of a period could release from `volume`, heads aside.
    fn possible(&self, period: &Period, first_slot: usize, volume: f64) -> f64 {
        let slots = &period.slots[first_slot..];
        let most: f64 = slots.iter().map(|s| s.most_m3).sum();
        let inflow: f64 = slots.iter().map(|s| s.inflow_m3).sum();
        most.min((volume + inflow - self.volume_low).max(0.0))
    }

    /// Cost to go from `from`, with nothing but inflow until `until`.
    fn filled(&self, from: units::Utc, until: units::Utc, to_go: &ToGo) -> ToGo {
        let count = ((self.volume_spill - self.volume_low) / GAP_STEP_M3).ceil().max(1.0);
        let step = (self.volume_spill - self.volume_low) / count;
        let cost = |i: usize| {
            let (mut volume, mut cost) = (self.volume_low + i as f64 * step, 0.0);
            let mut t = from;
            while t < until {
                let next = (t + units::Span::hours(1)).min(until);
                let (kept, more) =
                    self.kept(volume, self.inflow_m3(t, next), (next - t).as_hours());
                (volume, cost, t) = (kept, cost + more, next);
            }
            cost + to_go.at(volume)
        };
        ToGo { low: self.volume_low, step, values: (0..=count as usize).map(cost).collect() }
    }

    /// Staying shut, or open with `pumps`, for slot `n`.
    fn moves(&self, period: &Period, l: &Lines, n: usize, mode: Mode, inflow: f64) -> Moves {
        let s = &period.slots[n];
        self.table(l, inflow, 1, |volume| {
            let (passed, energy) = match mode {
                Mode::Shut => (Passed::default(), 0.0),
                Mode::Open(p) => {
                    (self.passes(s, period.tide, p, volume, None)?, self.energy(s, period.tide, p))
                }
            };
            let hours = s.slot.length().as_hours();
            let (_, cost) = self.kept(volume, s.inflow_m3 - passed.m3, hours);
            Some((passed.m3, cost + energy + self.trickle(&passed)))
        })
    }

    /// Opening at slot `n` with `pumps`, until the ramp has reached the flow aimed at.
    fn opening(&self, period: &Period, l: &Lines, n: usize, pumps: usize, inflow: f64) -> Moves {
        let slots = self.ramp_slots(period, n);
        self.table(l, inflow, slots, |v| {
            self.opened(&period.slots[n..n + slots], period.tide, pumps, v)
        })
    }

    fn table(
        &self,
        l: &Lines,
        inflow: f64,
        slots: usize,
        of: impl Fn(f64) -> Option<(f64, f64)>,
    ) -> Moves {
        let each = (0..l.count + l.nodes).map(|m| {
            let raw = l.base + (m as f64 - l.nodes as f64) * l.step + inflow;
            match of(raw.min(self.volume_spill)) {
                None => Move { steps: 0, rest: 0.0, cost: f64::INFINITY },
                Some((m3, cost)) => {
                    let steps = m3 / l.step;
                    Move { steps: steps as usize, rest: steps.fract(), cost }
                }
            }
        });
        Moves { each: each.collect(), slots }
    }

    fn solve_lines(&self, period: &Period, lines: Lines, after: &ToGo) -> Solved {
        let slots = &period.slots[lines.first_slot..];
        let mut inflow = vec![0.0];
        for s in slots {
            inflow.push(inflow[inflow.len() - 1] + s.inflow_m3);
        }
        let pumps = self.pumps.len();
        let mut solved = Solved { lines, pumps, layers: Vec::with_capacity(slots.len() + 1) };
        let last = solved.end(self, inflow[slots.len()], after);
        solved.layers.push(last);
        // Latest first while they are made.
        for n in (0..slots.len()).rev() {
            let layer = self.backward(period, &solved, n, inflow[n]);
            solved.layers.push(layer);
        }
        solved.layers.reverse();
        solved
    }

    /// The layer at the start of slot `n` (counted from the first solved) from those after it.
    fn backward(&self, period: &Period, solved: &Solved, n: usize, inflow: f64) -> Vec<f64> {
        let l = &solved.lines;
        let s = &period.slots[l.first_slot + n];
        let at = l.first_slot + n;
        let shut = self.moves(period, l, at, Mode::Shut, inflow);
        if s.window.is_none() {
            return solved.only_shut(&shut);
        }
        let each = 0..=solved.pumps;
        let open: Vec<Moves> =
            each.clone().map(|p| self.moves(period, l, at, Mode::Open(p), inflow)).collect();
        let opening: Vec<Moves> = each
            .filter(|p| *p == 0 || s.pumps_may_change)
            .map(|p| self.opening(period, l, at, p, inflow))
            .collect();
        let volume = |m: usize| l.base + (m as f64 - l.nodes as f64) * l.step + inflow;
        let allowed: Vec<Vec<bool>> = (0..(solved.pumps + 1) * (solved.pumps + 1))
            .map(|k| (k / (solved.pumps + 1), k % (solved.pumps + 1)))
            .map(|(from, to)| {
                let may = |m| {
                    let v = volume(m).min(self.volume_spill);
                    self.may_change(s, period.tide, from, to, v)
                };
                (0..l.count + l.nodes).map(may).collect()
            })
            .collect();
        solved.layer(
            &Slotted { shut, open, opening, allowed, free: s.pumps_may_change },
            &self.prices,
        )
    }
}

/// Everything that one slot offers.
struct Slotted {
    shut: Moves,
    open: Vec<Moves>,
    opening: Vec<Moves>,
    /// By (pumps before, pumps in the slot), then by volume.
    allowed: Vec<Vec<bool>>,
    free: bool,
}

impl Solved {
    const fn width(&self) -> usize {
        self.lines.nodes + 1
    }
    fn row(&self, mode: usize, i: usize) -> core::ops::Range<usize> {
        let start = (mode * self.lines.count + i) * self.width();
        start..start + self.width()
    }
    fn end(&self, problem: &Problem, inflow: f64, after: &ToGo) -> Vec<f64> {
        let l = &self.lines;
        let mut one = Vec::with_capacity(l.count * self.width());
        for i in 0..l.count {
            for j in 0..=l.nodes {
                let raw = l.base + (i as f64 - j as f64) * l.step + inflow;
                one.push(after.at(raw.min(problem.volume_spill)));
            }
        }
        one.repeat(self.pumps + 2)
    }
    /// The layer that is `slots` after the one being made.
    fn ahead(&self, slots: usize) -> &[f64] {
        &self.layers[self.layers.len() - slots]
    }
    /// Costs of a move on line `i`, ending in `mode`, by the steps used so far.
    fn costs(&self, moves: &Moves, mode: usize, i: usize, costs: &mut [f64]) {
        let row = &self.ahead(moves.slots)[self.row(mode, i)];
        let last = self.lines.nodes;
        let of_line = moves.each[i..=i + last].iter().rev();
        for (j, (cost, m)) in costs.iter_mut().zip(of_line).enumerate() {
            let at = j + m.steps;
            *cost = m.cost
                + if at >= last { row[last] } else { row[at] + (row[at + 1] - row[at]) * m.rest };
        }
    }
    fn only_shut(&self, shut: &Moves) -> Vec<f64> {
        let mut one = vec![0.0; self.lines.count * self.width()];
        for i in 0..self.lines.count {
            self.costs(shut, 0, i, &mut one[i * self.width()..(i + 1) * self.width()]);
        }
        one.repeat(self.pumps + 2)
    }
    fn layer(&self, s: &Slotted, prices: &crate::prices::Prices) -> Vec<f64> {
        let (count, width) = (self.pumps + 1, self.width());
        let mut layer = vec![0.0; self.ahead(1).len()];
        let mut shut = vec![0.0; width];
        let mut other = vec![0.0; width];
        let mut open = vec![vec![0.0; width]; count];
        for i in 0..self.lines.count {
            self.costs(&s.shut, 0, i, &mut shut);
            for (p, costs) in open.iter_mut().enumerate() {
                self.costs(&s.open[p], p + 1, i, costs);
            }
            let best = &mut layer[self.row(0, i)];
            best.copy_from_slice(&shut);
            for (p, moves) in s.opening.iter().enumerate() {
                self.costs(moves, p + 1, i, &mut other);
                let starts = prices.pump_start * p as f64;
                let first = if self.lines.begun { prices.reopening } else { prices.opening };
                best[0] = best[0].min(other[0] + first + starts);
                for (b, o) in best.iter_mut().zip(&other).skip(1) {
                    *b = b.min(o + prices.reopening + starts);
                }
            }
            for from in 0..count {
                let best = &mut layer[self.row(from + 1, i)];
                match from == 0 || s.free {
                    true => best.copy_from_slice(&shut),
                    false => best.fill(f64::INFINITY),
                }
                for (to, costs) in open.iter().enumerate() {
                    let starts = prices.pump_start * to.saturating_sub(from) as f64;
                    let allowed = &s.allowed[from * count + to][i..i + width];
                    for ((b, c), a) in best.iter_mut().zip(costs).zip(allowed.iter().rev()) {
                        *b = if *a { b.min(c + starts) } else { *b };
                    }
                }
            }
        }
        layer
    }
    /// Cost to go at the first slot's start, shut and with nothing used, by volume.
    fn beginnings(&self) -> ToGo {
        let first = &self.layers[0];
        let values = (0..self.lines.count).map(|i| first[self.row(0, i).start]).collect();
        ToGo { low: self.lines.base, step: self.lines.step, values }
    }
    /// Cost to go on the one line at the start of slot `n` (of the period), in a mode, with `used`
    /// since the first slot solved.
    pub(crate) fn at(&self, n: usize, mode: Mode, used: f64) -> f64 {
        let mode = match mode {
            Mode::Shut => 0,
            Mode::Open(p) => p + 1,
        };
        let layer = &self.layers[n - self.lines.first_slot];
        line(&layer[self.row(mode, 0)], used / self.lines.step)
    }
    pub(crate) const fn first_slot(&self) -> usize {
        self.lines.first_slot
    }
}

/// A value between the points of a line, the ends held.
fn line(values: &[f64], at: f64) -> f64 {
    let last = values.len() - 1;
    let x = at.clamp(0.0, last as f64);
    let low = (x as usize).min(last.saturating_sub(1));
    let (a, b) = (values[low], values[(low + 1).min(last)]);
    let share = x - low as f64;
    // An end that is not finite (an action that is not allowed) is not mixed in by nought.
    if share == 0.0 { a } else { a + (b - a) * share }
}
