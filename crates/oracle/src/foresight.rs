//! What could lawfully have been moved by somebody who knew everything: as early as allowed, at the
//! cap, as far as the head carries it. Ramps, strokes and drain-down are not taken off, so it is
//! more than any real gate could do.

use crate::record::{Rules, Sample};

/// Greatest flow by (storage level, level outside), m3/s, pumps included.
pub type Capacity<'a> = &'a dyn Fn(f64, f64) -> f64;

/// `level_of` gives the storage level of a volume.
pub fn most_movable_m3(
    samples: &[Sample],
    rules: &Rules,
    capacity: Capacity,
    level_of: &dyn Fn(f64) -> f64,
    volume_low_m3: f64,
    volume_spill_m3: f64,
) -> f64 {
    let Some(first) = samples.first() else { return 0.0 };
    let mut volume = first.volume_m3;
    let mut moved = 0.0;
    let mut history: Vec<(units::Utc, f64)> = Vec::with_capacity(samples.len());
    let mut tide = (first.utc, 0.0);
    for pair in samples.windows(2) {
        let [s, next] = pair else { continue };
        let dt = (next.utc - s.utc).as_seconds();
        volume = (volume + s.inflow_m3_s * dt).min(volume_spill_m3);
        history.push((s.utc, moved));
        let Some(a) = rules.allowed_at(s.utc) else { continue };
        if tide.0 != a.window.start() {
            tide = (a.window.start(), 0.0);
        }
        if s.current_m_s < rules.current_min_m_s {
            continue;
        }
        let n = history.partition_point(|(t, _)| s.utc - *t > rules.rolling);
        let in_span = moved - history.get(n).map_or(0.0, |(_, m)| *m);
        let flow = capacity(level_of(volume), s.outer_m).min(a.flow_max_m3_s);
        let out = (flow * dt)
            .min(volume - volume_low_m3)
            .min(a.volume_max_m3 - tide.1)
            .min(rules.rolling_max_m3 - in_span)
            .max(0.0);
        volume -= out;
        moved += out;
        tide.1 += out;
    }
    moved
}
