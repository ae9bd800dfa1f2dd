//! `journal` beyond reading: sealed, anchored, copied, held, saved.

use std::fs;
use std::io::{Read, Write};
use std::os::unix::fs::OpenOptionsExt;
use std::path::{Path, PathBuf};

use anyhow::{Context, Result, bail};
use clap::{Args, Subcommand};
use serde_json::{Value, json};
use units::Utc;

use super::from_daemon;
use crate::cli::{Exit, SiteArgs};
use crate::control::{KeepRequest, Request};
use crate::run::{day, secret_key};

#[derive(Subcommand, Debug)]
pub enum KeepAct {
    /// Seals the days that are over, now (the daemon does it by itself, as a duty)
    Seal(SiteArgs),
    /// Writes an anchor now, and prints it: keep it somewhere else
    Anchor(SiteArgs),
    /// Makes and verifies a backup now
    Backup(SiteArgs),
    /// Keeps what these days saw, whatever the site file says of its time
    Hold(HoldArgs),
    /// Lifts a hold on exactly these days
    Lift(HoldArgs),
    /// Puts a backup into an empty state folder, verified before and after
    Restore {
        /// The file that `backup` made
        backup: PathBuf,
        /// The state folder, without a record in it
        #[arg(long)]
        to: PathBuf,
    },
    /// Saves every row before the first damage into another state folder; the damaged one stays
    Salvage {
        #[command(flatten)]
        site: SiteArgs,
        /// Another state folder, without a record in it
        #[arg(long)]
        to: PathBuf,
    },
    /// Makes a secret key for signed anchors, and prints the public one; or prints that of a file
    /// that is there
    Key {
        /// Where the secret key goes: name it as anchor_key in [keeping]
        file: PathBuf,
    },
}

#[derive(Args, Debug)]
pub struct HoldArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    /// The first day, e.g. 2027-03-01 (UTC)
    #[arg(long)]
    pub from: String,
    /// The last day, kept too
    #[arg(long)]
    pub to: String,
    /// Who says so
    #[arg(long)]
    pub by: String,
    /// Why
    #[arg(long)]
    pub reason: String,
}

pub fn keep(act: &KeepAct) -> Result<Exit> {
    match act {
        KeepAct::Seal(site) => ask(site, KeepRequest::Seal),
        KeepAct::Anchor(site) => ask(site, KeepRequest::Anchor),
        KeepAct::Backup(site) => ask(site, KeepRequest::Backup),
        KeepAct::Hold(a) => {
            let (from_day, to_day) = days(a)?;
            let (by, reason) = (a.by.clone(), a.reason.clone());
            ask(&a.site, KeepRequest::Hold { from_day, to_day, by, reason })
        }
        KeepAct::Lift(a) => {
            let (from_day, to_day) = days(a)?;
            let (by, reason) = (a.by.clone(), a.reason.clone());
            ask(&a.site, KeepRequest::Lift { from_day, to_day, by, reason })
        }
        KeepAct::Restore { backup, to } => {
            let rows = journal::restore(backup, to)?;
            say!("{rows} rows restored to {}, and verified there", to.display());
            Ok(Exit::Done)
        }
        KeepAct::Salvage { site, to } => salvage(site, to),
        KeepAct::Key { file } => key(file),
    }
}

fn ask(site: &SiteArgs, what: KeepRequest) -> Result<Exit> {
    match from_daemon::<String>(site, &Request::Keep(what))? {
        Ok(words) if site.json => say!("{}", json!({ "done": words })),
        Ok(words) => say!("{words}"),
        Err(exit) => return Ok(exit),
    }
    Ok(Exit::Done)
}

fn days(a: &HoldArgs) -> Result<(i32, i32)> {
    let one = |flag: &str, text: &str| -> Result<i32> {
        let at = Utc::parse(&format!("{text}T00:00:00Z"));
        let at = at.with_context(|| format!("--{flag} {text:?} is no day; write 2027-03-01"))?;
        Ok(day(at))
    };
    let (from, to) = (one("from", &a.from)?, one("to", &a.to)?);
    if to < from {
        bail!("--to {} lies before --from {}; the last day is kept too", a.to, a.from);
    }
    Ok((from, to))
}

