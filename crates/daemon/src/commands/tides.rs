//! `tides`: high and low waters at the port or a place.

use anyhow::Result;
use clap::Args;
use model::{Turn, TurnKind};

use super::{forecast, load, span};
use crate::cli::{Exit, SiteArgs, SpanArgs};
use crate::show::{table, when};

#[derive(Args, Debug)]
pub struct TidesArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    #[command(flatten)]
    pub span: SpanArgs,
    /// A place of the site [default: the reference port]
    #[arg(long)]
    pub place: Option<String>,
    /// Comma-separated values (RFC 4180)
    #[arg(long)]
    pub csv: bool,
}

pub fn tides(args: &TidesArgs) -> Result<Exit> {
    let Some(site) = load(&args.site.site, args.site.json) else { return Ok(Exit::BadInput) };
    let span = span(&args.span)?;
    let place = match &args.place {
        None => None,
        Some(name) => match site.place_named(name) {
            Some(place) => Some(place),
            None => {
                let names: Vec<&str> = site.places.iter().map(|p| p.name.as_str()).collect();
                eprintln!("{name:?} is no place of this site; it has: {}", names.join(", "));
                return Ok(Exit::BadInput);
            }
        },
    };
    let forecast = forecast(&site, &span)?;
    let turns = place.map_or(&forecast.port_turns, |p| &forecast.place(p.id).turns);
    let turns: Vec<&Turn> = turns.iter().filter(|t| span.contains(t.at)).collect();
    let name = place.map_or(&site.port.name, |p| &p.name);
    let local = args.span.local.then_some(&site.zone);
    if args.site.json {
        let rows: Vec<_> = turns.iter().map(|t| turn_json(t)).collect();
        say!("{}", serde_json::json!({ "place": name, "datum": site.datum, "turns": rows }));
    } else if args.csv {
        say!(part "utc,kind,level_m,time_sd_min,level_sd_m,tide\r\n");
        for t in turns {
            let (time, level) = (t.time_sd.as_minutes(), t.level_sd.get());
            let kind = kind(t.kind);
            say!(part "{},{kind},{:.3},{time:.1},{level:.2},{}\r\n", t.at, t.level.get(), t.number);
        }
    } else {
        say!("{name}, levels above {}; predicted, no surge", site.datum);
        let mut out = table(&["time", "", "level m", "+-min", "+-m", "tide"]);
        for t in turns {
            out.add_row(vec![
                when(t.at, local),
                kind(t.kind).to_owned(),
                format!("{:.2}", t.level.get()),
                format!("{:.0}", t.time_sd.as_minutes()),
                format!("{:.2}", t.level_sd.get()),
                t.number.to_string(),
            ]);
        }
        say!("{out}");
    }
    Ok(Exit::Done)
}

const fn kind(kind: TurnKind) -> &'static str {
    match kind {
        TurnKind::High => "high",
        TurnKind::Low => "low",
    }
}

fn turn_json(t: &Turn) -> serde_json::Value {
    serde_json::json!({
        "utc": t.at.to_string(), "kind": kind(t.kind), "level_m": t.level.get(),
        "time_sd_s": t.time_sd.as_seconds(), "level_sd_m": t.level_sd.get(), "tide": t.number,
    })
}
