//! What one term hands to the next, as bytes: for snapshots of the fold and for the event that
//! begins a term.

use engine::{Carried, OpenIntent, StandingAuthorisation};
use model::{AssetId, PlanId, Term, TideNumber};
use units::{CubicMetres, Span, Utc, Window};

use crate::RecordError;
use crate::reader::{Reader, unknown};
use crate::writer::Writer;

type Read<T> = Result<T, RecordError>;
pub(crate) type Released = Vec<(Window, CubicMetres, TideNumber)>;

/// The buckets of the usual kind say only this of their time: right after the last, of the usual
/// length, in the same tide.
const FOLLOWS: u8 = 1;
const USUAL: u8 = 2;
const SAME_TIDE: u8 = 4;
const BUCKET: Span = Span::minutes(5);

pub(crate) fn put(w: &mut Writer<'_>, c: &Carried) {
    let Carried {
        term,
        build,
        site_digest,
        licence_digest,
        mode,
        authorisation,
        last_seen,
        latches,
        locks,
        holds,
        released,
        open_intents,
        starts,
        last_plan,
    } = c;
    w.option(*term, |w, Term(n)| w.u64(n));
    w.text(build);
    w.text(site_digest);
    w.text(licence_digest);
    w.option(*mode, Writer::mode);
    w.option(authorisation.as_ref(), put_authorisation);
    w.option(*last_seen, Writer::utc);
    w.list(latches, |w, (asset, cause)| {
        w.option(*asset, |w, a| w.asset(a));
        w.text(cause);
    });
    w.list(locks, |w, (asset, who)| {
        w.asset(*asset);
        w.text(who);
    });
    put_instants(w, holds);
    w.list(open_intents, put_intent);
    put_instants(w, starts);
    w.option(*last_plan, |w, PlanId(n)| w.u64(n));
    put_released(w, released);
}

pub(crate) fn take(r: &mut Reader<'_>) -> Read<Carried> {
    Ok(Carried {
        term: r.option("term", |r| r.u64("term"))?.map(Term),
        build: r.text("build")?,
        site_digest: r.text("site digest")?,
        licence_digest: r.text("licence digest")?,
        mode: r.option("mode", |r| r.mode())?,
        authorisation: r.option("authorisation", take_authorisation)?,
        last_seen: r.option("last seen", |r| r.utc("last seen"))?,
        latches: r.list("latches", |r| {
            Ok((r.option("asset", |r| r.asset())?, r.text("cause of a latch")?))
        })?,
        locks: r.list("locks", |r| Ok((r.asset()?, r.text("who holds a lock")?)))?,
        holds: take_instants(r, "holds")?,
        open_intents: r.list("open intents", take_intent)?,
        starts: take_instants(r, "starts")?,
        last_plan: r.option("last plan", |r| r.u64("last plan"))?.map(PlanId),
        released: take_released(r)?,
    })
}

fn put_authorisation(w: &mut Writer<'_>, a: &StandingAuthorisation) {
    let StandingAuthorisation { by, reason, until, build, site_digest, licence_digest } = a;
    w.text(by);
    w.text(reason);
    w.utc(*until);
    w.text(build);
    w.text(site_digest);
    w.text(licence_digest);
}

fn take_authorisation(r: &mut Reader<'_>) -> Read<StandingAuthorisation> {
    Ok(StandingAuthorisation {
        by: r.text("by")?,
        reason: r.text("reason")?,
        until: r.utc("until")?,
        build: r.text("build")?,
        site_digest: r.text("site digest")?,
        licence_digest: r.text("licence digest")?,
    })
}

pub(crate) fn put_intent(w: &mut Writer<'_>, intent: &OpenIntent) {
    let OpenIntent { asset, command, action, at } = *intent;
    w.asset(asset);
    w.u64(command);
    w.action(action);
    w.utc(at);
}

pub(crate) fn take_intent(r: &mut Reader<'_>) -> Read<OpenIntent> {
    Ok(OpenIntent {
        asset: r.asset()?,
        command: r.u64("command")?,
        action: r.action()?,
        at: r.utc("at")?,
    })
}

fn put_instants(w: &mut Writer<'_>, list: &[(AssetId, Utc)]) {
    w.list(list, |w, (asset, at)| {
        w.asset(*asset);
        w.utc(*at);
    });
}

fn take_instants(r: &mut Reader<'_>, field: &'static str) -> Read<Vec<(AssetId, Utc)>> {
    r.list(field, |r| Ok((r.asset()?, r.utc(field)?)))
}

/// Nine bytes for a bucket of the usual kind.
fn put_released(w: &mut Writer<'_>, released: &Released) {
    w.small(released.len() as u64);
    let (mut end, mut last_tide) = (0, 0);
    for (bucket, volume, tide) in released {
        let start = bucket.start().as_micros();
        let length = bucket.end().as_micros().wrapping_sub(start);
        let follows = start == end;
        let usual = length == BUCKET.as_micros();
        let same_tide = *tide == last_tide;
        let flag = |on: bool, bit: u8| if on { bit } else { 0 };
        w.u8(flag(follows, FOLLOWS) | flag(usual, USUAL) | flag(same_tide, SAME_TIDE));
        if !follows {
            w.step(end, start);
        }
        if !usual {
            w.small(length.cast_unsigned());
        }
        if !same_tide {
            w.step(last_tide, *tide);
        }
        w.f64(volume.get());
        (end, last_tide) = (bucket.end().as_micros(), *tide);
    }
}

fn take_released(r: &mut Reader<'_>) -> Read<Released> {
    let n = r.small_count("released", 9)?;
    let mut released = Released::new();
    let (mut end, mut last_tide) = (0, 0);
    for _ in 0..n {
        let flags = r.u8("bucket")?;
        if flags > FOLLOWS | USUAL | SAME_TIDE {
            return Err(unknown("bucket", flags));
        }
        let start = if flags & FOLLOWS == 0 { r.step("bucket", end)? } else { end };
        let length = match flags & USUAL {
            0 => r.small("bucket")?.cast_signed(),
            _ => BUCKET.as_micros(),
        };
        let tide = if flags & SAME_TIDE == 0 { r.step("tide", last_tide)? } else { last_tide };
        end = start.wrapping_add(length);
        let bucket = Window::new(Utc::from_micros(start), Utc::from_micros(end))
            .map_err(|e| RecordError::Bad { field: "bucket", why: e.to_string() })?;
        released.push((bucket, r.volume("volume")?, tide));
        last_tide = tide;
    }
    Ok(released)
}
