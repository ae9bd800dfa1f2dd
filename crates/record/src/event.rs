//! What the engine was told, as bytes, so that a day can be told again.
//!
//! An event is a form byte, a byte with its kind (the top bit says that the clock was not trusted),
//! the rest of its stamp, and its fields. Names are written out, but for the signals of a frame: see
//! `frame`. What a job gave is not kept, only its digest: whoever replays does the job again, and
//! sees by the digest whether the product is the same. What a term took over at its start is kept in
//! full, though it follows from the rows before: so a replay begins at any start with one segment
//! and the site file in hand, and a fold that has changed since shows as a difference of its own,
//! apart from those of the engine.

use engine::{Act, Carried, ClockTrust, Event, Outcome, Product, Stamp};
use model::{AdapterId, JobId, Reading, Site, Term};
use units::{Mono, Utc};

use crate::decode::outcome;
use crate::encode::put_outcome;
use crate::reader::{Reader, unknown};
use crate::writer::Writer;
use crate::{RecordError, act, carried, frame, product};

/// Of all events. The digests of products belong to it: a change in how they are taken raises it.
const FORM: u8 = 1;
const DISTRUSTED: u8 = 0x80;

/// An event as it was kept: the engine's own, but for the products of jobs.
#[derive(Clone, PartialEq, Debug)]
pub enum Recorded {
    Started(Box<Carried>),
    Frame(Vec<Reading>),
    AdapterUp(AdapterId),
    AdapterDown { adapter: AdapterId, why: String },
    Outcome { command: u64, outcome: Outcome },
    Act(Act),
    JobDone { job: JobId, product: ProductSeen },
    JournalLost { why: String },
    JournalBack,
    ClockChanged { why: String },
    Stopping { why: String },
    Replan,
    Wake,
}

/// What is kept of a product.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum ProductSeen {
    /// The digest is over every field, to the bit.
    Forecast {
        digest: u64,
    },
    Plan {
        digest: u64,
    },
    Failed(String),
}

impl Recorded {
    /// What is kept of an event.
    pub fn of(event: &Event) -> Self {
        match event {
            Event::Started(carried) => Self::Started(carried.clone()),
            Event::Frame(readings) => Self::Frame(readings.clone()),
            Event::AdapterUp(adapter) => Self::AdapterUp(*adapter),
            Event::AdapterDown { adapter, why } => {
                Self::AdapterDown { adapter: *adapter, why: why.clone() }
            }
            Event::Outcome { command, outcome } => {
                Self::Outcome { command: *command, outcome: outcome.clone() }
            }
            Event::Act(act) => Self::Act(act.clone()),
            Event::JobDone { job, product } => {
                Self::JobDone { job: *job, product: ProductSeen::of(product) }
            }
            Event::JournalLost { why } => Self::JournalLost { why: why.clone() },
            Event::JournalBack => Self::JournalBack,
            Event::ClockChanged { why } => Self::ClockChanged { why: why.clone() },
            Event::Stopping { why } => Self::Stopping { why: why.clone() },
            Event::Replan => Self::Replan,
            Event::Wake => Self::Wake,
        }
    }
}

impl ProductSeen {
    pub fn of(product: &Product) -> Self {
        match product {
            Product::Forecast(f) => Self::Forecast { digest: product::of_forecast(f) },
            Product::Plan(p) => Self::Plan { digest: product::of_plan(p) },
            Product::Failed(why) => Self::Failed(why.clone()),
        }
    }
}

/// The bytes of an event and its stamp. Ids must be those of `site`; an asset or adapter beyond its
/// lists is a fault of ours and panics.
pub fn encode_event(stamp: &Stamp, event: &Event, site: &Site) -> Vec<u8> {
    let mut w = Writer::new(site);
    let Stamp { seq, term, utc, boot, trust } = *stamp;
    w.u8(FORM);
    let trust = if trust == ClockTrust::Trusted { 0 } else { DISTRUSTED };
    w.u8(kind::of(event) | trust);
    w.small(seq);
    w.small(term.0);
    w.utc(utc);
    w.small(boot.as_nanos());
    match event {
        Event::Started(c) => carried::put(&mut w, c),
        Event::Frame(readings) => frame::put(&mut w, readings, utc, site),
        Event::AdapterUp(adapter) => w.adapter(*adapter),
        Event::AdapterDown { adapter, why } => {
            w.adapter(*adapter);
            w.text(why);
        }
        Event::Outcome { command, outcome } => {
            w.u64(*command);
            put_outcome(&mut w, outcome);
        }
        Event::Act(act) => act::put(&mut w, act),
        Event::JobDone { job, product } => {
            w.u64(job.0);
            put_product(&mut w, product);
        }
        Event::JournalLost { why } | Event::ClockChanged { why } | Event::Stopping { why } => {
            w.text(why);
        }
        Event::JournalBack | Event::Replan | Event::Wake => {}
    }
    w.bytes
}

