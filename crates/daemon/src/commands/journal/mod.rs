//! `journal`: the record, verified, read, taken away, looked after.

mod export;
mod query;
mod shown;

use std::path::Path;

use anyhow::Result;
use clap::{Args, Subcommand};
use journal::ViewError;
use serde::Deserialize;

use super::keep;
use crate::cli::{Exit, SiteArgs};
use crate::control::{Request, Response, ask};
use crate::paths;

#[derive(Args, Debug)]
pub struct JournalArgs {
    #[command(subcommand)]
    pub act: JournalAct,
}

#[derive(Subcommand, Debug)]
pub enum JournalAct {
    /// Reads the whole chain, the segments and the anchors, and names the first bad row
    Verify(keep::VerifyArgs),
    #[command(flatten)]
    Keep(keep::KeepAct),
    /// Entries, counts, or people's own SQL; also while the daemon runs
    Query(query::QueryArgs),
    /// The record in an open form: a copy for SQL, CSV, or columns for data tools
    Export(export::ExportArgs),
    /// Makes view.sqlite anew from the evidence, while no daemon runs
    Rebuild(SiteArgs),
}

pub fn journal(args: &JournalArgs) -> Result<Exit> {
    let done = match &args.act {
        JournalAct::Verify(args) => return keep::verify(args),
        JournalAct::Keep(act) => return keep::keep(act),
        JournalAct::Query(args) => query::query(args),
        JournalAct::Export(args) => export::export(args),
        JournalAct::Rebuild(site) => rebuild(site),
    };
    done.or_else(|e| match e.downcast_ref() {
        Some(ViewError::Refused { .. }) => {
            eprintln!("error: {e:#}");
            Ok(Exit::BadInput)
        }
        _ => Err(e),
    })
}

/// A field that cannot be as it was given.
fn refused(field: &'static str, value: &str, remedy: String) -> anyhow::Error {
    ViewError::Refused { field, value: value.to_owned(), remedy }.into()
}

fn rebuild(site: &SiteArgs) -> Result<Exit> {
    let dir = site.state_dir();
    if daemon(&dir)?.is_some() {
        eprintln!("refused: a daemon runs this site, and keeps the view itself; stop it first");
        return Ok(Exit::Refused);
    }
    let bar = super::progress("rows");
    let made = journal::rebuild_view(&dir, &mut |done, of| {
        bar.set_length(of);
        bar.set_position(done);
    });
    bar.finish_and_clear();
    let head = made?;
    if site.json {
        say!("{}", serde_json::json!({ "rows": head.seq, "head": head.hash }));
    } else {
        say!("{} rows are in the view; the last is {}:{}", head.seq, head.seq, head.hash);
    }
    Ok(Exit::Done)
}

/// What the daemon knows of the view.
#[derive(Deserialize)]
struct Kept {
    evidence_seq: u64,
    trouble: Option<String>,
}

/// Asks the running daemon; `None` if none runs.
fn daemon(dir: &Path) -> Result<Option<Kept>> {
    match ask(&paths::socket(dir), &Request::View)? {
        Some(Response::Ok(value)) => Ok(Some(serde_json::from_value(value)?)),
        Some(Response::Refused(why)) => anyhow::bail!("the daemon does not say: {why}"),
        None => Ok(None),
    }
}

/// Says on standard error if the evidence has rows that the view does not have yet.
fn say_if_behind(dir: &Path, head: &journal::ViewHead) {
    let behind = |rows: u64, why: &str| {
        let rows = if rows == 1 { "1 row".to_owned() } else { format!("{rows} rows") };
        eprintln!("the view is {rows} behind the evidence, at row {}: {why}", head.seq);
    };
    match daemon(dir) {
        Ok(Some(kept)) if kept.evidence_seq > head.seq => {
            let why = kept.trouble.as_deref().unwrap_or("they are on their way");
            behind(kept.evidence_seq - head.seq, why);
        }
        Ok(None) => match journal::evidence_ahead(dir, head) {
            Ok(0) => {}
            Ok(rows) => behind(rows, "start the daemon, or: tidereeve journal rebuild SITE"),
            Err(e) => eprintln!(
                "whether the view is as far as the evidence is not known: {:#}",
                anyhow::Error::from(e)
            ),
        },
        Ok(Some(_)) => {}
        Err(e) => eprintln!("whether the view is as far as the evidence is not known: {e:#}"),
    }
}
