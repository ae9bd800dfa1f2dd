//! `journal export`: the record taken away in open forms.

use std::path::PathBuf;

use anyhow::Result;
use clap::{Args, ValueEnum};
use journal::{Export, ExportForm};
use serde_json::json;

use super::say_if_behind;
use crate::cli::{Exit, SiteArgs};

#[derive(Args, Debug)]
pub struct ExportArgs {
    #[command(flatten)]
    site: SiteArgs,
    /// The file that is made
    #[arg(long)]
    to: PathBuf,
    #[arg(long)]
    form: Form,
    /// Which table of the view: entries, decisions, releases, acts, ...; an SQLite copy has them all
    #[arg(long, default_value = journal::EXPORTED[0])]
    table: String,
    /// The file may be there already, and goes then
    #[arg(long)]
    replace: bool,
}

#[derive(ValueEnum, Clone, Copy, Debug)]
enum Form {
    /// The whole view, of one moment, for SQL
    Sqlite,
    /// RFC 4180, UTF-8; a text that a spreadsheet would run has an apostrophe in front
    Csv,
    /// Typed columns (Apache Parquet), for data tools
    Parquet,
}

pub fn export(args: &ExportArgs) -> Result<Exit> {
    let dir = args.site.state_dir();
    let form = match args.form {
        Form::Sqlite => ExportForm::Sqlite,
        Form::Csv => ExportForm::Csv,
        Form::Parquet => ExportForm::Parquet,
    };
    let wanted = Export { form, table: &args.table, to: &args.to, replace: args.replace };
    let what = if form == ExportForm::Sqlite { "pages" } else { "rows" };
    let bar = crate::commands::progress(what);
    let done = journal::export(&dir, &wanted, &mut |done, of| {
        bar.set_length(of);
        bar.set_position(done);
    });
    bar.finish_and_clear();
    let done = done?;
    say_if_behind(&dir, &done.head);
    if args.site.json {
        let (rows, bytes, head) = (done.rows, done.bytes, done.head);
        say!(
            "{}",
            json!({ "rows": rows, "bytes": bytes, "head_seq": head.seq, "head": head.hash })
        );
    } else {
        say!(
            "{} rows, {} bytes in {}; the record as of row {}:{}",
            done.rows,
            done.bytes,
            args.to.display(),
            done.head.seq,
            done.head.hash
        );
    }
    Ok(Exit::Done)
}
