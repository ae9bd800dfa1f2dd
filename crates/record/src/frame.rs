//! Readings as bytes. There are many: fourteen a second is the usual load, for years. So a reading
//! gives its signal's place in the site file, not its name, and says only what differs from the one
//! before it; a frame carries a digest of all the signals' names, so that it is never read with
//! another site file.

use model::{Reading, SignalId, Site};
use units::{Digest, Utc};

use crate::RecordError;
use crate::reader::{Reader, unknown};
use crate::writer::Writer;

/// The head of a reading: one byte, its upper two bits nought.
const NEXT_SIGNAL: u8 = 1;
const SOURCE_GOOD: u8 = 2;
const SAME_TIME: u8 = 4;
const VALUE: u8 = 8;
/// Forms of a value: a whole number of units of this many decimals, or its 64 bits as they are.
const DECIMALS_MOST: u8 = 6;
const AS_IT_IS: u8 = 7;
const UNITS: [f64; 7] = [1.0, 10.0, 100.0, 1e3, 1e4, 1e5, 1e6];
/// Beyond this (2^48) the whole number takes no fewer bytes than the bits.
const WHOLE_MOST: f64 = 281_474_976_710_656.0;

pub(crate) fn put(w: &mut Writer<'_>, readings: &[Reading], now: Utc, site: &Site) {
    w.u32(check(site));
    w.small(readings.len() as u64);
    let (mut next, mut before) = (0, now);
    for reading in readings {
        let Reading { signal: SignalId(signal), value, source_good, at } = *reading;
        let flag = |on: bool, bit: u8| if on { bit } else { 0 };
        let whole = whole(value);
        let form = whole.map_or(AS_IT_IS, |(decimals, _)| decimals);
        let (follows, same) = (u32::from(signal) == next, at == before);
        w.u8(flag(follows, NEXT_SIGNAL)
            | flag(source_good, SOURCE_GOOD)
            | flag(same, SAME_TIME)
            | (form * VALUE));
        if !follows {
            w.small(u64::from(signal));
        }
        if !same {
            w.step(before.as_micros(), at.as_micros());
        }
        match whole {
            Some((_, n)) => w.step(0, n),
            None => w.f64(value),
        }
        (next, before) = (u32::from(signal) + 1, at);
    }
}

pub(crate) fn take(r: &mut Reader<'_>, now: Utc, site: &Site) -> Result<Vec<Reading>, RecordError> {
    if r.u32("signals")? != check(site) {
        let why = "the readings are of a site file with other signals".to_owned();
        return Err(RecordError::Bad { field: "signals", why });
    }
    // A head and a byte of value at the least.
    let n = r.small_count("readings", 2)?;
    let mut readings = Vec::new();
    let (mut next, mut before) = (0, now);
    for _ in 0..n {
        let head = r.u8("reading")?;
        if head >= 64 {
            return Err(unknown("reading", head));
        }
        let signal = if head & NEXT_SIGNAL == 0 { r.small("signal")? } else { next };
        let id = u16::try_from(signal).ok().filter(|n| usize::from(*n) < site.signals.len());
        let id = id.ok_or_else(|| RecordError::Bad {
            field: "signal",
            why: format!("the site file has no signal {signal}"),
        })?;
        let at = match head & SAME_TIME {
            0 => Utc::from_micros(r.step("time of a reading", before.as_micros())?),
            _ => before,
        };
        let value = match head / VALUE {
            AS_IT_IS => r.f64("value")?,
            decimals => r.step("value", 0)? as f64 / UNITS[usize::from(decimals)],
        };
        let source_good = head & SOURCE_GOOD != 0;
        readings.push(Reading { signal: SignalId(id), value, source_good, at });
        (next, before) = (signal + 1, at);
    }
    Ok(readings)
}

/// The fewest decimals, and the whole number of their units, that give back this value to the bit.
/// Most instruments report a few decimals; the division is exactly rounded, so it finds the double
/// that is nearest to the decimal, which is the one that was parsed from it.
fn whole(value: f64) -> Option<(u8, i64)> {
    let gives = |decimals: u8| {
        let unit = UNITS[usize::from(decimals)];
        let n = (value * unit).round();
        // Written so that a NaN fails too.
        let small = n.abs() <= WHOLE_MOST;
        let exact = (n as i64 as f64 / unit).to_bits() == value.to_bits();
        (small && exact).then_some((decimals, n as i64))
    };
    (0..=DECIMALS_MOST).find_map(gives)
}

/// Tells site files with other signals, or others in another order, apart.
fn check(site: &Site) -> u32 {
    let mut digest = Digest::new();
    for signal in &site.signals {
        digest.u64(signal.name.len() as u64).bytes(signal.name.as_bytes());
    }
    digest.get() as u32
}
