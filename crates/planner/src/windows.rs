//! Where a release may be: lawful windows with their margins, and the periods (one a tide) of slots
//! that the programme decides on.

use model::{ClauseId, EdgeAnchor, LawfulWindow, PlanRequest, Site, TideNumber};
use units::{Span, Utc, Window};

use crate::problem::{Problem, SLOT};

/// A lawful window less its margins (once: rule 12).
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct ReleaseWindow {
    pub lawful: Window,
    pub tide: TideNumber,
    /// Flow at the gate begins no earlier and has ended at `flow.end()`: the ports run dry by the
    /// lawful end. It may go on past the plan's end.
    pub flow: Window,
    pub shuts_by: Option<ClauseId>,
    pub flow_aim_m3_s: f64,
    pub flow_by: Option<ClauseId>,
    /// What is left of the tide's volume, and the clause that sets it.
    pub allotment_m3: f64,
    pub volume_by: Option<ClauseId>,
}

/// The release windows of one tide and the slots over them, without gaps.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Period {
    pub tide: TideNumber,
    /// Something was released on this tide before the plan begins.
    pub begun: bool,
    pub allotment_m3: f64,
    pub volume_by: Option<ClauseId>,
    pub slots: Vec<SlotData>,
}

impl Period {
    pub(crate) fn start(&self) -> Utc {
        self.slots[0].slot.start()
    }
    pub(crate) fn end(&self) -> Utc {
        self.slots[self.slots.len() - 1].slot.end()
    }
}

/// One slot and what is known of it whatever is decided.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct SlotData {
    pub slot: Window,
    /// The release window that it lies in; `None` between two windows of one tide.
    pub window: Option<usize>,
    pub inflow_m3: f64,
    /// What gravity passes in the slot's middle, m3/s, by storage volume: see [`Gravity`].
    pub gravity: Gravity,
    /// Over this storage volume the head lasts from the slot's start to its end and the closing
    /// lead after it.
    pub volume_head: f64,
    /// The most that the flow aim and the ramp down to the window's end pass in the slot.
    pub most_m3: f64,
    /// Whether a pump may start or stop at the slot's start.
    pub pumps_may_change: bool,
}

/// The head-flow relation of one instant on even steps of the storage's volume, for decisions alone:
/// what is then carried out is worked out afresh. A step is 2 cm of the demonstration site's lagoon.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Gravity {
    low: f64,
    step: f64,
    flows_m3_s: Vec<f64>,
}

impl Gravity {
    const STEPS: usize = 128;

    fn of(problem: &Problem, outer_m: f64) -> Self {
        let low = problem.volume_low;
        let step = (problem.volume_spill - low) / Self::STEPS as f64;
        let flow = |i: usize| problem.gravity_m3_s(low + i as f64 * step, outer_m);
        Self { low, step, flows_m3_s: (0..=Self::STEPS).map(flow).collect() }
    }
    pub(crate) fn m3_s(&self, volume: f64) -> f64 {
        let at = ((volume - self.low) / self.step).clamp(0.0, Self::STEPS as f64);
        let i = (at as usize).min(Self::STEPS - 1);
        let (a, b) = (self.flows_m3_s[i], self.flows_m3_s[i + 1]);
        a + (b - a) * (at - i as f64)
    }
}

/// A release shorter than this is not worth a stroke.
const SHORTEST: Span = Span::minutes(10);
/// A flow that no clause caps is capped by what nobody builds.
const FLOW_MOST_M3_S: f64 = 1e3;

pub(crate) fn release_windows(site: &Site, request: &PlanRequest) -> Vec<ReleaseWindow> {
    let each = request.lawful.windows.iter();
    each.filter_map(|w| release_window(site, request, w)).collect()
}

fn release_window(site: &Site, request: &PlanRequest, w: &LawfulWindow) -> Option<ReleaseWindow> {
    let settings = &site.settings;
    let band = |anchor, sd: Span| match anchor {
        EdgeAnchor::Modelled => sd.scaled(settings.band_sigmas),
        EdgeAnchor::Predicted | EdgeAnchor::SpanEnd => Span::ZERO,
    };
    let at_start = settings.clock_margin + band(w.opens.anchor, w.opens.time_sd);
    let drain_down = site.outlets[request.outlet].drain_down;
    let at_end = settings.clock_margin + band(w.shuts.anchor, w.shuts.time_sd) + drain_down;
    let whole = w.window.trimmed(at_start, at_end)?;
    let flow = Window::new(whole.start().max(request.span.start()), whole.end()).ok()?;
    // A release that runs already is not held to a least length.
    let running = request.flow_now.get() > 0.0 && flow.start() == request.span.start();
    if flow.start() >= request.span.end() || (flow.length() < SHORTEST && !running) {
        return None;
    }
    let used_m3 = used_m3(request, w.tide);
    let cap_m3 = w.volume_max.map_or(f64::INFINITY, |c| c.max.get());
    let flow_cap = w.flow_max.map_or(FLOW_MOST_M3_S, |c| c.max.get());
    Some(ReleaseWindow {
        lawful: w.window,
        tide: w.tide,
        flow,
        shuts_by: w.shuts.clause,
        flow_aim_m3_s: flow_cap * settings.flow_aim,
        flow_by: w.flow_max.map(|c| c.clause),
        allotment_m3: (cap_m3 - used_m3).max(0.0),
        volume_by: w.volume_max.map(|c| c.clause),
    })
}

