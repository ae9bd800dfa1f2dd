//! A small lawful run, into which tests plant one violation each.

use units::{Mono, Span, Utc, Window};

use crate::{
    Asset, Event, EventKind, FixedCap, GateHead, LawfulWindow, Rules, Run, Sample, TideCap,
};

pub(crate) fn start() -> Utc {
    Utc::from_civil(2027, 5, 1, 0, 0, 0).unwrap()
}

pub(crate) fn minute(n: i64) -> Utc {
    start() + Span::minutes(n)
}

pub(crate) fn boot(t: Utc) -> Mono {
    Mono::from_nanos(1_000_000_000) + (t - start())
}

pub(crate) fn event(at: Utc, kind: EventKind) -> Event {
    Event { utc: at, boot: boot(at), kind }
}

fn window(from: i64, to: i64) -> Window {
    Window::new(minute(from), minute(to)).unwrap()
}

/// Two tides of 12 h; each may pass 3,000 m3 from its minute 300 to 420, at 1 m3/s.
pub(crate) fn rules() -> Rules {
    let tide = |n: i64| TideCap {
        window: window(n * 720, (n + 1) * 720),
        tide: n,
        volume_max_m3: 3_000.0,
    };
    let lawful = |n: i64| LawfulWindow {
        window: window(n * 720 + 300, n * 720 + 420),
        tide: n,
        flow_max_m3_s: 1.0,
    };
    Rules {
        lawful: vec![lawful(0), lawful(1)],
        tides: vec![tide(0), tide(1)],
        fixed: vec![FixedCap { window: window(0, 43_200), volume_max_m3: 5_900.0 }],
        rolling: Some((Span::hours(24), 5_800.0)),
        averaging: Span::minutes(15),
        ramp_max_m3_s: Some(0.1),
        still_m3_s: 0.005,
        assets: vec![Asset { stroke: Span::minutes(8) }, Asset { stroke: Span::ZERO }],
        head: GateHead { port_centre_m: -3.6, density_excess: 0.02 },
        assist_within: Span::minutes(3),
        way_open_min_percent: 5.0,
        level_lowest_working_m: 3.7,
        instruments_m: 0.0,
        known_within: Span::seconds(60),
        barred: Vec::new(),
    }
}

/// A day by the minute with flow at the ports as `flow` says, the level at 5 m and the tide at 0 m.
pub(crate) fn run_with(flow: impl Fn(i64) -> f64) -> Run {
    let mut run = Run::default();
    let (mut released_m3, mut before) = (0.0, 0.0);
    for n in 0..=1440 {
        let ports_m3_s = flow(n);
        if (ports_m3_s > 0.0) != (before > 0.0) {
            let begins = ports_m3_s > 0.0;
            let kind = if begins { EventKind::PortsFlow } else { EventKind::PortsStill };
            run.events.push(event(minute(n), kind));
        }
        run.samples.push(Sample {
            utc: minute(n),
            boot: boot(minute(n)),
            level_m: 5.0,
            outer_m: 0.0,
            gate_percent: ports_m3_s * 50.0,
            pumps_run: 0,
            ports_m3_s,
            inflow_m3_s: 0.1,
            released_m3,
            spilled_m3: 0.0,
        });
        released_m3 += ports_m3_s * 60.0;
        before = ports_m3_s;
    }
    run
}

/// A trapezium up to `top` m3/s at 0.1 m3/s a minute, from minute `from` to `to`.
pub(crate) fn ramped(n: i64, from: i64, to: i64, top: f64) -> f64 {
    let edge = (n - from).min(to - n).max(0) as f64;
    (edge * 0.1).min(top)
}

/// Lawful: 0.5 m3/s for 80 min on each tide, under 2,400 m3.
pub(crate) fn good_run() -> Run {
    run_with(|n| ramped(n, 310, 390, 0.5) + ramped(n, 1030, 1110, 0.5))
}

/// Adds an event in its place.
pub(crate) fn plant(run: &mut Run, at: Utc, kind: EventKind) {
    let place = run.events.partition_point(|e| e.utc <= at);
    run.events.insert(place, event(at, kind));
}
