//! What the host tells, as events of the engine: everything from an adapter is checked here.

use engine::{Event, Outcome};
use host::HostEvent;
use model::{AdapterId, LeaseHolder, Reading, RestAction, Site};
use protocol::{Point, Quality};
use units::Utc;

/// The event, or nothing where it is only for the log.
pub fn event_of(site: &Site, event: HostEvent) -> Option<Event> {
    match event {
        HostEvent::Up { adapter, points } => Some(up(site, AdapterId(adapter), &points)),
        HostEvent::Down { adapter, why, quarantined } => {
            let name = &site.adapters[usize::from(adapter)].name;
            tracing::warn!(adapter = %name, %why, quarantined, "adapter down");
            Some(Event::AdapterDown { adapter: AdapterId(adapter), why })
        }
        HostEvent::Readings { adapter, readings } => {
            let known = |r: &protocol::Reading| reading(site, AdapterId(adapter), r);
            Some(Event::Frame(readings.iter().filter_map(known).collect()))
        }
        HostEvent::Outcome { command, outcome } => {
            let outcome = match outcome {
                host::Outcome::Accepted => Outcome::Accepted,
                host::Outcome::Refused(why) => Outcome::Refused(why),
                host::Outcome::Unknown(why) => Outcome::Unknown(why),
            };
            Some(Event::Outcome { command, outcome })
        }
        HostEvent::Trouble { adapter, trouble } => {
            let name = &site.adapters[usize::from(adapter)].name;
            let point = trouble.point.as_deref().unwrap_or("-");
            tracing::warn!(adapter = %name, point, "{}", trouble.words);
            None
        }
        HostEvent::Log { adapter, text } => {
            let name = &site.adapters[usize::from(adapter)].name;
            tracing::info!(adapter = %name, "{text}");
            None
        }
    }
}

/// A point that the site has no signal for is of no interest.
fn reading(site: &Site, adapter: AdapterId, r: &protocol::Reading) -> Option<Reading> {
    let signal = site.signals.iter().find(|s| s.adapter == adapter && s.point == r.point)?;
    Some(Reading {
        signal: signal.id,
        value: r.value,
        source_good: r.quality == Quality::Good,
        at: Utc::from_micros(r.time_utc_us),
    })
}

/// An adapter is up only if it has what the site file says of it: lease holder and rest actions are
/// safety, and a difference is refused.
fn up(site: &Site, adapter: AdapterId, points: &[Point]) -> Event {
    let name = &site.adapters[adapter.index()].name;
    let faults: Vec<String> = site
        .assets
        .iter()
        .filter(|a| a.adapter == adapter)
        .filter_map(|a| fault(a, points))
        .collect();
    for signal in site.signals.iter().filter(|s| s.adapter == adapter) {
        if !points.iter().any(|p| p.id == signal.point && p.readable) {
            tracing::warn!(adapter = %name, point = %signal.point, "no such readable point");
        }
    }
    if faults.is_empty() {
        tracing::info!(adapter = %name, points = points.len(), "adapter up");
        return Event::AdapterUp(adapter);
    }
    let why = format!("it does not fit the site file: {}", faults.join("; "));
    tracing::error!(adapter = %name, %why, "adapter refused");
    Event::AdapterDown { adapter, why }
}

fn fault(asset: &model::Asset, points: &[Point]) -> Option<String> {
    let name = &asset.name;
    let Some(p) = points.iter().find(|p| p.id == asset.point) else {
        return Some(format!("{name}: it has no point {:?}", asset.point));
    };
    if !p.drivable {
        return Some(format!("{name}: point {:?} cannot be driven", p.id));
    }
    let holder = match asset.lease_holder {
        LeaseHolder::Device => protocol::LeaseHolder::Device,
        LeaseHolder::Adapter => protocol::LeaseHolder::Adapter,
        LeaseHolder::None => protocol::LeaseHolder::None,
    };
    if p.lease_holder != Some(holder) {
        let is = p.lease_holder;
        return Some(format!("{name}: its lease is held by {is:?}, the site says {holder:?}"));
    }
    let lease_ms = asset.lease.as_micros() / 1_000;
    if p.lease_shortest_ms.is_some_and(|least| lease_ms < least as i64) {
        return Some(format!("{name}: it cannot keep a lease as short as {}", asset.lease));
    }
    let fits = p.rest.is_some_and(|r| {
        let pairs = [
            (r.lease_out, asset.rest.lease_out),
            (r.input_end, asset.rest.input_end),
            (r.trip, asset.rest.trip),
            (r.stop, asset.rest.stop),
        ];
        pairs.iter().all(|(theirs, ours)| same(*theirs, *ours))
    });
    (!fits).then(|| format!("{name}: its rest actions are not those of the site file"))
}

const fn same(theirs: protocol::RestAction, ours: RestAction) -> bool {
    matches!(
        (theirs, ours),
        (protocol::RestAction::Close, RestAction::Close)
            | (protocol::RestAction::Open, RestAction::Open)
            | (protocol::RestAction::Stop, RestAction::Stop)
            | (protocol::RestAction::Hold, RestAction::Hold)
            | (protocol::RestAction::HandToLocal, RestAction::HandToLocal)
    )
}
