//! The shared clock mapping. The plant is a device with a clock of its own, as a controller has;
//! this file reads it, and no other in this crate.

use rustix::time::{ClockId, clock_gettime};
use units::{Mono, Span, Utc};

/// simulated = origin + (real boot clock - real origin) x speed, for UTC and for the boot clock.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct ClockMap {
    pub real_boot_origin_ns: u64,
    pub sim_boot_origin_ns: u64,
    pub sim_utc_origin_us: i64,
    pub speed: u32,
}

impl ClockMap {
    /// Real time: the boot clock as it is, UTC as the host has it now.
    pub fn real() -> Self {
        let boot = real_boot_ns();
        let t = clock_gettime(ClockId::Realtime);
        Self {
            real_boot_origin_ns: boot,
            sim_boot_origin_ns: boot,
            sim_utc_origin_us: t.tv_sec * 1_000_000 + t.tv_nsec / 1_000,
            speed: 1,
        }
    }
    /// Both simulated clocks now, from one look at the real one.
    pub fn now(&self) -> (Utc, Mono) {
        let passed_ns = real_boot_ns()
            .saturating_sub(self.real_boot_origin_ns)
            .saturating_mul(u64::from(self.speed));
        let utc =
            Utc::from_micros(self.sim_utc_origin_us) + Span::micros((passed_ns / 1_000) as i64);
        (utc, Mono::from_nanos(self.sim_boot_origin_ns.saturating_add(passed_ns)))
    }
    /// The boot clock's reading at an instant of UTC, before or after now.
    pub fn boot_at(&self, t: Utc) -> Mono {
        Mono::from_nanos(self.sim_boot_origin_ns) + (t - Utc::from_micros(self.sim_utc_origin_us))
    }
}

fn real_boot_ns() -> u64 {
    let t = clock_gettime(ClockId::Boottime);
    (t.tv_sec as u64) * 1_000_000_000 + t.tv_nsec as u64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_fast_clock_runs_at_its_speed_from_its_origins() {
        let real = ClockMap::real();
        let fast = ClockMap { sim_utc_origin_us: 1_000, sim_boot_origin_ns: 5, speed: 600, ..real };
        let (u0, b0) = fast.now();
        let slow_before = real.now().0;
        let mut real_passed = Span::ZERO;
        while real_passed < Span::millis(5) {
            real_passed = real.now().0 - slow_before;
        }
        let (u1, b1) = fast.now();
        assert!(u1 - u0 >= real_passed * 599);
        assert!(((u1 - u0) - b1.since(b0)).abs() <= Span::micros(1));
        assert_eq!(fast.boot_at(Utc::from_micros(1_001)), Mono::from_nanos(1_005));
    }
}
