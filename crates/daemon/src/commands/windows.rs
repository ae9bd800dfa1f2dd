//! `windows`: when each asset may move, and which clause shuts each edge; and, apart from that,
//! when the water lets it.

use anyhow::Result;
use clap::Args;
use model::{Edge, Lawful, Site, Usable};

use super::{forecast, load, span};
use crate::cli::{Exit, SiteArgs, SpanArgs};
use crate::show::{table, when};

#[derive(Args, Debug)]
pub struct WindowsArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    #[command(flatten)]
    pub span: SpanArgs,
}

pub fn windows(args: &WindowsArgs) -> Result<Exit> {
    let Some(site) = load(&args.site.site, args.site.json) else { return Ok(Exit::BadInput) };
    let span = span(&args.span)?;
    let forecast = forecast(&site, &span)?;
    let mut json = Vec::new();
    for (no, outlet) in site.outlets.iter().enumerate() {
        let mut lawful = licence::lawful(&site, &forecast, outlet.gate);
        lawful.windows.retain(|w| w.window.intersect(&span).is_some());
        let mut usable = planner::usable(&site, no, &forecast);
        usable.windows.retain(|w| w.window.intersect(&span).is_some());
        if args.site.json {
            json.push(outlet_json(&site, &outlet.name, &lawful, &usable));
        } else {
            print(&site, &outlet.name, &lawful, &usable, args.span.local);
        }
    }
    if args.site.json {
        say!("{}", serde_json::json!({ "outlets": json }));
    }
    Ok(Exit::Done)
}

fn edge_words(site: &Site, edge: &Edge) -> String {
    edge.clause.map_or("end of the span".to_owned(), |c| {
        format!("clause {}", site.licence.clause(c).number)
    })
}

fn print(site: &Site, name: &str, lawful: &Lawful, usable: &Usable, local: bool) {
    let zone = local.then_some(&site.zone);
    say!("{name}: lawful windows, by the licence's own words ({})", site.licence.reference);
    let mut out =
        table(&["opens", "by", "shuts", "by", "tide", "range m", "m3/s", "m3 a tide", "by"]);
    for w in &lawful.windows {
        out.add_row(vec![
            when(w.window.start(), zone),
            edge_words(site, &w.opens),
            when(w.window.end(), zone),
            edge_words(site, &w.shuts),
            w.tide.to_string(),
            format!("{:.1}", w.range_rounded.get()),
            w.flow_max.map_or("-".to_owned(), |c| format!("{:.2}", c.max.get())),
            w.volume_max.map_or("-".to_owned(), |c| format!("{:.0}", c.max.get())),
            w.volume_max.map_or("-".to_owned(), |c| site.licence.clause(c.clause).number.clone()),
        ]);
    }
    say!("{out}");
    for n in &lawful.nil {
        let number = &site.licence.clause(n.clause).number;
        say!("tide {}: no release (clause {number}, range {:.1})", n.tide, n.range_rounded);
    }
    say!("\n{name}: usable windows, when the water lets a full storage out");
    let mut out = table(&["from", "to"]);
    for w in &usable.windows {
        out.add_row(vec![when(w.window.start(), zone), when(w.window.end(), zone)]);
    }
    say!("{out}");
}

fn outlet_json(site: &Site, name: &str, lawful: &Lawful, usable: &Usable) -> serde_json::Value {
    let number = |c: model::ClauseId| site.licence.clause(c).number.clone();
    let lawful_rows: Vec<_> = lawful
        .windows
        .iter()
        .map(|w| {
            serde_json::json!({
                "from": w.window.start().to_string(), "to": w.window.end().to_string(),
                "opens_by": w.opens.clause.map(number), "shuts_by": w.shuts.clause.map(number),
                "tide": w.tide, "range_m": w.range.get(),
                "range_rounded_m": w.range_rounded.get(),
                "flow_max_m3_s": w.flow_max.map(|c| c.max.get()),
                "volume_max_m3": w.volume_max.map(|c| c.max.get()),
            })
        })
        .collect();
    let nil: Vec<_> = lawful
        .nil
        .iter()
        .map(|n| serde_json::json!({ "tide": n.tide, "clause": number(n.clause) }))
        .collect();
    let usable_rows: Vec<_> = usable
        .windows
        .iter()
        .map(|w| {
            let (from, to) = (w.window.start().to_string(), w.window.end().to_string());
            serde_json::json!({ "from": from, "to": to })
        })
        .collect();
    serde_json::json!({
        "outlet": name, "lawful": lawful_rows, "nil_tides": nil, "usable": usable_rows,
    })
}
