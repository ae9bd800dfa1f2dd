//! From an entry to a draft, by hand, one arm a kind.

use engine::{Entry, Outcome};
use interlock::Action;
use model::{AssetId, Site};
use units::Mono;

use crate::writer::Writer;
use crate::{Draft, VERSION, act, cause, kind};

/// The subject of rows that are about the whole site.
pub const SITE: &str = "site";

/// The row's content for an entry. Ids must be those of `site`, which is where the engine got them;
/// an id beyond the site's lists is a fault of ours and panics.
pub fn encode(entry: &Entry, site: &Site) -> Draft {
    let mut w = Writer::new(site);
    let kind = body(&mut w, entry);
    let (subject, cause) = (subject(entry, site), why(entry, site));
    Draft { kind, version: VERSION, subject, cause, body: w.bytes }
}

/// The body of an intent; the same for an entry and for a permit.
pub(crate) struct IntentBody {
    pub(crate) asset: AssetId,
    pub(crate) action: Action,
    pub(crate) command: u64,
    pub(crate) lease_end: Mono,
    pub(crate) state_seq: u64,
    pub(crate) readings: u64,
}

impl IntentBody {
    pub(crate) fn put(&self, w: &mut Writer<'_>) {
        w.asset(self.asset);
        w.action(self.action);
        w.u64(self.command);
        w.mono(self.lease_end);
        w.u64(self.state_seq);
        w.u64(self.readings);
    }
}

fn body(w: &mut Writer<'_>, entry: &Entry) -> u16 {
    match entry {
        Entry::Started { build, site_digest, licence_digest, mode } => {
            w.text(build);
            w.text(site_digest);
            w.text(licence_digest);
            w.mode(*mode);
            kind::STARTED
        }
        Entry::Act { act, refused } => {
            act::put(w, act);
            w.option(refused.as_deref(), Writer::text);
            kind::ACT
        }
        Entry::ModeChanged { mode, why } => {
            w.mode(*mode);
            w.text(why);
            kind::MODE_CHANGED
        }
        Entry::Armed { armed, reasons } => {
            w.flag(*armed);
            w.list(reasons, |w, r| w.text(r));
            kind::ARMED
        }
        Entry::Clock { trust, why } => {
            w.trust(*trust);
            w.text(why);
            kind::CLOCK
        }
        Entry::AdapterUp { adapter } => {
            w.text(adapter);
            kind::ADAPTER_UP
        }
        Entry::AdapterDown { adapter, why } => {
            w.text(adapter);
            w.text(why);
            kind::ADAPTER_DOWN
        }
        Entry::Stopping { why } => {
            w.text(why);
            kind::STOPPING
        }
        Entry::PlanAdopted { .. }
        | Entry::Released { .. }
        | Entry::WindowMissed { .. }
        | Entry::SpillForecast { .. } => water(w, entry),
        Entry::Decision { .. }
        | Entry::Intent { .. }
        | Entry::Outcome { .. }
        | Entry::Confirmed { .. }
        | Entry::Rest { .. }
        | Entry::Discrepancy { .. }
        | Entry::Latched { .. }
        | Entry::Reset { .. } => command(w, entry),
    }
}

fn water(w: &mut Writer<'_>, entry: &Entry) -> u16 {
    match entry {
        Entry::PlanAdopted { plan, parent, request_digest, forecast_digest, released, spill } => {
            w.u64(plan.0);
            w.option(*parent, |w, p| w.u64(p.0));
            w.u64(*request_digest);
            w.u64(*forecast_digest);
            w.f64(released.get());
            w.f64(spill.get());
            kind::PLAN_ADOPTED
        }
        Entry::Released { tide, bucket, volume, estimated } => {
            w.i64(*tide);
            w.window(bucket);
            w.f64(volume.get());
            w.flag(*estimated);
            kind::RELEASED
        }
        Entry::WindowMissed { tide, window, cause } => {
            w.i64(*tide);
            w.window(window);
            w.text(cause);
            kind::WINDOW_MISSED
        }
        Entry::SpillForecast { window, volume, clauses } => {
            w.window(window);
            w.f64(volume.get());
            w.list(clauses, |w, c| w.clause(*c));
            kind::SPILL_FORECAST
        }
        _ => unreachable!("`body` sends the four kinds above here, and no other"),
    }
}

