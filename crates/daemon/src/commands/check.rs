//! `check`: reads everything, says what is wrong and where.

use anyhow::Result;

use super::load;
use crate::cli::{Exit, SiteArgs};

pub fn check(args: &SiteArgs) -> Result<Exit> {
    let Some(site) = load(&args.site, args.json) else { return Ok(Exit::BadInput) };
    let notes = site::check_notes(&site);
    if args.json {
        say!("{}", serde_json::json!({ "site": site.name, "faults": [], "notes": notes }));
    } else {
        say!("{} ({}): no faults", site.title, site.name);
        say!("  {} assets, {} signals, {} adapters", site.assets.len(), site.signals.len(), {
            site.adapters.len()
        });
        say!("  licence {}: {} clauses", site.licence.reference, site.licence.clauses.len());
        say!("  constants of {} hold {}", site.port.name, site.port.valid);
        for note in &notes {
            let bars = if note.bars_automatic { " (mend this before automatic)" } else { "" };
            say!("  note {} {}: {}{bars}", note.code, note.subject, note.text);
        }
    }
    Ok(Exit::Done)
}

/// All faults of the files, as text or as a JSON list.
pub fn print_report(report: &site::Report, json: bool) {
    if json {
        say!("{}", serde_json::json!({ "faults": report.faults }));
    } else {
        eprintln!("{report}");
    }
}
