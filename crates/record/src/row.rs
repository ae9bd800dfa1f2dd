//! A row, a row that has no place yet, and the bytes that the hash is taken over.

use units::{Mono, Utc};

/// The version of the body's form that this program writes, for every kind.
pub const VERSION: u8 = 1;

/// What is to be written; the journal gives it its place.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Draft {
    /// One of [`crate::kind`].
    pub kind: u16,
    pub version: u8,
    /// What it is about: the asset's or adapter's name, or `site`.
    pub subject: String,
    /// Why, in plain words; may be empty.
    pub cause: String,
    /// The fields, in fixed order: see [`crate::encode`].
    pub body: Vec<u8>,
}

/// One row of the record.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Row {
    /// From 1, without a gap, for the life of the site.
    pub seq: u64,
    pub term: u64,
    pub utc: Utc,
    pub boot: Mono,
    pub kind: u16,
    pub version: u8,
    pub subject: String,
    pub cause: String,
    pub body: Vec<u8>,
    /// BLAKE3 of the previous row's hash and this row's [`canonical_bytes`].
    pub hash: [u8; 32],
}

/// Every field but the hash, in order: `seq`, `term` (u64), `utc` (i64 microseconds), `boot` (u64
/// nanoseconds), `kind` (u16), `version` (u8), then `subject`, `cause` and `body`, each after its
/// length in bytes (u32). All little-endian. Two different rows never have the same bytes.
pub fn canonical_bytes(row: &Row) -> Vec<u8> {
    let texts = row.subject.len() + row.cause.len() + row.body.len();
    let mut out = Vec::with_capacity(47 + texts);
    out.extend(row.seq.to_le_bytes());
    out.extend(row.term.to_le_bytes());
    out.extend(row.utc.as_micros().to_le_bytes());
    out.extend(row.boot.as_nanos().to_le_bytes());
    out.extend(row.kind.to_le_bytes());
    out.push(row.version);
    for part in [row.subject.as_bytes(), row.cause.as_bytes(), &row.body] {
        let length = u32::try_from(part.len()).expect("no field is as long as 4 GiB");
        out.extend(length.to_le_bytes());
        out.extend(part);
    }
    out
}
