//! One plain line a row, for people who do not have the site file.

use engine::{Act, ActKind, ClockTrust, Entry, Outcome};
use interlock::Action;
use model::{AssetId, RestAction};

use crate::decode::read;
use crate::names::{Gathered, Named};
use crate::note::{self, NOTES};
use crate::{RecordError, Row, decode_note};

/// What the row says, in one line. A row that this version cannot read is named as such.
pub fn describe(row: &Row) -> String {
    if NOTES.contains(&row.kind) {
        return match decode_note(row) {
            Ok(note) => note::line(&note).replace(['\n', '\r'], " "),
            Err(e) => unreadable(row, &e),
        };
    }
    let mut names = Gathered::default();
    match read(row.kind, row.version, &row.body, &mut names) {
        Ok(entry) => line(&entry, row, &names).replace(['\n', '\r'], " "),
        Err(e) => unreadable(row, &e),
    }
}

fn unreadable(row: &Row, e: &RecordError) -> String {
    let kind = crate::kind::name(row.kind).unwrap_or("unknown kind");
    format!("{kind} about {} cannot be read: {e}", row.subject)
}

fn line(entry: &Entry, row: &Row, names: &Gathered) -> String {
    match entry {
        Entry::Started { build, site_digest, licence_digest, mode } => format!(
            "started build {build} in {}, site file {}, licence {}",
            mode.words(),
            short(site_digest),
            short(licence_digest)
        ),
        Entry::Act { act, refused } => {
            let end = refused.as_ref().map_or(String::new(), |why| format!("; refused: {why}"));
            format!("{} ordered {} ({}){end}", act.by, ordered(act, names), act.reason)
        }
        Entry::ModeChanged { mode, why } => format!("mode is {}: {why}", mode.words()),
        Entry::Armed { armed: true, .. } => "armed".to_owned(),
        Entry::Armed { armed: false, reasons } => format!("not armed: {}", reasons.join("; ")),
        Entry::Clock { trust, why } => {
            let trust = if *trust == ClockTrust::Trusted { "trusted" } else { "not trusted" };
            format!("clock {trust}: {why}")
        }
        Entry::AdapterUp { adapter } => format!("adapter {adapter} is up"),
        Entry::AdapterDown { adapter, why } => format!("adapter {adapter} is down: {why}"),
        Entry::Stopping { why } => format!("stopping: {why}"),
        Entry::PlanAdopted { plan, parent, released, spill, .. } => {
            let after = parent.map_or(String::new(), |p| format!(" after {}", p.0));
            format!("adopted plan {}{after}: release {released:.0}, spill {spill:.0}", plan.0)
        }
        Entry::Released { tide, volume, estimated, .. } => {
            let how = if *estimated { ", estimated" } else { "" };
            format!("released {volume:.0} (tide {tide}{how})")
        }
        Entry::WindowMissed { tide, window, cause } => {
            format!("window of tide {tide} passed unused, {window}: {cause}")
        }
        Entry::SpillForecast { window, volume, clauses } => {
            let list: Vec<&str> = clauses.iter().map(|c| names.clause_number(*c)).collect();
            format!("spill of {volume:.0} forecast in {window}; clauses {}", list.join(", "))
        }
        Entry::Decision { .. }
        | Entry::Intent { .. }
        | Entry::Outcome { .. }
        | Entry::Confirmed { .. }
        | Entry::Rest { .. }
        | Entry::Discrepancy { .. }
        | Entry::Latched { .. }
        | Entry::Reset { .. } => command(entry, row, names),
    }
}

fn command(entry: &Entry, row: &Row, names: &Gathered) -> String {
    let name = |asset: &AssetId| names.asset_name(*asset);
    let whose = |asset: &Option<AssetId>| match asset {
        Some(a) => format!("trip of {}", names.asset_name(*a)),
        None => "safe latch".to_owned(),
    };
    match entry {
        Entry::Decision { asset, action, .. } => {
            let because =
                if row.cause.is_empty() { String::new() } else { format!("; {}", row.cause) };
            format!("decided {}: {}{because}", name(asset), does(*action))
        }
        Entry::Intent { asset, action, command, .. } => {
            format!("intent {command} {} {}", name(asset), does(*action))
        }
        Entry::Outcome { asset, command, outcome } => {
            let end = match outcome {
                Outcome::Accepted => "accepted".to_owned(),
                Outcome::Refused(why) => format!("refused: {why}"),
                Outcome::Unknown(why) => format!("outcome unknown: {why}"),
            };
            format!("command {command} {} {end}", name(asset))
        }
        Entry::Confirmed { asset, command, position } => {
            format!("command {command} {} confirmed at {position:.1} %", name(asset))
        }
        Entry::Rest { asset, action, cause } => {
            let to = match action {
                RestAction::Close => "close",
                RestAction::Open => "open",
                RestAction::Stop => "stop",
                RestAction::Hold => "hold where it is",
                RestAction::HandToLocal => "hand to local",
            };
            format!("rest {}: {to}, for {cause}", name(asset))
        }
        Entry::Discrepancy { asset, command, wanted, found } => {
            let found = found.map_or("no position".to_owned(), |p| format!("{p:.1} %"));
            format!("command {command} {} wanted {wanted:.1} %, found {found}", name(asset))
        }
        Entry::Latched { asset, cause } => format!("{} set: {cause}", whose(asset)),
        Entry::Reset { asset } => format!("{} reset", whose(asset)),
        _ => unreachable!("`line` sends the eight kinds above here, and no other"),
    }
}

fn does(action: Action) -> String {
    match action {
        Action::Open(p) => format!("open to {p:.1}"),
        Action::Shut => "shut".to_owned(),
        Action::Run => "run".to_owned(),
        Action::Stop => "stop".to_owned(),
    }
}

pub(crate) fn ordered(act: &Act, names: &Gathered) -> String {
    let name = |asset: AssetId| names.asset_name(asset);
    match act.kind {
        ActKind::Mode(mode) => format!("mode {}", mode.words()),
        ActKind::Authorise { until } => format!("authorise until {until}"),
        ActKind::Confirm { asset } => format!("confirm {}", name(asset)),
        ActKind::Hold { asset, until } => format!("hold {} until {until}", name(asset)),
        ActKind::Hand { asset, setting, until } => {
            format!("hand {} {setting:.1} until {until}", name(asset))
        }
        ActKind::Auto { asset } => format!("auto {}", name(asset)),
        ActKind::OutOfService { asset, locked: true } => format!("lock out {}", name(asset)),
        ActKind::OutOfService { asset, locked: false } => format!("unlock {}", name(asset)),
        ActKind::Reset { asset: Some(asset) } => format!("reset {}", name(asset)),
        ActKind::Reset { asset: None } => "reset the safe latch".to_owned(),
        ActKind::Rest { asset: Some(asset) } => format!("rest {}", name(asset)),
        ActKind::Rest { asset: None } => "rest all".to_owned(),
        ActKind::TrustClock => "trust the clock".to_owned(),
    }
}

/// Enough of a digest to tell two apart by eye.
fn short(digest: &str) -> &str {
    digest.get(..12).unwrap_or(digest)
}
