//! The record's own tests.

mod any;
mod entries;
mod events;
mod fold;
mod intents;
mod products;
mod refused;
mod snapshot;
mod sums;

use engine::{Entry, Mode};
use model::{AssetId, Site};
use units::{Mono, Span, Utc};

use crate::{Draft, Row, encode, kind};

/// The demonstration site; the names in it that these tests speak of are held fast.
pub fn site() -> Site {
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/../../deploy/sites/tarrow-works");
    let mut site = site::load(folder.as_ref()).expect("the demonstration site loads");
    for (asset, name) in site.assets.iter_mut().zip(["gate", "pump-1", "pump-2"]) {
        name.clone_into(&mut asset.name);
    }
    site
}

pub const GATE: AssetId = AssetId(0);
pub const PUMP: AssetId = AssetId(1);

/// Midday, hours later.
pub fn at(hours: i64) -> Utc {
    Utc::from_civil(2027, 5, 1, 12, 0, 0).unwrap() + Span::hours(hours)
}

pub fn row_of(draft: Draft, seq: u64, term: u64, utc: Utc) -> Row {
    let Draft { kind, version, subject, cause, body } = draft;
    let boot = Mono::from_nanos(seq);
    Row { seq, term, utc, boot, kind, version, subject, cause, body, hash: [0; 32] }
}

/// Rows one after the other, an hour apart.
pub struct Rows {
    pub site: Site,
    pub rows: Vec<Row>,
    pub term: u64,
    pub utc: Utc,
}

impl Rows {
    pub fn new() -> Self {
        Self { site: site(), rows: Vec::new(), term: 1, utc: at(0) }
    }
    pub fn push(&mut self, entry: Entry) -> &mut Self {
        let draft = encode(&entry, &self.site);
        self.push_draft(draft)
    }
    pub fn push_draft(&mut self, draft: Draft) -> &mut Self {
        let seq = self.rows.len() as u64 + 1;
        self.rows.push(row_of(draft, seq, self.term, self.utc));
        self.utc = self.utc + Span::hours(1);
        self
    }
    pub fn started(&mut self, build: &str, mode: Mode) -> &mut Self {
        self.push(Entry::Started {
            build: build.to_owned(),
            site_digest: "5e".to_owned(),
            licence_digest: "1c".to_owned(),
            mode,
        })
    }
    /// A row that says nothing, that far after the last.
    pub fn later(&mut self, span: Span) -> &mut Self {
        self.utc = self.utc - Span::hours(1) + span;
        self.push(Entry::AdapterUp { adapter: "plant-bus".to_owned() })
    }
    pub fn folded(&self) -> engine::Carried {
        crate::fold(self.rows.iter().cloned(), &self.site)
    }
}

/// A row of a kind that no version has.
pub fn strange() -> Draft {
    Draft {
        kind: kind::JOURNAL_BACK + 900,
        version: 1,
        subject: crate::SITE.to_owned(),
        cause: String::new(),
        body: Vec::new(),
    }
}
