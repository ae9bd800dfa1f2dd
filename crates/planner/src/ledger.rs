//! Sums for caps over more than one tide: exact at every instant, as released water is counted.

use model::{ClauseId, LongCap, LongCapKind};
use units::{Utc, Window};

/// One cap with everything that has gone into it, past and planned.
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Ledger {
    pub clause: ClauseId,
    kind: LongCapKind,
    volume_max: f64,
    /// (instant, sum until then), rising in both; straight between.
    sums: Vec<(Utc, f64)>,
}

impl Ledger {
    /// Past volumes that reach beyond `now` are counted as released by then. Where the plan counts
    /// a running release from `now` itself (`counted`), a piece that begins then is left out.
    pub(crate) fn new(cap: &LongCap, now: Utc, counted: bool) -> Self {
        let mut sums: Vec<(Utc, f64)> = Vec::with_capacity(2 * cap.past.len() + 2);
        let mut sum = 0.0;
        for (window, volume) in &cap.past {
            if counted && window.start() >= now {
                continue;
            }
            let from = sums.last().map_or(window.start(), |last| last.0.max(window.start()));
            sums.push((from.min(now), sum));
            sum += volume.get().max(0.0);
            sums.push((window.end().min(now).max(from.min(now)), sum));
        }
        sums.push((now.max(sums.last().map_or(now, |s| s.0)), sum));
        Self { clause: cap.clause, kind: cap.kind, volume_max: cap.volume_max.get(), sums }
    }
    pub(crate) fn add(&mut self, piece: &Window, volume: f64) {
        let sum = self.sums[self.sums.len() - 1].1;
        self.sums.push((piece.start(), sum));
        self.sums.push((piece.end(), sum + volume));
    }
    fn until(&self, t: Utc) -> f64 {
        let n = self.sums.partition_point(|s| s.0 <= t);
        if n == 0 {
            return 0.0;
        }
        let (t0, a) = self.sums[n - 1];
        match self.sums.get(n) {
            Some((t1, b)) => a + (b - a) * ((t - t0).as_seconds() / (*t1 - t0).as_seconds()),
            None => a,
        }
    }
    /// What may still be released in `piece`, nothing planned from its start on: no instant in it
    /// then sees more than the cap. Infinite where the cap does not reach.
    pub(crate) fn left(&self, piece: &Window) -> f64 {
        let (from, end) = match self.kind {
            LongCapKind::Rolling(span) => (piece.start() - span, piece.end()),
            LongCapKind::Fixed(w) if w.intersect(piece).is_some() => (w.start(), w.end()),
            LongCapKind::Fixed(_) => return f64::INFINITY,
        };
        (self.volume_max - (self.until(end) - self.until(from))).max(0.0)
    }
    /// What will be left at `at` if nothing is released from `now` on: more than now, as what was
    /// released ages out of a rolling span.
    pub(crate) fn left_later(&self, now: Utc, at: Utc) -> f64 {
        match self.kind {
            LongCapKind::Rolling(span) => {
                let counts = self.until(now) - self.until(at - span);
                (self.volume_max - counts.max(0.0)).max(0.0)
            }
            LongCapKind::Fixed(w) if w.start() < at && w.end() > now => {
                (self.volume_max - (self.until(w.end()) - self.until(w.start()))).max(0.0)
            }
            LongCapKind::Fixed(_) => f64::INFINITY,
        }
    }
}
