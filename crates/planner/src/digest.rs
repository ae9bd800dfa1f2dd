//! The digest of a whole request, every field in its order.

use model::{Edge, EdgeAnchor, Lawful, LongCapKind, PlanRequest};
use units::{Digest, Series, Utc, Window};

/// Equal requests have equal digests; any other field or order gives, by accident, hardly ever the
/// same one.
pub(crate) fn digest(r: &PlanRequest) -> u64 {
    let mut d = Digest::new();
    d.u64(r.job.0).u64(r.id.0).i64(r.parent.map_or(-1, |p| p.0 as i64));
    instant(&mut d, r.as_of);
    window(&mut d, &r.span);
    d.u64(r.outlet as u64).f64(r.level_now.get());
    series(&mut d, &r.inflow);
    series(&mut d, &r.outer_level);
    lawful(&mut d, &r.lawful);
    d.u64(r.used_tides.len() as u64);
    for (tide, volume) in &r.used_tides {
        d.i64(*tide).f64(volume.get());
    }
    d.u64(r.caps.len() as u64);
    for cap in &r.caps {
        d.u64(u64::from(cap.clause.0)).f64(cap.volume_max.get());
        match cap.kind {
            LongCapKind::Rolling(span) => d.u64(0).i64(span.as_micros()),
            LongCapKind::Fixed(w) => d.i64(w.start().as_micros()).i64(w.end().as_micros()),
        };
        d.u64(cap.past.len() as u64);
        for (w, volume) in &cap.past {
            window(&mut d, w);
            d.f64(volume.get());
        }
    }
    d.u64(r.available.len() as u64);
    for available in &r.available {
        d.u64(u64::from(*available));
    }
    d.f64(r.flow_now.get()).i64(r.closing_lead.as_micros()).u64(r.forecast_digest);
    d.get()
}

fn instant(d: &mut Digest, t: Utc) {
    d.i64(t.as_micros());
}

fn window(d: &mut Digest, w: &Window) {
    instant(d, w.start());
    instant(d, w.end());
}

fn series(d: &mut Digest, s: &Series) {
    instant(d, s.start());
    d.i64(s.step().as_micros()).u64(s.values().len() as u64);
    for value in s.values() {
        d.f64(*value);
    }
}

fn lawful(d: &mut Digest, l: &Lawful) {
    d.u64(u64::from(l.asset.0)).u64(l.windows.len() as u64).u64(l.nil.len() as u64);
    window(d, &l.span);
    for w in &l.windows {
        d.i64(w.tide).f64(w.range.get()).f64(w.range_rounded.get());
        window(d, &w.window);
        edge(d, &w.opens);
        edge(d, &w.shuts);
        cap(d, w.flow_max.map(|c| (c.max.get(), c.clause.0)));
        cap(d, w.ramp_max_per_min.map(|c| (c.max.get(), c.clause.0)));
        cap(d, w.volume_max.map(|c| (c.max.get(), c.clause.0)));
    }
    for nil in &l.nil {
        d.i64(nil.tide).u64(u64::from(nil.clause.0));
        d.f64(nil.range.get()).f64(nil.range_rounded.get());
    }
}

fn edge(d: &mut Digest, e: &Edge) {
    instant(d, e.at);
    d.i64(e.clause.map_or(-1, |c| i64::from(c.0))).i64(e.time_sd.as_micros());
    d.u64(match e.anchor {
        EdgeAnchor::Predicted => 0,
        EdgeAnchor::Modelled => 1,
        EdgeAnchor::SpanEnd => 2,
    });
}

fn cap(d: &mut Digest, cap: Option<(f64, u16)>) {
    match cap {
        Some((max, clause)) => d.u64(1).f64(max).u64(u64::from(clause)),
        None => d.u64(0),
    };
}
