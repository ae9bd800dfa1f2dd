//! An intent: the permit for a command, and the row that must be on disk before it leaves.

use core::fmt::Debug;

use engine::{Entry, Outcome};
use interlock::Permit;
use model::{AssetId, Site};

use crate::decode::read;
use crate::encode::{IntentBody, put_outcome};
use crate::names::{Gathered, Named};
use crate::writer::Writer;
use crate::{Draft, RecordError, Row, VERSION, kind};

/// Holds its permit back until the journal has the row. Not `Clone`, as the permit is not.
#[derive(PartialEq, Debug)]
pub struct Intent {
    permit: Permit,
    asset: String,
    draft: Draft,
    never_left: Draft,
}

impl Intent {
    /// `site` is the one that the permit was judged for; an asset beyond its list is a fault of
    /// ours and panics.
    pub fn new(permit: Permit, site: &Site) -> Self {
        let asset_id = AssetId(permit.asset());
        let asset = site.asset(asset_id).name.clone();
        let mut w = Writer::new(site);
        let body = IntentBody {
            asset: asset_id,
            action: permit.action(),
            command: permit.command(),
            lease_end: permit.lease_end(),
            state_seq: permit.state_seq(),
            readings: permit.readings(),
        };
        body.put(&mut w);
        let intent = draft(kind::INTENT, &asset, "", w.bytes);
        let why = "the journal was lost before the command could leave";
        let mut w = Writer::new(site);
        w.asset(asset_id);
        w.u64(permit.command());
        put_outcome(&mut w, &Outcome::Refused(why.to_owned()));
        let never_left = draft(kind::OUTCOME, &asset, why, w.bytes);
        Self { permit, asset, draft: intent, never_left }
    }

    /// The row's content: the same bytes as `encode` of the engine's `Entry::Intent`.
    pub fn draft(&self) -> &Draft {
        &self.draft
    }

    pub fn permit(&self) -> &Permit {
        &self.permit
    }

    pub fn into_permit(self) -> Permit {
        self.permit
    }

    /// The outcome to be written when the row reached the disk but the permit was dropped: the
    /// command never left, and nobody shall think it might have.
    pub fn never_left(&self) -> &Draft {
        &self.never_left
    }

    /// Whether the row says what the permit says, field by field. The error names the first field
    /// that differs, with both values.
    pub fn agrees(&self, row: &Row) -> Result<(), RecordError> {
        let mut names = Gathered::default();
        let entry = read(row.kind, row.version, &row.body, &mut names)?;
        let Entry::Intent { asset, action, command, lease_end, state_seq, readings } = entry else {
            return Err(RecordError::Unknown { kind: row.kind, version: row.version });
        };
        let p = &self.permit;
        same("subject", &self.asset.as_str(), &row.subject.as_str())?;
        same("asset", &self.asset.as_str(), &names.asset_name(asset))?;
        same("action", &p.action(), &action)?;
        same("command", &p.command(), &command)?;
        same("term", &p.term(), &row.term)?;
        same("state sequence", &p.state_seq(), &state_seq)?;
        same("readings", &p.readings(), &readings)?;
        same("lease end", &p.lease_end(), &lease_end)
    }
}

fn draft(kind: u16, subject: &str, cause: &str, body: Vec<u8>) -> Draft {
    Draft { kind, version: VERSION, subject: subject.to_owned(), cause: cause.to_owned(), body }
}

fn same<T: PartialEq + Debug>(field: &'static str, permit: &T, row: &T) -> Result<(), RecordError> {
    if permit == row {
        return Ok(());
    }
    Err(RecordError::Mismatch { field, permit: format!("{permit:?}"), row: format!("{row:?}") })
}
