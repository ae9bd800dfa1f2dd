//! Causes: who says so, about what, what it is and what it would have to be.

use std::collections::BTreeSet;
use std::sync::{Mutex, PoisonError};

use model::{About, By, Cause, Fact, Is, MustBe};

use crate::RecordError;
use crate::reader::{Reader, unknown};
use crate::writer::Writer;

pub(crate) fn put(w: &mut Writer<'_>, c: &Cause) {
    match c.by {
        By::AssetState => w.u8(1),
        By::Interlock(code) => {
            w.u8(2);
            w.text(code);
        }
        By::Latch => w.u8(3),
        By::Clause(id) => {
            w.u8(4);
            w.clause(id);
        }
        By::Mode => w.u8(5),
        By::Armed => w.u8(6),
        By::Person => w.u8(7),
        By::Plan => w.u8(8),
    }
    put_about(w, c.fact.about);
    put_is(w, &c.fact.is);
    put_must_be(w, &c.fact.must_be);
}

pub(crate) fn take(r: &mut Reader<'_>) -> Result<Cause, RecordError> {
    let by = match r.u8("by")? {
        1 => By::AssetState,
        2 => By::Interlock(r.fixed_text("interlock")?),
        3 => By::Latch,
        4 => By::Clause(r.clause()?),
        5 => By::Mode,
        6 => By::Armed,
        7 => By::Person,
        8 => By::Plan,
        n => return Err(unknown("by", n)),
    };
    let (about, is, must_be) = (take_about(r)?, take_is(r)?, take_must_be(r)?);
    Ok(Cause { by, fact: Fact { about, is, must_be } })
}

fn put_about(w: &mut Writer<'_>, about: About) {
    let (tag, asset) = match about {
        About::Signal(id) => {
            w.u8(1);
            return w.signal(id);
        }
        About::Adapter(id) => {
            w.u8(8);
            return w.adapter(id);
        }
        About::Now => (2, None),
        About::Mode => (3, None),
        About::Latch => (4, None),
        About::ClockTrust => (5, None),
        About::Journal => (6, None),
        About::Forecast => (7, None),
        About::Position(a) => (9, Some(a)),
        About::Lock(a) => (10, Some(a)),
        About::Selector(a) => (11, Some(a)),
        About::Hold(a) => (12, Some(a)),
        About::Confirmation(a) => (13, Some(a)),
        About::LastMove(a) => (14, Some(a)),
        About::VolumeThisTide => (15, None),
        About::VolumeRolling => (16, None),
        About::VolumeMonth => (17, None),
        About::MeanFlow => (18, None),
        About::Plan => (19, None),
    };
    w.u8(tag);
    if let Some(asset) = asset {
        w.asset(asset);
    }
}

fn take_about(r: &mut Reader<'_>) -> Result<About, RecordError> {
    Ok(match r.u8("about")? {
        1 => About::Signal(r.signal()?),
        2 => About::Now,
        3 => About::Mode,
        4 => About::Latch,
        5 => About::ClockTrust,
        6 => About::Journal,
        7 => About::Forecast,
        8 => About::Adapter(r.adapter()?),
        9 => About::Position(r.asset()?),
        10 => About::Lock(r.asset()?),
        11 => About::Selector(r.asset()?),
        12 => About::Hold(r.asset()?),
        13 => About::Confirmation(r.asset()?),
        14 => About::LastMove(r.asset()?),
        15 => About::VolumeThisTide,
        16 => About::VolumeRolling,
        17 => About::VolumeMonth,
        18 => About::MeanFlow,
        19 => About::Plan,
        n => return Err(unknown("about", n)),
    })
}

fn put_is(w: &mut Writer<'_>, is: &Is) {
    match is {
        Is::Number(v) => {
            w.u8(1);
            w.f64(*v);
        }
        Is::Instant(t) => {
            w.u8(2);
            w.utc(*t);
        }
        Is::Words(s) => {
            w.u8(3);
            w.text(s);
        }
        Is::Nothing => w.u8(4),
    }
}

fn take_is(r: &mut Reader<'_>) -> Result<Is, RecordError> {
    match r.u8("is")? {
        1 => r.f64("number").map(Is::Number),
        2 => r.utc("instant").map(Is::Instant),
        3 => r.text("words").map(Is::Words),
        4 => Ok(Is::Nothing),
        n => Err(unknown("is", n)),
    }
}

fn put_must_be(w: &mut Writer<'_>, must: &MustBe) {
    match must {
        MustBe::AtLeast(v) => {
            w.u8(1);
            w.f64(*v);
        }
        MustBe::AtMost(v) => {
            w.u8(2);
            w.f64(*v);
        }
        MustBe::Inside(window) => {
            w.u8(3);
            w.window(window);
        }
        MustBe::After(t) => {
            w.u8(4);
            w.utc(*t);
        }
        MustBe::Words(s) => {
            w.u8(5);
            w.text(s);
        }
    }
}

fn take_must_be(r: &mut Reader<'_>) -> Result<MustBe, RecordError> {
    match r.u8("must be")? {
        1 => r.f64("least").map(MustBe::AtLeast),
        2 => r.f64("most").map(MustBe::AtMost),
        3 => r.window("inside").map(MustBe::Inside),
        4 => r.utc("after").map(MustBe::After),
        5 => r.fixed_text("must be").map(MustBe::Words),
        n => Err(unknown("must be", n)),
    }
}

/// Codes and fixed phrases are `&'static str` in the program. Those that come back from a row are
/// kept for the life of the process, each once; the bounds keep a strange file from filling memory.
static FIXED: Mutex<BTreeSet<&'static str>> = Mutex::new(BTreeSet::new());
const FIXED_MOST: usize = 512;
const FIXED_BYTES_MAX: usize = 256;

pub(crate) fn fixed(field: &'static str, text: &str) -> Result<&'static str, RecordError> {
    let mut seen = FIXED.lock().unwrap_or_else(PoisonError::into_inner);
    if let Some(known) = seen.get(text) {
        return Ok(known);
    }
    if text.len() > FIXED_BYTES_MAX || seen.len() >= FIXED_MOST {
        let why = format!("no fixed phrase of ours: {} bytes", text.len());
        return Err(RecordError::Bad { field, why });
    }
    let kept: &'static str = Box::leak(text.to_owned().into_boxed_str());
    seen.insert(kept);
    Ok(kept)
}
