//! One stretch of time on both clocks.

use units::{Mono, Span, Utc};

/// From (utc, boot) to (utc, boot), straight between. The two may run at different rates when a
/// test steps one of them; leases follow the boot clock.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Passage {
    pub utc: (Utc, Utc),
    pub boot: (Mono, Mono),
}

impl Passage {
    pub fn boot_at(&self, t: Utc) -> Mono {
        let whole = i128::from((self.utc.1 - self.utc.0).as_micros());
        let part = i128::from((t - self.utc.0).as_micros());
        let nanos = i128::from(self.boot.1.as_nanos()) - i128::from(self.boot.0.as_nanos());
        if whole <= 0 {
            return self.boot.1;
        }
        let at = i128::from(self.boot.0.as_nanos()) + nanos * part / whole;
        Mono::from_nanos(u64::try_from(at).unwrap_or(0))
    }
    /// The instant at which the boot clock reads `m`, rounded down to a microsecond so that a rest
    /// begins within its lease; `None` when it is past this stretch.
    pub fn utc_at(&self, m: Mono) -> Option<Utc> {
        if m <= self.boot.0 {
            return Some(self.utc.0);
        }
        if m > self.boot.1 {
            return None;
        }
        let whole = i128::from((self.utc.1 - self.utc.0).as_micros().max(0));
        let part = i128::from(m.as_nanos() - self.boot.0.as_nanos());
        let nanos = i128::from(self.boot.1.as_nanos() - self.boot.0.as_nanos());
        let micros = whole * part / nanos;
        Some(self.utc.0 + Span::micros(i64::try_from(micros).unwrap_or(i64::MAX)))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_clocks_meet_at_both_ends_and_a_lease_rounds_down() {
        let p = Passage {
            utc: (Utc::from_micros(0), Utc::from_micros(10)),
            boot: (Mono::from_nanos(500), Mono::from_nanos(10_500)),
        };
        assert_eq!(p.boot_at(Utc::from_micros(10)), Mono::from_nanos(10_500));
        assert_eq!(p.utc_at(Mono::from_nanos(3_400)), Some(Utc::from_micros(2)));
        assert_eq!(p.utc_at(Mono::from_nanos(10_501)), None);
        assert_eq!(p.utc_at(Mono::from_nanos(1)), Some(Utc::from_micros(0)));
    }
}
