//! Where a release may be: lawful windows with their margins, cut into slots.

use model::{ClauseId, EdgeAnchor, LawfulWindow, PlanRequest, Site, TideNumber};
use units::{Span, Utc, Window};

use crate::problem::SLOT;

/// A lawful window less its margins (once: rule 12).
#[derive(Clone, PartialEq, Debug)]
pub(crate) struct ReleaseWindow {
    pub lawful: Window,
    pub tide: TideNumber,
    /// Flow at the gate begins no earlier and has ended at `flow.end()`: the ports run dry by the
    /// lawful end.
    pub flow: Window,
    pub opens_by: Option<ClauseId>,
    pub shuts_by: Option<ClauseId>,
    pub flow_aim_m3_s: f64,
    pub flow_by: Option<ClauseId>,
    /// What is left of the tide's volume, and the clause that sets it.
    pub allotment_m3: f64,
    pub volume_by: Option<ClauseId>,
    pub slots: Vec<Window>,
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
    let flow = w.window.trimmed(at_start, at_end)?.intersect(&request.span)?;
    if flow.length() < SHORTEST {
        return None;
    }
    let used = request.used_tides.iter().find(|(tide, _)| *tide == w.tide);
    let used_m3 = used.map_or(0.0, |(_, v)| v.get());
    let cap_m3 = w.volume_max.map_or(f64::INFINITY, |c| c.max.get());
    let flow_cap = w.flow_max.map_or(FLOW_MOST_M3_S, |c| c.max.get());
    Some(ReleaseWindow {
        lawful: w.window,
        tide: w.tide,
        flow,
        opens_by: w.opens.clause,
        shuts_by: w.shuts.clause,
        flow_aim_m3_s: flow_cap * settings.flow_aim,
        flow_by: w.flow_max.map(|c| c.clause),
        allotment_m3: (cap_m3 - used_m3).max(0.0),
        volume_by: w.volume_max.map(|c| c.clause),
        slots: slots(&flow),
    })
}

/// The 5-minute grid, split at the window's edges.
fn slots(flow: &Window) -> Vec<Window> {
    let mut list = Vec::new();
    let mut t: Utc = flow.start();
    while t < flow.end() {
        let next = (t.floor_to(SLOT) + SLOT).min(flow.end());
        list.extend(Window::new(t, next).ok());
        t = next;
    }
    list
}