/// What the tide has used before the plan begins. A bucket that begins with the plan, of a release
/// that runs on, is left to the plan, which counts that water itself.
fn used_m3(request: &PlanRequest, tide: TideNumber) -> f64 {
    let used = request.used_tides.iter().filter(|(t, _)| *t == tide).map(|(_, v)| v.get()).sum();
    let now = request.span.start();
    let holds = request.lawful.holding(now).is_some_and(|w| w.tide == tide);
    if request.flow_now.get() <= 0.0 || !holds {
        return used;
    }
    let open = |past: &[(Window, units::CubicMetres)]| -> f64 {
        past.iter().filter(|(w, _)| w.start() >= now).map(|(_, v)| v.get()).sum()
    };
    let counted = request.caps.iter().map(|c| open(&c.past)).fold(0.0, f64::max);
    (used - counted).max(0.0)
}

/// Windows of one tide are one period; windows stand in order, and so do tides.
pub(crate) fn periods(problem: &Problem) -> Vec<Period> {
    let mut list: Vec<Period> = Vec::new();
    for (n, w) in problem.windows.iter().enumerate() {
        let until = w.flow.end().min(problem.request.span.end());
        match list.last_mut().filter(|p| p.tide == w.tide) {
            Some(p) => {
                cut(problem, None, p.end(), w.flow.start(), &mut p.slots);
                cut(problem, Some(n), w.flow.start(), until, &mut p.slots);
                p.allotment_m3 = p.allotment_m3.min(w.allotment_m3);
            }
            None => {
                let mut slots = Vec::new();
                cut(problem, Some(n), w.flow.start(), until, &mut slots);
                list.push(Period {
                    tide: w.tide,
                    begun: used_m3(problem.request, w.tide) > 0.0,
                    allotment_m3: w.allotment_m3,
                    volume_by: w.volume_by,
                    slots,
                });
            }
        }
    }
    list
}

/// The 5-minute grid, split at the edges given.
fn cut(problem: &Problem, window: Option<usize>, from: Utc, until: Utc, slots: &mut Vec<SlotData>) {
    let mut t = from;
    // Pumps that ran in an earlier window of the tide keep their rest.
    let mut changed = slots.iter().rev().find(|s| s.window.is_some()).map(|s| s.slot.end());
    while t < until {
        let next = (t.floor_to(SLOT) + SLOT).min(until);
        let slot = Window::new(t, next).expect("the next edge lies ahead");
        let pumps_may_change = changed.is_none_or(|c| c + problem.pump_block <= t);
        if pumps_may_change {
            changed = Some(t);
        }
        let lead = problem.request.closing_lead;
        slots.push(SlotData {
            slot,
            window,
            inflow_m3: problem.inflow_m3(t, next),
            gravity: Gravity::of(problem, problem.outer_m(t + slot.length().scaled(0.5))),
            volume_head: problem.volume_head(problem.outer_most_m(t, next + lead)),
            most_m3: window
                .map_or(0.0, |n| most_m3(&problem.windows[n], &slot, problem.ramp_m3_s2)),
            pumps_may_change,
        });
        t = next;
    }
}

/// The volume under the flow aim and the ramp that ends at the window's end.
fn most_m3(w: &ReleaseWindow, slot: &Window, ramp_m3_s2: f64) -> f64 {
    let left = |t: Utc| ramp_m3_s2 * (w.flow.end() - t).as_seconds();
    let (a, b) = (left(slot.start()), left(slot.end()));
    let (aim, dt) = (w.flow_aim_m3_s, slot.length().as_seconds());
    if b >= aim {
        aim * dt
    } else if a <= aim {
        (a + b) / 2.0 * dt
    } else {
        // The aim holds until the ramp cuts it.
        let on_ramp = (aim - b) / (a - b) * dt;
        aim * (dt - on_ramp) + (aim + b) / 2.0 * on_ramp
    }
}
