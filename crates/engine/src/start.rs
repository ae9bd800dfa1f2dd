//! The first event of a term: what the journal carried over is taken up.

use interlock::Action;
use model::{AssetKind, PlanId};
use units::{CubicMetres, Span, Utc, Window};

use crate::meter::BUCKET;
use crate::state::State;
use crate::{Carried, Effects, Entry, Mode, OpenIntent, Stamp};

/// Every start is observe. A standing authorisation is remembered and takes effect once the site is
/// armed, if the binary, site and licence are the same and the outage was short (rule 3).
pub(crate) fn begin(state: &mut State, stamp: &Stamp, carried: Carried, effects: &mut Effects) {
    state.mode = Mode::Observe;
    effects.records.push(Entry::Started {
        build: state.config.build.clone(),
        site_digest: state.site.site_digest.clone(),
        licence_digest: state.site.licence_digest.clone(),
        mode: Mode::Observe,
    });
    state.resume = resumable(state, stamp, &carried);
    state.authorisation = carried.authorisation.clone().filter(|a| a.until > stamp.utc);
    for (bucket, volume, tide) in &carried.released {
        state.tallies.add(*bucket, *volume, *tide);
    }
    for (asset, cause) in carried.latches {
        match asset {
            Some(a) => state.assets[a.index()].tripped = Some(cause),
            None => state.safe_latch = Some(cause),
        }
    }
    for (asset, who) in carried.locks {
        state.assets[asset.index()].locked_by = Some(who);
    }
    for (asset, until) in carried.holds {
        state.assets[asset.index()].hold_until = Some(until).filter(|u| *u > stamp.utc);
    }
    for (asset, at) in carried.starts {
        state.assets[asset.index()].starts.push(at);
    }
    // After a restart a persisted timer begins at its full length.
    for asset in &state.site.assets {
        if matches!(asset.kind, AssetKind::Pump(_)) {
            state.assets[asset.id.index()].last_stop = Some(stamp.boot);
        }
    }
    for intent in &carried.open_intents {
        state.assets[intent.asset.index()].carried = Some(intent.action);
        count_unknown(state, stamp, intent, carried.last_seen, effects);
    }
    state.next_plan = carried.last_plan.map_or(1, |PlanId(n)| n + 1);
}

fn resumable(state: &State, stamp: &Stamp, c: &Carried) -> Option<crate::StandingAuthorisation> {
    let auth = c.authorisation.clone()?;
    let site = &state.site;
    let outage = stamp.utc - c.last_seen?;
    let same = |build: &str, site_digest: &str, licence_digest: &str| {
        build == state.config.build
            && site_digest == site.site_digest
            && licence_digest == site.licence_digest
    };
    let good = c.mode == Some(Mode::Automatic)
        && auth.until > stamp.utc
        && outage >= Span::ZERO
        && outage <= site.settings.outage_max
        && same(&auth.build, &auth.site_digest, &auth.licence_digest)
        && same(&c.build, &c.site_digest, &c.licence_digest);
    good.then_some(auth)
}

/// A command whose end nobody saw counts as a full release, from the last sum that was kept until
/// the asset must have come to rest by itself.
fn count_unknown(
    state: &mut State,
    stamp: &Stamp,
    intent: &OpenIntent,
    last_seen: Option<Utc>,
    effects: &mut Effects,
) {
    let Some(outlet_no) = state.outlet_no(intent.asset) else { return };
    let outlet = &state.site.outlets[outlet_no];
    let (Action::Open(_), AssetKind::Gate(gate)) =
        (intent.action, &state.site.asset(outlet.gate).kind)
    else {
        return;
    };
    let from = last_seen.unwrap_or(intent.at).floor_to(BUCKET);
    let asset = state.site.asset(intent.asset);
    let rested = last_seen.unwrap_or(intent.at) + asset.lease + gate.stroke + outlet.drain_down;
    let until = rested.min(stamp.utc);
    let flow_m3_s = licence::flow_cap(&state.site, intent.asset).map_or(0.0, |c| c.max.get());
    let mut at = from;
    while at < until {
        let bucket = Window::new(at, at + BUCKET).expect("a bucket is not empty");
        let s = (until.min(bucket.end()) - at).as_seconds();
        // The tide is found when a forecast is there; until then the sums by time are right.
        let tide = state.tallies.last_tide().unwrap_or(0);
        let volume = CubicMetres::of(flow_m3_s * s);
        state.tallies.add(bucket, volume, tide);
        effects.records.push(Entry::Released { tide, bucket, volume, estimated: true });
        at = bucket.end();
    }
}
