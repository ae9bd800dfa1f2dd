//! The simplest lawful policy, as a yardstick: open at the earliest moment, pump whenever that gives
//! more, release as much as is allowed, never wait, and shut for the tide when the storage is down to
//! its lowest working level. Written apart from the planner, minute by minute.

use model::*;
use structures::{Friction, Outfall, Pipe, StorageCurve};
use units::*;

pub struct Outcome {
    pub spilled_m3: f64,
}

const DT_S: f64 = 60.0;

struct Open {
    from: Utc,
    until: Utc,
    tide: TideNumber,
    aim_m3_s: f64,
    cap_m3: f64,
}

fn windows(site: &Site, r: &PlanRequest) -> Vec<Open> {
    let s = &site.settings;
    let band = |e: &Edge| match e.anchor {
        EdgeAnchor::Modelled => e.time_sd.scaled(s.band_sigmas),
        _ => Span::ZERO,
    };
    let each = r.lawful.windows.iter().map(|w| Open {
        from: w.window.start() + s.clock_margin + band(&w.opens),
        until: w.window.end() - s.clock_margin - band(&w.shuts) - site.outlets[0].drain_down,
        tide: w.tide,
        aim_m3_s: w.flow_max.unwrap().max.get() * s.flow_aim,
        cap_m3: w.volume_max.map_or(f64::INFINITY, |c| c.max.get()),
    });
    // Ten minutes are not worth a stroke.
    each.filter(|w| w.until - w.from.max(r.span.start()) >= Span::minutes(10)).collect()
}

pub fn greedy(site: &Site, r: &PlanRequest) -> Outcome {
    let spec = &site.storages[0];
    let points: Vec<(f64, f64)> = spec.curve.iter().map(|(l, v)| (l.get(), v.get())).collect();
    let curve = StorageCurve::new(&points).unwrap();
    let pipe = Pipe::new(1.20, 380.0, Friction::Darcy(0.018), 3.5).unwrap();
    let outfall = Outfall::new(pipe, -3.60, 0.02).unwrap();
    let low = curve.volume_m3(spec.level_lowest_working.get());
    let top = curve.volume_m3(spec.level_spill.get());
    let pumped = 0.25 * r.available[1..].iter().filter(|a| **a).count() as f64;
    let ramp = 0.1 / 60.0 * site.settings.ramp_aim;
    let rolling = r.caps.iter().find(|c| matches!(c.kind, LongCapKind::Rolling(_)));
    let rolling = rolling.map_or(f64::INFINITY, |c| c.volume_max.get());
    let windows = windows(site, r);
    let mut volume = curve.volume_m3(r.level_now.get());
    let (mut flow, mut spilled) = (0.0f64, 0.0);
    let mut emptied: Option<TideNumber> = None;
    let mut history: Vec<(TideNumber, f64)> = Vec::new();
    let mut t = r.span.start();
    while t < r.span.end() {
        let inflow = r.inflow.at(t).unwrap() * DT_S;
        let open = windows.iter().find(|w| t >= w.from && t < w.until);
        let mut out = 0.0;
        if let Some(w) = open.filter(|w| r.available[0] && emptied != Some(w.tide)) {
            let tide: f64 = history.iter().filter(|h| h.0 == w.tide).map(|h| h.1).sum();
            let day = history.len().saturating_sub(24 * 60);
            let day: f64 = history[day..].iter().map(|h| h.1).sum();
            let left = (w.cap_m3 - tide).min(rolling - day).min(volume + inflow - low).max(0.0);
            let outer = r.outer_level.at(t).unwrap();
            let able = outfall.flow_m3_s(curve.level_m(volume), outer, 1.0).max(pumped);
            let down = (ramp * ((w.until - t).as_seconds() - DT_S)).max(0.0);
            let tail = (2.0 * ramp * left).sqrt();
            // Like a plan, it opens on the 5-minute grid or as its window does.
            let edge = t.floor_to(Span::minutes(5)) == t || t - w.from < Span::minutes(1);
            let able = if flow > 0.0 || edge { able } else { 0.0 };
            let before = flow;
            flow = able.min(w.aim_m3_s).min(flow + ramp * DT_S).min(down).min(tail);
            out = ((before + flow) / 2.0 * DT_S).min(left);
            // The ramp down to the floor has come to what merely flows in.
            if flow > 0.0 && flow <= tail && tail < 0.15 && volume - low < 10.0 {
                emptied = Some(w.tide);
            }
        } else {
            flow = 0.0;
        }
        history.push((open.map_or(-1, |w| w.tide), out));
        volume += inflow - out;
        spilled += (volume - top).max(0.0);
        volume = volume.min(top);
        t = t + Span::seconds(60);
    }
    Outcome { spilled_m3: spilled }
}
