//! A sealed segment: what one day saw, in a file that never changes again.
//!
//! ```text
//! "tidereeve segment 1\n" | site day (days since 1970-01-01) | events: how many, zstd of (length,
//! bytes) each | minutes: how many, zstd of columns
//! columns: instants as steps | signals: how many, then for each its name, then minute by minute
//! exponent, quality, and the value as a step from the one before (0 where there is none)
//! ```

use std::io::{Read, Write};

use units::Utc;
use zstd::stream::{read, write};

use crate::varint::{Taker, fold, put, put_blob, put_step, unfold};
use crate::{Minute, MinuteReading};

const MAGIC: &[u8] = b"tidereeve segment 1\n";
const LEVEL: i32 = 9;
/// What a day's minutes may unfold to: some hundred signals.
const MINUTES_UNFOLDED_MOST: u64 = 64 << 20;
/// No event is larger; what claims to be is damage.
const EVENT_MOST: u64 = 16 << 20;
/// Stands where a minute has no value for a signal; values are moved up by one.
const NONE: u64 = 0;

/// One row of the inputs: length and bytes of each event.
pub(crate) fn put_events(events: &[Vec<u8>]) -> Vec<u8> {
    let mut out = Vec::new();
    events.iter().for_each(|e| put_blob(&mut out, e));
    out
}

/// Minutes as they wait for the seal: the same columns, for few minutes.
pub(crate) fn put_minutes(minutes: &[Minute]) -> Vec<u8> {
    let mut out = Vec::new();
    if !minutes.is_empty() {
        put_columns(&mut out, minutes);
    }
    out
}

pub(crate) fn take_minutes(bytes: &[u8]) -> Option<Vec<Minute>> {
    if bytes.is_empty() {
        return Some(Vec::new());
    }
    let mut taker = Taker(bytes);
    let minutes = take_columns(&mut taker)?;
    taker.0.is_empty().then_some(minutes)
}

/// A segment while it is being made.
pub(crate) struct Making {
    day: i64,
    events: u64,
    packed: write::Encoder<'static, Vec<u8>>,
    minutes: Vec<Minute>,
}

/// A finished one.
pub(crate) struct Made {
    pub(crate) bytes: Vec<u8>,
    pub(crate) events: u64,
    pub(crate) minutes: u64,
}

impl Making {
    pub(crate) fn new(day: i64) -> std::io::Result<Self> {
        let packed = write::Encoder::new(Vec::new(), LEVEL)?;
        Ok(Self { day, events: 0, packed, minutes: Vec::new() })
    }

    /// One row of the inputs, as `put_events` and `put_minutes` made it.
    pub(crate) fn push(&mut self, events: &[u8], minutes: &[u8]) -> std::io::Result<()> {
        let mut taker = Taker(events);
        while let Some(_event) = taker.blob() {
            self.events += 1;
        }
        self.packed.write_all(events)?;
        // Damage in what waits cannot be mended; what reads is kept.
        self.minutes.extend(take_minutes(minutes).unwrap_or_default());
        Ok(())
    }

    pub(crate) fn finish(self) -> std::io::Result<Made> {
        let mut bytes = MAGIC.to_vec();
        put_step(&mut bytes, 0, self.day.cast_unsigned());
        put(&mut bytes, self.events);
        put_blob(&mut bytes, &self.packed.finish()?);
        let mut columns = Vec::new();
        put_columns(&mut columns, &self.minutes);
        put(&mut bytes, self.minutes.len() as u64);
        put_blob(&mut bytes, &zstd::bulk::compress(&columns, LEVEL)?);
        Ok(Made { bytes, events: self.events, minutes: self.minutes.len() as u64 })
    }
}

/// A segment's bytes, taken apart. `None` from its parts where they do not read.
pub(crate) struct Segment<'a> {
    events: u64,
    packed: &'a [u8],
    minutes: &'a [u8],
}

impl<'a> Segment<'a> {
    pub(crate) fn new(bytes: &'a [u8]) -> Option<Self> {
        let mut taker = Taker(bytes.strip_prefix(MAGIC)?);
        let _day = taker.step(0)?;
        let events = taker.u64()?;
        let packed = taker.blob()?;
        let _count = taker.u64()?;
        let minutes = taker.blob()?;
        taker.0.is_empty().then_some(Self { events, packed, minutes })
    }

