//! What is lawful to write and yet worth a look: notes refuse nothing.

use model::{AssetKind, Clause, ClauseKind, Site};
use serde::Serialize;

use crate::codes::{self, Code};
use crate::cross::lease_in_adapter;

/// One thing worth a look.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Note {
    pub code: &'static str,
    /// What it is about: an asset or clauses, by name and number.
    pub subject: String,
    pub text: String,
    /// Automatic should not be given while this stands.
    pub bars_automatic: bool,
}

/// Every note on a site that loaded, in the order of its assets and clauses.
pub fn check_notes(site: &Site) -> Vec<Note> {
    let mut notes = Vec::new();
    for asset in &site.assets {
        let governing: Vec<&Clause> = site
            .licence
            .clauses
            .iter()
            .filter(|c| c.governs.iter().any(|g| g.asset == asset.id))
            .collect();
        if governing.is_empty() {
            let gate = matches!(asset.kind, AssetKind::Gate(_));
            let text = "no clause of the licence governs this asset".to_owned();
            notes.push(note(codes::UNGOVERNED, format!("asset {}", asset.name), text, gate));
        }
        if lease_in_adapter(asset) {
            let text = "its lease is held by the adapter; automatic needs one held by the device";
            let subject = format!("asset {}", asset.name);
            notes.push(note(codes::LEASE_IN_ADAPTER, subject, text.to_owned(), true));
        }
        for (i, a) in governing.iter().enumerate() {
            for b in &governing[i + 1..] {
                if never_together(a, b) {
                    let subject = format!("clauses {} and {}", a.number, b.number);
                    let text = format!(
                        "no instant is inside both windows, so {} never may move",
                        asset.name
                    );
                    notes.push(note(codes::NEVER_TOGETHER, subject, text, true));
                }
            }
        }
    }
    for clause in &site.licence.clauses {
        if let ClauseKind::VolumePerTide { bands, .. } = &clause.kind
            && bands.iter().all(|b| b.volume_max.get() == 0.0)
        {
            let text = "every band is nil, so no tide may be used".to_owned();
            notes.push(note(codes::ALL_NIL, format!("clause {}", clause.number), text, true));
        }
    }
    if site.settings.heartbeat_file.is_none() {
        let text = "no heartbeat_file, so nothing outside notices when the daemon dies".to_owned();
        notes.push(note(codes::NO_HEARTBEAT, "settings".to_owned(), text, false));
    }
    notes
}

fn note(code: Code, subject: String, text: String, bars_automatic: bool) -> Note {
    Note { code: code.0, subject, text, bars_automatic }
}

/// Two windows from the same turn at the same place that share no instant. Windows from different
/// turns or places are not compared: whether they meet depends on the tide.
fn never_together(a: &Clause, b: &Clause) -> bool {
    let (
        ClauseKind::TideWindow { place, anchor, from, to },
        ClauseKind::TideWindow { place: p, anchor: n, from: f, to: t },
    ) = (&a.kind, &b.kind)
    else {
        return false;
    };
    place == p && anchor == n && (to <= f || t <= from)
}
