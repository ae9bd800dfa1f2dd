//! `check`: reads everything, says what is wrong and where.

use anyhow::Result;

use super::load;
use crate::cli::{Exit, SiteArgs};

pub fn check(args: &SiteArgs) -> Result<Exit> {
    let Some(site) = load(&args.site, args.json) else { return Ok(Exit::BadInput) };
    if args.json {
        println!("{}", serde_json::json!({ "site": site.name, "faults": [] }));
    } else {
        println!("{} ({}): no faults", site.title, site.name);
        println!("  {} assets, {} signals, {} adapters", site.assets.len(), site.signals.len(), {
            site.adapters.len()
        });
        println!("  licence {}: {} clauses", site.licence.reference, site.licence.clauses.len());
        println!("  constants of {} hold {}", site.port.name, site.port.valid);
    }
    Ok(Exit::Done)
}

/// All faults of the files, as text or as a JSON list.
pub fn print_report(report: &site::Report, json: bool) {
    if json {
        println!("{}", report_json(report));
    } else {
        eprintln!("{report}");
    }
}

fn report_json(report: &site::Report) -> serde_json::Value {
    let faults: Vec<_> = report
        .faults()
        .iter()
        .map(|f| {
            serde_json::json!({
                "code": f.code, "file": f.file, "line": f.line, "column": f.column,
                "value": f.value, "rule": f.rule, "remedy": f.remedy,
            })
        })
        .collect();
    serde_json::json!({ "faults": faults })
}