/// The event and its stamp, for the site file that it was written under. Any bytes may come:
/// refuses, without panicking, what is short, long, of another form, of another site file's signals,
/// or names what this one does not have.
pub fn decode_event(bytes: &[u8], site: &Site) -> Result<(Stamp, Recorded), RecordError> {
    let mut names = site;
    let mut r = Reader::new(bytes, &mut names);
    let form = r.u8("form of the event")?;
    if form != FORM {
        return Err(unknown("form of the event", form));
    }
    let head = r.u8("event")?;
    let stamp = Stamp {
        seq: r.small("sequence")?,
        term: Term(r.small("term")?),
        utc: r.utc("time")?,
        boot: Mono::from_nanos(r.small("boot clock")?),
        trust: match head & DISTRUSTED {
            0 => ClockTrust::Trusted,
            _ => ClockTrust::Distrusted,
        },
    };
    let event = take(&mut r, head & !DISTRUSTED, stamp.utc, site)?;
    r.end()?;
    Ok((stamp, event))
}

fn take(r: &mut Reader<'_>, kind: u8, now: Utc, site: &Site) -> Result<Recorded, RecordError> {
    Ok(match kind {
        kind::STARTED => Recorded::Started(Box::new(carried::take(r)?)),
        kind::FRAME => Recorded::Frame(frame::take(r, now, site)?),
        kind::ADAPTER_UP => Recorded::AdapterUp(r.adapter()?),
        kind::ADAPTER_DOWN => Recorded::AdapterDown { adapter: r.adapter()?, why: r.text("why")? },
        kind::OUTCOME => Recorded::Outcome { command: r.u64("command")?, outcome: outcome(r)? },
        kind::ACT => Recorded::Act(act::take(r)?),
        kind::JOB_DONE => {
            Recorded::JobDone { job: JobId(r.u64("job")?), product: take_product(r)? }
        }
        kind::JOURNAL_LOST => Recorded::JournalLost { why: r.text("why")? },
        kind::JOURNAL_BACK => Recorded::JournalBack,
        kind::CLOCK_CHANGED => Recorded::ClockChanged { why: r.text("why")? },
        kind::STOPPING => Recorded::Stopping { why: r.text("why")? },
        kind::REPLAN => Recorded::Replan,
        kind::WAKE => Recorded::Wake,
        n => return Err(unknown("event", n)),
    })
}

fn put_product(w: &mut Writer<'_>, product: &Product) {
    match ProductSeen::of(product) {
        ProductSeen::Forecast { digest } => {
            w.u8(1);
            w.u64(digest);
        }
        ProductSeen::Plan { digest } => {
            w.u8(2);
            w.u64(digest);
        }
        ProductSeen::Failed(why) => {
            w.u8(3);
            w.text(&why);
        }
    }
}

fn take_product(r: &mut Reader<'_>) -> Result<ProductSeen, RecordError> {
    Ok(match r.u8("product")? {
        1 => ProductSeen::Forecast { digest: r.u64("digest of the product")? },
        2 => ProductSeen::Plan { digest: r.u64("digest of the product")? },
        3 => ProductSeen::Failed(r.text("why")?),
        n => return Err(unknown("product", n)),
    })
}

/// Every kind of event that this version writes, with its name.
pub fn event_kinds() -> impl Iterator<Item = (u8, &'static str)> {
    kind::NAMES.into_iter()
}

/// Numbers of the kinds of event. A number is never reused.
mod kind {
    use engine::Event;

    pub(super) const STARTED: u8 = 1;
    pub(super) const FRAME: u8 = 2;
    pub(super) const ADAPTER_UP: u8 = 3;
    pub(super) const ADAPTER_DOWN: u8 = 4;
    pub(super) const OUTCOME: u8 = 5;
    pub(super) const ACT: u8 = 6;
    pub(super) const JOB_DONE: u8 = 7;
    pub(super) const JOURNAL_LOST: u8 = 8;
    pub(super) const JOURNAL_BACK: u8 = 9;
    pub(super) const CLOCK_CHANGED: u8 = 10;
    pub(super) const STOPPING: u8 = 11;
    pub(super) const WAKE: u8 = 12;
    pub(super) const REPLAN: u8 = 13;

    pub(super) const NAMES: [(u8, &str); 13] = [
        (STARTED, "started"),
        (FRAME, "frame"),
        (ADAPTER_UP, "adapter-up"),
        (ADAPTER_DOWN, "adapter-down"),
        (OUTCOME, "outcome"),
        (ACT, "act"),
        (JOB_DONE, "job-done"),
        (JOURNAL_LOST, "journal-lost"),
        (JOURNAL_BACK, "journal-back"),
        (CLOCK_CHANGED, "clock-changed"),
        (STOPPING, "stopping"),
        (WAKE, "wake"),
        (REPLAN, "replan"),
    ];

    pub(super) const fn of(event: &Event) -> u8 {
        match event {
            Event::Started(_) => STARTED,
            Event::Frame(_) => FRAME,
            Event::AdapterUp(_) => ADAPTER_UP,
            Event::AdapterDown { .. } => ADAPTER_DOWN,
            Event::Outcome { .. } => OUTCOME,
            Event::Act(_) => ACT,
            Event::JobDone { .. } => JOB_DONE,
            Event::JournalLost { .. } => JOURNAL_LOST,
            Event::JournalBack => JOURNAL_BACK,
            Event::ClockChanged { .. } => CLOCK_CHANGED,
            Event::Stopping { .. } => STOPPING,
            Event::Wake => WAKE,
            Event::Replan => REPLAN,
        }
    }
}
