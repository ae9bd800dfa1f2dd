//! `journal`: the record, verified and read.

use anyhow::Result;
use clap::{Args, Subcommand};
use serde_json::Value;
use units::Utc;

use super::keep;
use crate::cli::{Exit, SiteArgs};
use crate::control::{Request, Response, ask};
use crate::paths;
use crate::show::row_json;

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
    /// Rows, one a line
    Query {
        #[command(flatten)]
        site: SiteArgs,
        /// Only rows from this number on
        #[arg(long, default_value_t = 1)]
        from: u64,
        /// At most so many rows
        #[arg(long, default_value_t = 200)]
        limit: u64,
        /// Only this kind, e.g. decision, intent, rest
        #[arg(long)]
        kind: Option<String>,
        /// Only rows about this, e.g. an asset
        #[arg(long)]
        subject: Option<String>,
        /// Only rows at or after this instant
        #[arg(long)]
        since: Option<String>,
    },
}

pub fn journal(args: &JournalArgs) -> Result<Exit> {
    match &args.act {
        JournalAct::Verify(args) => keep::verify(args),
        JournalAct::Keep(act) => keep::keep(act),
        JournalAct::Query { site, from, limit, kind, subject, since } => {
            let since = since.as_deref().map(Utc::parse).transpose()?;
            let wanted = Wanted { kind: kind.as_deref(), subject: subject.as_deref(), since };
            query(site, *from, *limit, &wanted)
        }
    }
}

struct Wanted<'a> {
    kind: Option<&'a str>,
    subject: Option<&'a str>,
    since: Option<Utc>,
}

impl Wanted<'_> {
    fn fits(&self, row: &Value) -> bool {
        let text = |key: &str| row.get(key).and_then(Value::as_str).unwrap_or_default();
        let after = |t: Utc| Utc::parse(text("utc")).is_ok_and(|at| at >= t);
        self.kind.is_none_or(|k| text("kind") == k)
            && self.subject.is_none_or(|s| text("subject") == s)
            && self.since.is_none_or(after)
    }
}

/// Through the daemon while it runs, else from the file.
fn query(args: &SiteArgs, from: u64, limit: u64, wanted: &Wanted) -> Result<Exit> {
    let dir = args.state_dir();
    let mut shown = 0;
    let mut next = from;
    while shown < limit {
        let page = match ask(&paths::socket(&dir), &Request::Rows { from: next, limit: 2_000 })? {
            Some(Response::Ok(Value::Array(rows))) => rows,
            Some(Response::Ok(_)) => Vec::new(),
            Some(Response::Refused(why)) => {
                eprintln!("refused: {why}");
                return Ok(Exit::Refused);
            }
            None => file_page(&dir, next)?,
        };
        let Some(last) = page.last().and_then(|r| r.get("seq")).and_then(Value::as_u64) else {
            break;
        };
        next = last + 1;
        for row in page.iter().filter(|r| wanted.fits(r)).take((limit - shown) as usize) {
            shown += 1;
            print_row(row, args.json);
        }
    }
    Ok(Exit::Done)
}

fn file_page(dir: &std::path::Path, from_seq: u64) -> Result<Vec<Value>> {
    let filter = journal::Filter { from_seq, limit: Some(2_000), ..journal::Filter::default() };
    Ok(journal::rows(dir, &filter)?.iter().map(row_json).collect())
}

fn print_row(row: &Value, json: bool) {
    if json {
        say!("{row}");
        return;
    }
    let text = |key: &str| row.get(key).and_then(Value::as_str).unwrap_or_default();
    let seq = row.get("seq").and_then(Value::as_u64).unwrap_or_default();
    say!("{seq:>7} {} {}", text("utc"), text("words"));
}
