//! A pack: some thousand rows that follow each other, in the bytes of a few hundred.
//!
//! Columns, then zstd (RFC 8878): numbers as steps from the row before, subjects and causes once
//! each, bodies as they are. A row's hash is not kept, since it can be computed again; four bytes of
//! it are, so that the first wrong row has a name, and the last row's whole hash stands outside.
//!
//! ```text
//! count, first seq, hash before (32) | subjects and causes, each once | per row: steps of term, utc
//! and boot; kind; version; subject no; cause no; body | per row: 4 bytes of its hash
//! ```

use std::collections::BTreeMap;

use record::Row;
use units::{Mono, Utc};

use crate::chain;
use crate::varint::{Taker, put, put_blob, put_step};

/// Of a good level, the last before much slower ones.
const LEVEL: i32 = 9;
/// What a pack may unfold to. A pack of [`crate::packs::ROWS`] ordinary rows has a megabyte or two.
const UNFOLDED_MOST: usize = 64 << 20;
const CHECK_BYTES: usize = 4;

/// Why a pack does not read: the first row that is wrong, and what is.
#[derive(PartialEq, Eq, Debug)]
pub(crate) struct Bad {
    pub(crate) seq: u64,
    pub(crate) why: String,
}

/// The rows must follow each other; `before` is the hash of the row before the first.
pub(crate) fn encode(before: &[u8; 32], rows: &[Row]) -> Vec<u8> {
    let mut texts: Vec<&str> = Vec::new();
    let mut places: BTreeMap<&str, u64> = BTreeMap::new();
    let mut columns = Vec::new();
    let (mut term, mut utc, mut boot) = (0, 0, 0);
    for row in rows {
        let now = (row.term, row.utc.as_micros().cast_unsigned(), row.boot.as_nanos());
        put_step(&mut columns, term, now.0);
        put_step(&mut columns, utc, now.1);
        put_step(&mut columns, boot, now.2);
        (term, utc, boot) = now;
        put(&mut columns, u64::from(row.kind));
        columns.push(row.version);
        for text in [&row.subject[..], &row.cause] {
            let no = *places.entry(text).or_insert_with(|| {
                texts.push(text);
                texts.len() as u64 - 1
            });
            put(&mut columns, no);
        }
        put_blob(&mut columns, &row.body);
    }
    let mut out = Vec::with_capacity(columns.len() + 1024);
    put(&mut out, rows.len() as u64);
    put(&mut out, rows.first().map_or(0, |r| r.seq));
    out.extend(before);
    put(&mut out, texts.len() as u64);
    texts.iter().for_each(|t| put_blob(&mut out, t.as_bytes()));
    out.extend(columns);
    rows.iter().for_each(|r| out.extend(&r.hash[..CHECK_BYTES]));
    zstd::bulk::compress(&out, LEVEL).expect("memory to memory, at a level that exists")
}

/// The rows again, each checked by its four bytes; with the whole chain from `before` to `after`
/// recomputed and compared. Any bytes may come.
pub(crate) fn decode(
    first_seq: u64,
    before: &[u8; 32],
    after: &[u8; 32],
    bytes: &[u8],
) -> Result<Vec<Row>, Bad> {
    let bad = |seq: u64, why: &str| Bad { seq, why: why.to_owned() };
    let plain = zstd::bulk::decompress(bytes, UNFOLDED_MOST)
        .map_err(|e| Bad { seq: first_seq, why: format!("its pack does not unfold: {e}") })?;
    let mut taker = Taker(&plain);
    let head = head(&mut taker).ok_or_else(|| bad(first_seq, "its pack has no head"))?;
    if head.first_seq != first_seq || head.before != *before {
        return Err(bad(first_seq, "its pack belongs elsewhere in the chain"));
    }
    let checks_at = head.rows.checked_mul(CHECK_BYTES).and_then(|n| taker.0.len().checked_sub(n));
    let checks_at = checks_at.ok_or_else(|| bad(first_seq, "its pack ends too soon"))?;
    let (columns, checks) = taker.0.split_at(checks_at);
    let mut columns = Taker(columns);
    let (mut rows, mut last) = (Vec::with_capacity(head.rows), Last::default());
    let mut hash = *before;
    for (no, check) in checks.chunks_exact(CHECK_BYTES).enumerate() {
        let seq = first_seq + no as u64;
        let row = row(&mut columns, &head.texts, &mut last, seq);
        let mut row = row.ok_or_else(|| bad(seq, "it cannot be read from its pack"))?;
        hash = chain::hash(&hash, &row);
        if hash[..CHECK_BYTES] != *check {
            return Err(bad(seq, "its hash is not that of the row before it and its own fields"));
        }
        row.hash = hash;
        rows.push(row);
    }
    let end = rows.last().map_or(first_seq, |r| r.seq);
    if hash != *after || !columns.0.is_empty() || rows.is_empty() {
        return Err(bad(end, "its pack does not end at the hash that the chain goes on from"));
    }
    Ok(rows)
}

struct Head<'a> {
    rows: usize,
    first_seq: u64,
    before: [u8; 32],
    texts: Vec<&'a str>,
}

fn head<'a>(taker: &mut Taker<'a>) -> Option<Head<'a>> {
    // Nothing that a number claims is reserved before it is seen to be there.
    let most = taker.0.len();
    let rows = taker.below(most)?;
    let (first_seq, before) = (taker.u64()?, taker.array()?);
    let count = taker.below(most)?;
    let mut texts = Vec::new();
    for _ in 0..count {
        texts.push(core::str::from_utf8(taker.blob()?).ok()?);
    }
    Some(Head { rows, first_seq, before, texts })
}

#[derive(Default)]
struct Last {
    term: u64,
    utc: u64,
    boot: u64,
}

fn row(taker: &mut Taker<'_>, texts: &[&str], last: &mut Last, seq: u64) -> Option<Row> {
    last.term = taker.step(last.term)?;
    last.utc = taker.step(last.utc)?;
    last.boot = taker.step(last.boot)?;
    let kind = u16::try_from(taker.u64()?).ok()?;
    let version = taker.array::<1>()?[0];
    let subject = texts[taker.below(texts.len())?].to_owned();
    let cause = texts[taker.below(texts.len())?].to_owned();
    let body = taker.blob()?.to_vec();
    let (utc, boot) = (Utc::from_micros(last.utc.cast_signed()), Mono::from_nanos(last.boot));
    Some(Row {
        seq,
        term: last.term,
        utc,
        boot,
        kind,
        version,
        subject,
        cause,
        body,
        hash: [0; 32],
    })
}

#[cfg(test)]
mod tests;
