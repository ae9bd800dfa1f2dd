//! The view kept beside the journal: rows go to it after their commit, and nothing waits for it.

use std::path::Path;
use std::sync::mpsc::Sender;

use anyhow::{Context, Result};
use journal::{Reply, ViewPace, ViewSays, ViewThread};
use serde_json::{Value, json};

use super::input::Input;
use super::shell::Shell;

pub fn start(state_dir: &Path, rows: u64, to: Sender<Input>) -> Result<ViewThread> {
    ViewThread::start(state_dir, rows, ViewPace::USUAL, to).context("a thread for the view")
}

/// What its thread says: it asks for rows that it missed, or tells how it is. Whatever is wrong with
/// it stays with it.
pub fn says(shell: &Shell, what: ViewSays) {
    match what {
        ViewSays::Read { from_seq, limit, to } => {
            // Without a journal it gets no rows, and tries again later.
            let _ = shell.parts.journal.read(from_seq, limit, to);
        }
        ViewSays::Rebuilding { done, of } => {
            tracing::info!("view.sqlite is made anew: {done} of {of} rows");
        }
        ViewSays::Caught { seq } => tracing::debug!("view.sqlite is as far as row {seq}"),
        ViewSays::Alarm(why) => tracing::error!("ALARM the view: {why}"),
    }
}

/// The rows of an answer, for the view.
pub fn rows_of(reply: &Reply) -> Vec<record::Row> {
    match reply {
        Reply::Acked(acked) => acked.rows.clone(),
        Reply::Done(done) => done.rows.clone(),
        Reply::Lost { .. } | Reply::Back { .. } => Vec::new(),
    }
}

pub fn state(shell: &Shell) -> Value {
    let state = shell.parts.view.state();
    json!({
        "evidence_seq": state.evidence_seq, "view_seq": state.view_seq, "trouble": state.trouble,
    })
}
