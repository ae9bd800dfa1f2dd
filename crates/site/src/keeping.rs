//! `[keeping]`: how long, where to, and the duties that recur.

use model::{Duty, DutyKind, Keeping};
use units::{Span, ZoneRules};

use crate::codes;
use crate::fields::all;
use crate::raw::Table;
use crate::schedule::Schedule;

const KINDS: [(&str, DutyKind); 7] = [
    ("checkpoint", DutyKind::Checkpoint),
    ("seal", DutyKind::Seal),
    ("anchor", DutyKind::Anchor),
    ("backup", DutyKind::Backup),
    ("verify", DutyKind::Verify),
    ("summary", DutyKind::Summary),
    ("replan", DutyKind::Replan),
];

/// What a site does that says nothing: the record looks after itself.
fn usual() -> Vec<Duty> {
    let duty =
        |kind, when: &str, in_both_passes| Duty { kind, when: when.to_owned(), in_both_passes };
    vec![
        duty(DutyKind::Checkpoint, "0 50 * * * *", true),
        duty(DutyKind::Seal, "0 20 * * * *", true),
        duty(DutyKind::Anchor, "0 0 * * * *", true),
        duty(DutyKind::Backup, "0 40 3 * * *", false),
        duty(DutyKind::Verify, "0 10 4 * * *", false),
        duty(DutyKind::Summary, "0 30 5 * * *", false),
    ]
}

pub(crate) fn keeping(root: &Table<'_>, zone: Option<&ZoneRules>) -> Option<Keeping> {
    let usual = Keeping { duties: usual(), ..Keeping::default() };
    let Some(node) = root.get("keeping") else { return Some(usual) };
    let t = node.table("[keeping]")?;
    let segments_for = match t.get("segments_for") {
        Some(n) => n.duration(Span::days(7), Span::days(36_500)),
        None => Some(usual.segments_for),
    };
    let backups = if t.has("backups") { t.whole("backups", 1, 1000) } else { Some(14) };
    let text = |key: &'static str, example: &str| match t.has(key) {
        true => t.words(key, example).map(Some),
        false => Some(None),
    };
    let backup_to = text("backup_to", "/mnt/backups/tarrow-works");
    let anchor_key = text("anchor_key", "anchor.key");
    let duties = if t.has("duties") {
        let made = t.tables("duties", "duty").into_iter().map(|d| {
            let made = duty(&d, zone);
            d.finish();
            made
        });
        all(made.collect::<Vec<_>>())
    } else {
        Some(usual.duties)
    };
    t.finish();
    Some(Keeping {
        segments_for: segments_for?,
        backup_to: backup_to?,
        backups: u32::try_from(backups?).expect("at most a thousand"),
        anchor_key: anchor_key?,
        duties: duties?,
    })
}

fn duty(t: &Table<'_>, zone: Option<&ZoneRules>) -> Option<Duty> {
    let kind = t.word("duty", &KINDS);
    let when = t.need("when", "`when = \"0 30 2 * * *\"`")?;
    let text = when.text("\"0 30 2 * * *\"");
    let in_both_passes = match t.has("autumn") {
        true => t.word("autumn", &[("once", false), ("both", true)]),
        false => Some(false),
    };
    let (kind, text, in_both_passes) = (kind?, text?, in_both_passes?);
    let zone = zone.map_or("UTC", ZoneRules::name);
    if let Err(why) = Schedule::new(text, zone, in_both_passes) {
        return when.fault(
            codes::SCHEDULE,
            format!("this must be a cron expression of six fields: {why}"),
            "write second, minute, hour, day, month and weekday, like \"0 30 2 * * MON\" for half \
             past two each Monday",
        );
    }
    Some(Duty { kind, when: text.to_owned(), in_both_passes })
}
