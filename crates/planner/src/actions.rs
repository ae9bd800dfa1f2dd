//! What one slot does: what passes an open gate from a volume, what that costs, and which pumps may
//! change. The backward pass tabulates it; the forward pass asks it of where it is.

use crate::problem::Problem;
use crate::windows::{Period, SlotData};

/// What an open gate lets out, m3, and whether that brings the storage down to its floor.
#[derive(Clone, Copy, PartialEq, Debug, Default)]
pub(crate) struct Passed {
    pub m3: f64,
    pub to_floor: bool,
}

impl Problem<'_> {
    /// What a volume becomes by what it gains, and what that costs.
    pub(crate) fn kept(&self, volume: f64, gain: f64, hours: f64) -> (f64, f64) {
        let (kept, spilled) = self.spilled(volume + gain);
        let stored = self.prices.stored((volume + kept) / 2.0, self.volume_alarm, hours);
        (kept, stored + spilled * self.prices.spill_m3)
    }

    /// What a slot releases from `volume` with the gate open and `pumps` running; `None` where
    /// gravity alone has no head that lasts. `open_s`: how long the gate has been opening. A storage
    /// that is down to its lowest working level passes what flows in, at a price.
    pub(crate) fn passes(
        &self,
        s: &SlotData,
        tide: i64,
        pumps: usize,
        volume: f64,
        open_s: Option<f64>,
    ) -> Option<Passed> {
        if pumps == 0 && volume <= s.volume_head {
            return None;
        }
        let dt = s.slot.length().as_seconds();
        let ramp = open_s.map_or(f64::INFINITY, |e| self.ramp_m3_s2 * (e + dt / 2.0) * dt);
        let above = (volume + s.inflow_m3 - self.volume_low).max(0.0);
        let able = s.most_m3.min(ramp).min(above);
        let pumped = self.pumped_m3_s(pumps, tide);
        let flow = |v: f64| s.gravity.m3_s(v).max(pumped) * dt;
        let first = flow(volume).min(able);
        let m3 = flow(volume + (s.inflow_m3 - first) / 2.0).min(able);
        Some(Passed { m3, to_floor: m3 >= above })
    }

    /// Whether `to` pumps may run in this slot after `from`: changes keep their block, and a pump
    /// stops only where gravity carries its flow, as a stop cannot be ramped.
    pub(crate) fn may_change(
        &self,
        s: &SlotData,
        tide: i64,
        from: usize,
        to: usize,
        volume: f64,
    ) -> bool {
        if from == to {
            return true;
        }
        let carried =
            || s.gravity.m3_s(volume) + self.ramp_m3_s2 * 60.0 >= self.pumped_m3_s(from, tide);
        s.pumps_may_change && (to > from || carried())
    }

    pub(crate) fn energy(&self, s: &SlotData, tide: i64, pumps: usize) -> f64 {
        self.pump_kw(pumps, tide) * s.slot.length().as_hours() * self.prices.energy_per_kwh
    }

    /// Opening over these slots: all that passes, and its cost without the stroke and the starts.
    pub(crate) fn opened(
        &self,
        slots: &[SlotData],
        tide: i64,
        pumps: usize,
        volume: f64,
    ) -> Option<(f64, f64)> {
        let (mut v, mut all_m3, mut cost, mut open_s) = (volume, 0.0, 0.0, 0.0);
        for s in slots {
            let passed = self.passes(s, tide, pumps, v, Some(open_s))?;
            let (kept, more) = self.kept(v, s.inflow_m3 - passed.m3, s.slot.length().as_hours());
            cost += more + self.energy(s, tide, pumps) + self.trickle(&passed);
            open_s += s.slot.length().as_seconds();
            (v, all_m3) = (kept, all_m3 + passed.m3);
        }
        Some((all_m3, cost))
    }

    pub(crate) fn trickle(&self, passed: &Passed) -> f64 {
        if passed.to_floor { self.prices.trickle } else { 0.0 }
    }

    /// How many slots from `n` on the ramp takes, within its window.
    pub(crate) fn ramp_slots(&self, period: &Period, n: usize) -> usize {
        let window = period.slots[n].window;
        let aim = window.map_or(0.0, |w| self.windows[w].flow_aim_m3_s);
        let until = period.slots[n].slot.start()
            + units::Span::from_seconds_f64((aim / self.ramp_m3_s2).min(86_400.0));
        let of_ramp = |s: &&SlotData| s.window == window && s.slot.start() < until;
        period.slots[n..].iter().take_while(of_ramp).count().max(1)
    }
}
