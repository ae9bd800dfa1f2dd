//! The guard: every clause against live conditions and sums, at the moment of action.

use model::{
    About, Applies, AssetId, By, Cap, Cause, Clause, ClauseKind, Fact, Forecast, Is, Lawful,
    MustBe, OnStale, Sense, SignalCondition, Site, Validated,
};
use units::{CubicMetres, CubicMetresPerSecond, Span, Utc, Window};

use crate::caps::{band, governing, least};
use crate::clause_windows;
use crate::tallies::Tallies;

/// Whether water is about to move or moves already.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Phase {
    Starting,
    Running,
}

/// What the guard reads.
#[derive(Clone, Copy, Debug)]
pub struct Conditions<'a> {
    pub now: Utc,
    /// In the order of `Site::signals`.
    pub signals: &'a [Validated],
    pub forecast: Option<&'a Forecast>,
    pub lawful: Option<&'a Lawful>,
    pub tallies: &'a Tallies,
    /// Pieces of the last hour with the mean flow in each, m3/s, oldest first.
    pub recent_flow: &'a [(Window, f64)],
}

/// All holds, and the caps that are left where there is none.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Guarded {
    pub causes: Vec<Cause>,
    pub flow_max: Option<Cap<CubicMetresPerSecond>>,
    pub volume_left: Option<Cap<CubicMetres>>,
}

impl Guarded {
    fn hold(&mut self, clause: &Clause, about: About, is: Is, must_be: MustBe) {
        let fact = Fact { about, is, must_be };
        self.causes.push(Cause { by: By::Clause(clause.id), fact });
    }
    fn flow(&mut self, clause: &Clause, max: CubicMetresPerSecond) {
        self.flow_max = least(self.flow_max, Cap { max, clause: clause.id });
    }
    /// Holds when nothing is left of a volume.
    fn volume(&mut self, clause: &Clause, about: About, used: CubicMetres, max: CubicMetres) {
        let left = max - used;
        self.volume_left = least(self.volume_left, Cap { max: left, clause: clause.id });
        if left.get() <= 0.0 {
            self.hold(clause, about, Is::Number(used.get()), MustBe::AtMost(max.get()));
        }
    }
    fn stale(&mut self, clause: &Clause, on_stale: OnStale, about: About, is: &str) {
        match on_stale {
            OnStale::Allow => {}
            OnStale::Reduced(max) => self.flow(clause, max),
            OnStale::Hold => {
                let must = MustBe::Words("readable");
                self.hold(clause, about, Is::Words(is.to_owned()), must);
            }
        }
    }
}

/// Reads every clause that governs the asset. All holds are listed, not the first.
pub fn guard(site: &Site, c: &Conditions, asset: AssetId, phase: Phase) -> Guarded {
    let mut g = Guarded::default();
    for (clause, on_stale) in governing(site, asset) {
        match &clause.kind {
            ClauseKind::TideWindow { .. } => window(&mut g, clause, c, OnStale::Hold),
            ClauseKind::CurrentSeaward { speed_min, meter, .. } => {
                let metered = meter.and_then(|m| Some((m, c.signals[m.index()].now()?)));
                match metered {
                    Some((_, v)) if v >= speed_min.get() => {}
                    Some((m, v)) => {
                        let must = MustBe::AtLeast(speed_min.get());
                        g.hold(clause, About::Signal(m), Is::Number(v), must);
                    }
                    None => window(&mut g, clause, c, on_stale),
                }
            }
            ClauseKind::Rate { flow_max, averaging, .. } => {
                g.flow(clause, *flow_max);
                let mean = mean_flow(c.recent_flow, c.now, *averaging);
                if mean > flow_max.get() {
                    let must = MustBe::AtMost(flow_max.get());
                    g.hold(clause, About::MeanFlow, Is::Number(mean), must);
                }
            }
            ClauseKind::VolumePerTide { rounding, bands } => {
                let tide = c.forecast.and_then(|f| f.tide_at(c.now));
                match tide {
                    None => g.stale(clause, OnStale::Hold, About::Forecast, "no tide known"),
                    Some(tide) => {
                        let band = band(rounding, bands, tide.ebb_range);
                        let max = band.map_or(CubicMetres::ZERO, |b| b.volume_max);
                        let used = c.tallies.in_tide(tide.number);
                        g.volume(clause, About::VolumeThisTide, used, max);
                        if let Some(max) = band.and_then(|b| b.flow_max) {
                            g.flow(clause, max);
                        }
                    }
                }
            }
            ClauseKind::RollingVolume { span, volume_max } => {
                let used = c.tallies.rolling(*span, c.now);
                g.volume(clause, About::VolumeRolling, used, *volume_max);
            }
            ClauseKind::MonthVolume { volume_max } => {
                let (start, end) = site.zone.month_of(c.now);
                let month = Window::new(start, end).expect("a month is not empty");
                let used = c.tallies.in_window(&month);
                g.volume(clause, About::VolumeMonth, used, *volume_max);
            }
            ClauseKind::SignalGate { conditions, applies } => {
                if *applies == Applies::Throughout || phase == Phase::Starting {
                    let each = conditions.iter();
                    each.for_each(|s| signal(&mut g, clause, on_stale, s, c));
                }
            }
        }
    }
    g
}

/// A clause that is a window: inside it now, or the next one is what the time must come to.
fn window(g: &mut Guarded, clause: &Clause, c: &Conditions, on_stale: OnStale) {
    let set = c.forecast.and_then(|f| clause_windows::of(clause, f));
    let Some(set) = set else {
        return g.stale(clause, on_stale, About::Forecast, "no forecast");
    };
    if set.windows.contains(c.now) {
        return;
    }
    match set.windows.next_after(c.now) {
        Some(next) => g.hold(clause, About::Now, Is::Instant(c.now), MustBe::Inside(*next)),
        None => g.stale(clause, OnStale::Hold, About::Forecast, "no window in the forecast"),
    }
}

fn signal(
    g: &mut Guarded,
    clause: &Clause,
    on_stale: OnStale,
    s: &SignalCondition,
    c: &Conditions,
) {
    let about = About::Signal(s.signal);
    let reading = c.signals[s.signal.index()];
    match reading.within(s.age_max) {
        None => g.stale(clause, on_stale, about, reading.quality.words()),
        Some(v) => {
            let (met, must) = match s.sense {
                Sense::AtMost => (v <= s.limit, MustBe::AtMost(s.limit)),
                Sense::AtLeast => (v >= s.limit, MustBe::AtLeast(s.limit)),
            };
            if !met {
                g.hold(clause, about, Is::Number(v), must);
            }
        }
    }
}

/// Mean over (now - span, now]; time of which nothing is known counts as no flow.
fn mean_flow(pieces: &[(Window, f64)], now: Utc, span: Span) -> f64 {
    let Ok(window) = Window::new(now - span, now) else { return 0.0 };
    let volume = |(piece, flow): &(Window, f64)| {
        piece.intersect(&window).map_or(0.0, |w| w.length().as_seconds() * flow)
    };
    pieces.iter().map(volume).sum::<f64>() / span.as_seconds()
}
