//! What somebody who knew everything beforehand could lawfully have moved.

use units::{Span, Utc, Window};

use crate::{Rules, Run};

/// The works as it truly is.
pub struct Foresight<'a> {
    /// (level, volume) pairs, both rising; straight between.
    pub storage: &'a [(f64, f64)],
    /// The most that can flow at (inner level, outer level), m3/s, all helps running.
    pub capacity_m3_s: &'a dyn Fn(f64, f64) -> f64,
}

/// m3 through the ports if water leaves at every lawful instant as fast as caps, head and storage
/// let it, on the true levels and inflow of the run. Exact on windows, caps of tide, span and month
/// and on the flow cap; nothing is lost to ramps, strokes, margins or faults, which real equipment
/// cannot do, so a run that is measured against it is measured hard.
///
/// It is greedy: letting go as early as possible never loses a later chance to a cap of a tide, and
/// loses almost none to a lower head or to the rolling cap.
pub fn foresight(run: &Run, rules: &Rules, works: &Foresight) -> f64 {
    let Some(first) = run.samples.first() else { return 0.0 };
    let mut volume_m3 = along(works.storage, first.level_m);
    let lowest_m3 = along(works.storage, rules.level_lowest_working_m);
    let full_m3 = works.storage.last().map_or(f64::INFINITY, |p| p.1);
    let mut ledger = Ledger { rules, done: Vec::new(), released_m3: 0.0 };
    for pair in run.samples.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        let Ok(minute) = Window::new(a.utc, b.utc) else { continue };
        let inflow_m3 = a.inflow_m3_s * minute.length().as_seconds();
        for w in &rules.lawful {
            let Some(part) = w.window.intersect(&minute) else { continue };
            let level_m = back(works.storage, volume_m3);
            let flow = (works.capacity_m3_s)(level_m, a.outer_m).min(w.flow_max_m3_s);
            let wanted = flow * part.length().as_seconds();
            let there = (volume_m3 + inflow_m3 - lowest_m3).max(0.0);
            let m3 = wanted.min(there).min(ledger.room_m3(part.start())).max(0.0);
            ledger.take(part.start(), m3);
            volume_m3 -= m3;
        }
        volume_m3 = (volume_m3 + inflow_m3).min(full_m3);
    }
    ledger.released_m3
}

struct Ledger<'a> {
    rules: &'a Rules,
    done: Vec<(Utc, f64)>,
    released_m3: f64,
}

impl Ledger<'_> {
    fn room_m3(&self, at: Utc) -> f64 {
        let tide = self.rules.tides.iter().find(|t| t.window.contains(at));
        let on_tide = tide.map_or(0.0, |t| t.volume_max_m3 - self.sum(t.window.start()));
        let fixed = self.rules.fixed.iter().filter(|c| c.window.contains(at));
        let fixed = fixed.map(|c| c.volume_max_m3 - self.sum(c.window.start()));
        // A piece counts whole while any of it may be inside the span.
        let rolling = self.rules.rolling.map(|(s, max)| max - self.sum(at - s + Span::minutes(1)));
        fixed.chain(rolling).fold(on_tide, f64::min)
    }
    fn sum(&self, from: Utc) -> f64 {
        let first = self.done.partition_point(|d| d.0 < from);
        self.done[first..].iter().fold(0.0, |sum, d| sum + d.1)
    }
    fn take(&mut self, at: Utc, m3: f64) {
        if m3 > 0.0 {
            self.done.push((at, m3));
            self.released_m3 += m3;
        }
    }
}

/// Volume at a level, and (below) level at a volume; beyond the ends, the end.
fn along(curve: &[(f64, f64)], level_m: f64) -> f64 {
    straight(curve.iter().copied(), level_m)
}

fn back(curve: &[(f64, f64)], volume_m3: f64) -> f64 {
    straight(curve.iter().map(|(l, v)| (*v, *l)), volume_m3)
}

fn straight(points: impl Iterator<Item = (f64, f64)>, x: f64) -> f64 {
    let mut before: Option<(f64, f64)> = None;
    for (px, py) in points {
        match before {
            _ if px < x => before = Some((px, py)),
            Some((bx, by)) => return by + (py - by) * (x - bx) / (px - bx),
            None => return py,
        }
    }
    before.map_or(0.0, |b| b.1)
}