fn salvage(site: &SiteArgs, to: &Path) -> Result<Exit> {
    fs::create_dir_all(to).with_context(|| format!("making {}", to.display()))?;
    let bar = super::progress("rows");
    let done = journal::salvage(&site.state_dir(), to, &mut |rows| bar.set_position(rows))?;
    bar.finish_and_clear();
    let end = done.end.map(|e| format!("{:#}", anyhow::Error::from(e)));
    if site.json {
        say!("{}", json!({ "rows": done.rows, "end": end }));
    } else {
        say!("{} rows saved to {}", done.rows, to.display());
        say!(
            "{}",
            end.as_deref()
                .map_or("the whole record was good".to_owned(), |e| format!("it ended there: {e}"))
        );
    }
    Ok(if end.is_some() { Exit::Findings } else { Exit::Done })
}

/// 32 bytes of the system's randomness, in a file that only its owner reads.
fn key(file: &Path) -> Result<Exit> {
    if !file.exists() {
        let mut secret = [0; 32];
        fs::File::open("/dev/urandom")
            .and_then(|mut f| f.read_exact(&mut secret))
            .context("asking the system for randomness")?;
        let mut out = fs::OpenOptions::new();
        let out = out.write(true).create_new(true).mode(0o600).open(file);
        let text = format!("{}\n", blake3::Hash::from_bytes(secret).to_hex());
        out.and_then(|mut f| f.write_all(text.as_bytes()))
            .with_context(|| format!("writing {}", file.display()))?;
    }
    let public = journal::public_key(&secret_key(file)?);
    say!("{}", blake3::Hash::from_bytes(public).to_hex());
    Ok(Exit::Done)
}

/// What is known from elsewhere, for `verify`.
#[derive(Args, Debug)]
pub struct VerifyArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    /// An anchor that was kept elsewhere, 1234:HASH; may be given often
    #[arg(long)]
    pub anchor: Vec<String>,
    /// A file with such anchors, one a line (a log will do: other lines are passed over)
    #[arg(long)]
    pub anchors: Option<PathBuf>,
    /// The public key that every signed anchor must be by
    #[arg(long)]
    pub key: Option<String>,
}

pub fn verify(args: &VerifyArgs) -> Result<Exit> {
    let checks = checks(args)?;
    let bar = super::progress("rows");
    let mut progress = |done: u64, total: u64| {
        bar.set_length(total);
        bar.set_position(done);
    };
    let verified = journal::verify_with(&args.site.state_dir(), &checks, &mut progress);
    bar.finish_and_clear();
    let v = match verified {
        Ok(v) => v,
        Err(e) => {
            let words = format!("{:#}", anyhow::Error::from(e));
            if args.site.json {
                say!("{}", json!({ "error": words }));
            }
            eprintln!("error: {words}");
            return Ok(Exit::Findings);
        }
    };
    if args.site.json {
        let value: Value = json!({
            "rows": v.rows, "head": v.head_hex, "segments": v.segments,
            "segments_deleted": v.segments_deleted, "anchors": v.anchors,
            "anchors_signed": v.anchors_signed, "anchors_kept": checks.anchors.len(),
        });
        say!("{value}");
    } else {
        say!("{} rows, the chain holds; head {}:{}", v.rows, v.rows, v.head_hex);
        say!(
            "{} segments as they were sealed, {} deleted by rule; {} anchors, {} signed; {} kept \
             elsewhere hold",
            v.segments,
            v.segments_deleted,
            v.anchors,
            v.anchors_signed,
            checks.anchors.len()
        );
    }
    Ok(Exit::Done)
}

fn checks(args: &VerifyArgs) -> Result<journal::Checks> {
    let mut anchors = Vec::new();
    for text in &args.anchor {
        let anchor = journal::Anchor::parse(text);
        anchors.push(anchor.with_context(|| {
            format!(
                "--anchor {text:?} is no anchor: a row's number, a colon and 64 hexadecimal digits"
            )
        })?);
    }
    if let Some(file) = &args.anchors {
        let text =
            fs::read_to_string(file).with_context(|| format!("reading {}", file.display()))?;
        anchors.extend(text.split_whitespace().filter_map(journal::Anchor::parse));
        if anchors.is_empty() {
            bail!("{} has no anchor in it: 1234:HASH, anywhere in a line", file.display());
        }
    }
    let key = args.key.as_ref().map(|hex| match blake3::Hash::from_hex(hex) {
        Ok(key) => Ok(*key.as_bytes()),
        Err(_) => {
            bail!("--key {hex:?} is no public key: 64 hexadecimal digits, as `journal key` prints")
        }
    });
    Ok(journal::Checks { anchors, key: key.transpose()? })
}
