//! From a row back to its entry.

use engine::{Entry, Outcome};
use model::{PlanId, Site};

use crate::names::Names;
use crate::reader::{Reader, unknown};
use crate::{RecordError, Row, VERSION, act, cause, kind};

/// The entry that a row was made of, where `site` still has every name in it.
///
/// Refuses, without panicking, a kind or form of another version, a body that is short, long or
/// says what cannot be, and a name that the site file does not have (any more).
pub fn decode(row: &Row, site: &Site) -> Result<Entry, RecordError> {
    let mut names = site;
    read(row.kind, row.version, &row.body, &mut names)
}

pub(crate) fn read(
    kind: u16,
    version: u8,
    body: &[u8],
    names: &mut dyn Names,
) -> Result<Entry, RecordError> {
    if version != VERSION {
        return Err(RecordError::Unknown { kind, version });
    }
    let mut r = Reader::new(body, names);
    let entry = match kind {
        kind::DECISION..=kind::RESET => command(kind, &mut r)?,
        kind::PLAN_ADOPTED | kind::RELEASED | kind::WINDOW_MISSED | kind::SPILL_FORECAST => {
            water(kind, &mut r)?
        }
        _ => site_wide(kind, version, &mut r)?,
    };
    r.end()?;
    Ok(entry)
}

fn site_wide(kind: u16, version: u8, r: &mut Reader<'_>) -> Result<Entry, RecordError> {
    Ok(match kind {
        kind::STARTED => Entry::Started {
            build: r.text("build")?,
            site_digest: r.text("site digest")?,
            licence_digest: r.text("licence digest")?,
            mode: r.mode()?,
        },
        kind::ACT => {
            Entry::Act { act: act::take(r)?, refused: r.option("refused", |r| r.text("refused"))? }
        }
        kind::MODE_CHANGED => Entry::ModeChanged { mode: r.mode()?, why: r.text("why")? },
        kind::ARMED => Entry::Armed {
            armed: r.flag("armed")?,
            reasons: r.list("reasons", |r| r.text("reason"))?,
        },
        kind::CLOCK => Entry::Clock { trust: r.trust()?, why: r.text("why")? },
        kind::ADAPTER_UP => Entry::AdapterUp { adapter: r.text("adapter")? },
        kind::ADAPTER_DOWN => {
            Entry::AdapterDown { adapter: r.text("adapter")?, why: r.text("why")? }
        }
        kind::STOPPING => Entry::Stopping { why: r.text("why")? },
        _ => return Err(RecordError::Unknown { kind, version }),
    })
}

fn water(kind: u16, r: &mut Reader<'_>) -> Result<Entry, RecordError> {
    Ok(match kind {
        kind::PLAN_ADOPTED => Entry::PlanAdopted {
            plan: PlanId(r.u64("plan")?),
            parent: r.option("parent", |r| r.u64("parent"))?.map(PlanId),
            request_digest: r.u64("request digest")?,
            forecast_digest: r.u64("forecast digest")?,
            released: r.volume("released")?,
            spill: r.volume("spill")?,
        },
        kind::RELEASED => Entry::Released {
            tide: r.i64("tide")?,
            bucket: r.window("bucket")?,
            volume: r.volume("volume")?,
            estimated: r.flag("estimated")?,
        },
        kind::WINDOW_MISSED => Entry::WindowMissed {
            tide: r.i64("tide")?,
            window: r.window("window")?,
            cause: r.text("cause")?,
        },
        _ => Entry::SpillForecast {
            window: r.window("window")?,
            volume: r.volume("volume")?,
            clauses: r.list("clauses", |r| r.clause())?,
        },
    })
}

fn command(kind: u16, r: &mut Reader<'_>) -> Result<Entry, RecordError> {
    Ok(match kind {
        kind::DECISION => Entry::Decision {
            asset: r.asset()?,
            action: r.action()?,
            plan: r.option("plan", |r| r.u64("plan"))?.map(PlanId),
            causes: r.list("causes", cause::take)?,
        },
        kind::INTENT => Entry::Intent {
            asset: r.asset()?,
            action: r.action()?,
            command: r.u64("command")?,
            lease_end: r.mono("lease end")?,
            state_seq: r.u64("state sequence")?,
            readings: r.u64("readings")?,
        },
        kind::OUTCOME => {
            Entry::Outcome { asset: r.asset()?, command: r.u64("command")?, outcome: outcome(r)? }
        }
        kind::CONFIRMED => Entry::Confirmed {
            asset: r.asset()?,
            command: r.u64("command")?,
            position: r.f64("position")?,
        },
        kind::REST => {
            Entry::Rest { asset: r.asset()?, action: r.rest_action()?, cause: r.text("cause")? }
        }
        kind::DISCREPANCY => Entry::Discrepancy {
            asset: r.asset()?,
            command: r.u64("command")?,
            wanted: r.f64("wanted")?,
            found: r.option("found", |r| r.f64("found"))?,
        },
        kind::LATCHED => {
            Entry::Latched { asset: r.option("asset", |r| r.asset())?, cause: r.text("cause")? }
        }
        _ => Entry::Reset { asset: r.option("asset", |r| r.asset())? },
    })
}

pub(crate) fn outcome(r: &mut Reader<'_>) -> Result<Outcome, RecordError> {
    match r.u8("outcome")? {
        1 => Ok(Outcome::Accepted),
        2 => r.text("why").map(Outcome::Refused),
        3 => r.text("why").map(Outcome::Unknown),
        n => Err(unknown("outcome", n)),
    }
}
