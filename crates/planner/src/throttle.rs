//! The gate as a throttle on the flow: up and down along the ramp, never over what head or pumps
//! give, and shut exactly when a volume is used up.

use model::ClauseId;
use units::Window;

use crate::problem::Problem;
use crate::windows::ReleaseWindow;

#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Throttle {
    pub flow_m3_s: f64,
    /// On its way to shut, with so much still to pass; not to be opened before it is.
    pub closing: Option<f64>,
}

/// What keeps the flow from being more.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Bound {
    Aim,
    Head,
    Pump,
    Ramp,
    Volume(ClauseId),
}

/// What a minute has to work with.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Room {
    pub volume: f64,
    pub inflow_m3: f64,
    pub left_m3: f64,
    pub left_by: Option<ClauseId>,
    pub pumped_m3_s: f64,
}

impl Throttle {
    pub(crate) const SHUT: Self = Self { flow_m3_s: 0.0, closing: None };

    /// Begins a ramp down from the flow that there is, `able_m3_s` at the most: q2 / 2r still passes.
    pub(crate) fn close(&mut self, ramp_m3_s2: f64, able_m3_s: f64) {
        self.flow_m3_s = self.flow_m3_s.min(able_m3_s);
        let tail_m3 = self.flow_m3_s * self.flow_m3_s / (2.0 * ramp_m3_s2);
        self.closing.get_or_insert(tail_m3);
    }
    pub(crate) fn is_shut(&self) -> bool {
        self.closing.is_some() && self.flow_m3_s <= 0.0
    }
    /// The most that the flow may be within the slot, heads aside.
    pub(crate) fn most(&self, ramp_m3_s2: f64, w: &ReleaseWindow, slot: &Window) -> f64 {
        if self.closing.is_some() {
            return self.flow_m3_s;
        }
        let up = self.flow_m3_s + ramp_m3_s2 * slot.length().as_seconds();
        let down = ramp_m3_s2 * (w.flow.end() - slot.start()).as_seconds();
        w.flow_aim_m3_s.min(up).min(down)
    }

    /// Lets one piece of at most a minute pass: the volume, and what bounds it. The flow goes
    /// straight from its value at the start to its value at the end.
    pub(crate) fn pass(
        &mut self,
        p: &Problem,
        w: &ReleaseWindow,
        piece: &Window,
        room: &Room,
    ) -> (f64, Bound) {
        let dt = piece.length().as_seconds();
        let ramp = p.ramp_m3_s2;
        let able = |volume: f64, t| {
            let gravity = p.gravity_m3_s(volume, p.outer_m(t));
            let bound = if room.pumped_m3_s > gravity { Bound::Pump } else { Bound::Head };
            (gravity.max(room.pumped_m3_s), bound)
        };
        // A flow that was carried over the aim comes down to it at once.
        let start = self.flow_m3_s.min(w.flow_aim_m3_s).min(able(room.volume, piece.start()).0);
        let later = room.volume + room.inflow_m3 - start * dt;
        let mut end = able(later, piece.end());
        let rising = if self.closing.is_some() { 0.0 } else { ramp * dt };
        let left_s = (w.flow.end() - piece.end()).as_seconds().max(0.0);
        for limit in [
            (w.flow_aim_m3_s, Bound::Aim),
            (start + rising, Bound::Ramp),
            (ramp * left_s, Bound::Ramp),
        ] {
            end = if limit.0 < end.0 { limit } else { end };
        }
        // Down the ramp so that it ends when the volume does: q2 / 2r is left at every instant.
        let left = self.closing.map_or(room.left_m3, |c| c.min(room.left_m3));
        let tail = tail_m3_s(start, left, ramp, dt);
        let ends = tail < end.0;
        if ends {
            let by = room.left_by.filter(|_| self.closing.is_none());
            end = (tail, by.map_or(end.1, Bound::Volume));
        }
        // And so that the storage is down to its floor when the flow is down to the inflow, which it
        // then keeps to until it is told to shut.
        let inflow = room.inflow_m3 / dt;
        let above = (room.volume - p.volume_low).max(0.0);
        let to_floor = inflow + tail_m3_s((start - inflow).max(0.0), above, ramp, dt);
        if to_floor < end.0 {
            end = (to_floor, Bound::Head);
        }
        self.flow_m3_s = end.0;
        let even = (start + end.0) / 2.0 * dt;
        let volume = if ends && end.0 <= 0.0 { left } else { even.min(left) };
        let volume = volume.min(above + room.inflow_m3);
        if ends || self.closing.is_some() {
            self.closing = Some(left - volume);
        }
        (volume, end.1)
    }
}

/// The flow after `dt` from which a ramp down just uses up what is then left: the root of
/// q2 + r dt q + r dt q0 - 2 r left = 0; nought when the ramp ends within `dt`.
fn tail_m3_s(start: f64, left: f64, ramp: f64, dt: f64) -> f64 {
    let step = ramp * dt;
    let root = step * step - 4.0 * (step * start - 2.0 * ramp * left);
    if root <= 0.0 { 0.0 } else { ((root.sqrt() - step) / 2.0).max(0.0) }
}