    /// Each event in order, unfolded as it is read.
    pub(crate) fn events(&self, visit: &mut dyn FnMut(&[u8])) -> Option<()> {
        let mut stream = read::Decoder::new(self.packed).ok()?;
        let mut event = Vec::new();
        for _ in 0..self.events {
            let length = length(&mut stream)?;
            event.clear();
            let got = stream.by_ref().take(length).read_to_end(&mut event).ok()?;
            if got as u64 != length {
                return None;
            }
            visit(&event);
        }
        Some(())
    }

    pub(crate) fn minutes(&self) -> Option<Vec<Minute>> {
        let mut columns = Vec::new();
        let stream = read::Decoder::new(self.minutes).ok()?;
        stream.take(MINUTES_UNFOLDED_MOST).read_to_end(&mut columns).ok()?;
        take_columns(&mut Taker(&columns))
    }
}

/// A length in front of an event, from a stream.
fn length(stream: &mut impl Read) -> Option<u64> {
    let mut bytes = Vec::new();
    loop {
        let mut one = [0];
        stream.read_exact(&mut one).ok()?;
        bytes.push(one[0]);
        if one[0] < 0x80 {
            return Taker(&bytes).u64().filter(|n| *n <= EVENT_MOST);
        }
        if bytes.len() > 10 {
            return None;
        }
    }
}

fn put_columns(out: &mut Vec<u8>, minutes: &[Minute]) {
    put(out, minutes.len() as u64);
    let mut last = 0;
    for minute in minutes {
        let at = minute.at.as_micros().cast_unsigned();
        put_step(out, last, at);
        last = at;
    }
    let mut names: Vec<&str> = Vec::new();
    for reading in minutes.iter().flat_map(|m| &m.readings) {
        if !names.contains(&reading.signal.as_str()) {
            names.push(&reading.signal);
        }
    }
    put(out, names.len() as u64);
    for name in names {
        put_blob(out, name.as_bytes());
        put_column(out, minutes, name);
    }
}

/// Runs of (exponent, quality), then values: what hardly changes and what always does, apart.
fn put_column(out: &mut Vec<u8>, minutes: &[Minute], name: &str) {
    let readings: Vec<Option<&MinuteReading>> =
        minutes.iter().map(|m| m.readings.iter().find(|r| r.signal == name)).collect();
    let kind = |r: &Option<&MinuteReading>| r.map_or((0, ABSENT), |r| (r.exponent, r.quality));
    for run in readings.chunk_by(|a, b| kind(a) == kind(b)) {
        put(out, run.len() as u64);
        let (exponent, quality) = kind(&run[0]);
        out.extend([exponent.cast_unsigned(), quality]);
    }
    let mut last = 0_i64;
    for steps in readings.iter().map(|r| r.and_then(|r| r.steps)) {
        match steps.map(i64::from) {
            None => put(out, NONE),
            Some(now) => {
                put(out, 1 + fold(now - last));
                last = now;
            }
        }
    }
}

/// A quality that says: the signal was not in that minute.
const ABSENT: u8 = u8::MAX;

fn take_columns(taker: &mut Taker<'_>) -> Option<Vec<Minute>> {
    let count = taker.below(taker.0.len() + 1)?;
    let mut minutes = Vec::new();
    let mut last = 0;
    for _ in 0..count {
        last = taker.step(last)?;
        minutes.push(Minute { at: Utc::from_micros(last.cast_signed()), readings: Vec::new() });
    }
    let names = taker.below(taker.0.len() + 1)?;
    for _ in 0..names {
        let name = core::str::from_utf8(taker.blob()?).ok()?.to_owned();
        take_column(taker, &name, &mut minutes)?;
    }
    Some(minutes)
}

fn take_column(taker: &mut Taker<'_>, name: &str, minutes: &mut [Minute]) -> Option<()> {
    let mut kinds = Vec::new();
    while kinds.len() < minutes.len() {
        let run = taker.below(minutes.len() - kinds.len() + 1)?;
        let [exponent, quality] = taker.array()?;
        if run == 0 {
            return None;
        }
        kinds.resize(kinds.len() + run, (exponent.cast_signed(), quality));
    }
    let mut last = 0_i64;
    for (minute, (exponent, quality)) in minutes.iter_mut().zip(kinds) {
        let steps = match taker.u64()?.checked_sub(1) {
            None => None,
            Some(z) => {
                last = last.checked_add(unfold(z))?;
                Some(i32::try_from(last).ok()?)
            }
        };
        if quality != ABSENT {
            let signal = name.to_owned();
            minute.readings.push(MinuteReading { signal, steps, exponent, quality });
        }
    }
    Some(())
}