fn command(w: &mut Writer<'_>, entry: &Entry) -> u16 {
    match entry {
        Entry::Decision { asset, action, plan, causes } => {
            w.asset(*asset);
            w.action(*action);
            w.option(*plan, |w, p| w.u64(p.0));
            w.list(causes, cause::put);
            kind::DECISION
        }
        &Entry::Intent { asset, action, command, lease_end, state_seq, readings } => {
            IntentBody { asset, action, command, lease_end, state_seq, readings }.put(w);
            kind::INTENT
        }
        Entry::Outcome { asset, command, outcome } => {
            w.asset(*asset);
            w.u64(*command);
            put_outcome(w, outcome);
            kind::OUTCOME
        }
        Entry::Confirmed { asset, command, position } => {
            w.asset(*asset);
            w.u64(*command);
            w.f64(*position);
            kind::CONFIRMED
        }
        Entry::Rest { asset, action, cause } => {
            w.asset(*asset);
            w.rest_action(*action);
            w.text(cause);
            kind::REST
        }
        Entry::Discrepancy { asset, command, wanted, found } => {
            w.asset(*asset);
            w.u64(*command);
            w.f64(*wanted);
            w.option(*found, Writer::f64);
            kind::DISCREPANCY
        }
        Entry::Latched { asset, cause } => {
            w.option(*asset, |w, a| w.asset(a));
            w.text(cause);
            kind::LATCHED
        }
        Entry::Reset { asset } => {
            w.option(*asset, |w, a| w.asset(a));
            kind::RESET
        }
        _ => unreachable!("`body` sends the eight kinds above here, and no other"),
    }
}

pub(crate) fn put_outcome(w: &mut Writer<'_>, outcome: &Outcome) {
    match outcome {
        Outcome::Accepted => w.u8(1),
        Outcome::Refused(why) => {
            w.u8(2);
            w.text(why);
        }
        Outcome::Unknown(why) => {
            w.u8(3);
            w.text(why);
        }
    }
}

fn subject(entry: &Entry, site: &Site) -> String {
    let asset = match entry {
        Entry::Decision { asset, .. }
        | Entry::Intent { asset, .. }
        | Entry::Outcome { asset, .. }
        | Entry::Confirmed { asset, .. }
        | Entry::Rest { asset, .. }
        | Entry::Discrepancy { asset, .. } => Some(*asset),
        Entry::Latched { asset, .. } | Entry::Reset { asset } => *asset,
        Entry::Act { act, .. } => act::asset(act),
        Entry::AdapterUp { adapter } | Entry::AdapterDown { adapter, .. } => {
            return adapter.clone();
        }
        _ => None,
    };
    asset.map_or_else(|| SITE.to_owned(), |a| site.asset(a).name.clone())
}

fn why(entry: &Entry, site: &Site) -> String {
    match entry {
        Entry::Act { act, refused: None } => act.reason.clone(),
        Entry::Act { refused: Some(why), .. } => format!("refused: {why}"),
        Entry::Armed { reasons, .. } => reasons.join("; "),
        Entry::ModeChanged { why, .. }
        | Entry::Clock { why, .. }
        | Entry::AdapterDown { why, .. }
        | Entry::Stopping { why } => why.clone(),
        Entry::Decision { causes, .. } => {
            let words: Vec<String> = causes.iter().map(|c| engine::say::cause(site, c)).collect();
            words.join("; ")
        }
        Entry::Outcome { outcome: Outcome::Refused(why) | Outcome::Unknown(why), .. } => {
            why.clone()
        }
        Entry::Rest { cause, .. }
        | Entry::Latched { cause, .. }
        | Entry::WindowMissed { cause, .. } => cause.clone(),
        Entry::SpillForecast { clauses, .. } => {
            let numbers: Vec<String> = clauses
                .iter()
                .map(|c| format!("clause {}", site.licence.clause(*c).number))
                .collect();
            numbers.join(", ")
        }
        _ => String::new(),
    }
}
