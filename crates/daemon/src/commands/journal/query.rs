//! `journal query`: from view.sqlite alone.

use std::collections::BTreeMap;
use std::ops::ControlFlow;
use std::path::Path;
use std::time::Duration;

use anyhow::Result;
use clap::Args;
use journal::{AskedFor, Entry, ViewReader, Wanted};
use serde_json::json;
use units::Utc;

use super::shown::{Form, Lines};
use super::{refused, say_if_behind};
use crate::cli::{Exit, SiteArgs};

/// Entries that are shown if nobody says how many.
const LAST: u64 = 200;
/// What people's own SQL may cost.
const SQL_TIME: Duration = Duration::from_secs(5);
const SQL_ROWS: u64 = 10_000;

#[derive(Args, Debug)]
pub struct QueryArgs {
    #[command(flatten)]
    site: SiteArgs,
    /// From this instant on, e.g. 2027-05-01T06:00:00Z; a day alone is its beginning (UTC)
    #[arg(long)]
    from: Option<String>,
    /// Before this instant, likewise
    #[arg(long)]
    to: Option<String>,
    /// Only this kind, e.g. decision, intent, rest; may be given often, or with commas
    #[arg(long, value_delimiter = ',')]
    kind: Vec<String>,
    /// Only rows about this: an asset, an adapter, or site
    #[arg(long)]
    subject: Option<String>,
    /// The first so many [default: the last 200]
    #[arg(long, conflicts_with = "last")]
    limit: Option<u64>,
    /// The last so many
    #[arg(long)]
    last: Option<u64>,
    /// How many of each kind, instead of the entries
    #[arg(long, conflicts_with_all = ["limit", "last"])]
    count: bool,
    /// One SELECT on the view's tables (SELECT sql FROM sqlite_schema names them); 5 seconds and
    /// 10,000 rows at the most
    #[arg(long, conflicts_with_all = ["from", "to", "kind", "subject", "limit", "last", "count"])]
    sql: Option<String>,
    /// As CSV (RFC 4180)
    #[arg(long, conflicts_with = "json")]
    csv: bool,
}

pub fn query(args: &QueryArgs) -> Result<Exit> {
    let dir = args.site.state_dir();
    let form = match (args.site.json, args.csv) {
        (true, _) => Form::Json,
        (_, true) => Form::Csv,
        _ => Form::Table,
    };
    let reader = ViewReader::open(&dir)?;
    say_if_behind(&dir, reader.head());
    if let Some(sql) = &args.sql {
        return own_sql(&dir, sql, form);
    }
    let wanted = wanted(args, &reader)?;
    if args.count {
        return count(&reader.counts(&wanted)?, form);
    }
    let mut lines = Lines::new(form, false);
    let columns = ["seq", "utc", "term", "kind", "subject", "cause", "words"].map(str::to_owned);
    if form == Form::Csv {
        lines.head(&columns);
    }
    let mut shown = 0;
    reader.each_entry(&wanted, &mut |entry| {
        shown += 1;
        match form {
            Form::Table => plain(entry),
            _ => lines.row(&columns, &cells(entry)),
        }
        ControlFlow::Continue(())
    })?;
    lines.end();
    let all: u64 = reader.counts(&wanted)?.values().sum();
    if all > shown && args.limit.is_none() && args.last.is_none() {
        eprintln!("{shown} of {all} entries; --last or --limit for more");
    }
    Ok(Exit::Done)
}

fn wanted(args: &QueryArgs, reader: &ViewReader) -> Result<Wanted> {
    for kind in &args.kind {
        if record::kind::named(kind).is_none() {
            let names: Vec<&str> = record::kind::all().filter_map(record::kind::name).collect();
            return Err(refused("kind", kind, format!("give one of {}", names.join(", "))));
        }
    }
    if let Some(subject) = &args.subject {
        let subjects = reader.subjects()?;
        if !subjects.contains(subject) {
            let there = subjects.join(", ");
            return Err(refused("subject", subject, format!("no row is about it; about: {there}")));
        }
    }
    let (from, to) = (instant("from", args.from.as_deref())?, instant("to", args.to.as_deref())?);
    if let (Some(from), Some(to)) = (from, to)
        && to <= from
    {
        let value = args.to.as_deref().unwrap_or_default();
        return Err(refused("to", value, format!("it is not after --from {from}")));
    }
    let last = args.last.or_else(|| args.limit.is_none().then_some(LAST));
    let (kinds, subject) = (args.kind.clone(), args.subject.clone());
    let whole = args.site.json || args.csv;
    Ok(Wanted { from, to, from_seq: 0, kinds, subject, limit: args.limit, last, whole })
}

fn instant(field: &'static str, text: Option<&str>) -> Result<Option<Utc>> {
    let Some(text) = text else { return Ok(None) };
    let at = Utc::parse(text).or_else(|_| Utc::parse(&format!("{text}T00:00:00Z")));
    let at = at.map_err(|_| {
        let remedy = "no UTC instant; write 2027-05-01T06:00:00Z, or a day, 2027-05-01";
        refused(field, text, remedy.to_owned())
    });
    at.map(Some)
}

fn plain(entry: &Entry<'_>) {
    say!("{:>7} {} {}", entry.seq, entry.utc, entry.words);
}

fn cells(entry: &Entry<'_>) -> Vec<serde_json::Value> {
    let (term, cause) = entry.rest.map_or((None, None), |r| (Some(r.term), Some(r.cause)));
    vec![
        json!(entry.seq),
        json!(entry.utc.to_string()),
        json!(term),
        json!(entry.kind),
        json!(entry.subject),
        json!(cause),
        json!(entry.words),
    ]
}

fn count(counts: &BTreeMap<String, u64>, form: Form) -> Result<Exit> {
    let mut lines = Lines::new(form, true);
    let columns = ["kind", "n"].map(str::to_owned);
    lines.head(&columns);
    for (kind, n) in counts {
        lines.row(&columns, &[json!(kind), json!(n)]);
    }
    lines.end();
    Ok(Exit::Done)
}

fn own_sql(dir: &Path, sql: &str, form: Form) -> Result<Exit> {
    let mut lines = Lines::new(form, true);
    let mut first = true;
    let most = AskedFor { time: SQL_TIME, rows: SQL_ROWS };
    let asked = journal::ask(dir, sql, most, &mut |columns, cells| {
        if std::mem::take(&mut first) {
            lines.head(columns);
        }
        if let Some(cells) = cells {
            let cells: Vec<_> = cells.iter().map(super::shown::value).collect();
            lines.row(columns, &cells);
        }
        ControlFlow::Continue(())
    })?;
    lines.end();
    if asked.more {
        eprintln!("only the first {} rows; add a LIMIT or a WHERE", asked.rows);
    }
    Ok(Exit::Done)
}
