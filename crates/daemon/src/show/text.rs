//! Views as text for a terminal: no colour carries meaning, words do.

use comfy_table::Table;
use units::{Utc, ZoneRules};

use super::views::{NowView, PlanView, WhyView};

/// An instant in UTC, or in the site's zone with its offset.
pub fn when(t: Utc, local: Option<&ZoneRules>) -> String {
    match local {
        Some(zone) => zone.show(t),
        None => t.to_string(),
    }
}

pub fn table(header: &[&str]) -> Table {
    let mut table = Table::new();
    table.set_header(header.to_vec());
    table
}

pub fn print_now(v: &NowView) {
    say!("{} ({})   {}   zone {}", v.title, v.site, v.utc, v.zone);
    let armed = if v.armed { "armed" } else { "not armed" };
    let clock = if v.clock_trusted { "clock trusted" } else { "CLOCK NOT TRUSTED" };
    let simulated = if v.simulated { "   SIMULATED PLANT" } else { "" };
    say!("mode {}, {armed}, {clock}, term {}{simulated}", v.mode, v.term);
    if let Some(a) = &v.authorisation {
        say!("standing authorisation {a}");
    }
    say!();
    for s in &v.storages {
        let level = s.level_m.map_or("no good level".to_owned(), |l| format!("{l:.2} m"));
        say!("{}: {level} (high alarm {:.2}, spills at {:.2})", s.name, s.high_alarm_m, s.spill_m);
    }
    for a in &v.assets {
        let position = a.position_percent.map_or("not read".to_owned(), |p| format!("{p:.0} %"));
        say!("{}: position {position}, commanded: {}", a.name, a.commanded);
        for why in &a.why {
            say!("    {why}");
        }
    }
    say!("\nnext:");
    for n in &v.next {
        let to = n.to.as_ref().map_or(String::new(), |t| format!(" to {t}"));
        say!("  {}{to}  {}", n.from, n.what);
    }
    say!("\nwrong:");
    if v.wrong.is_empty() {
        say!("  nothing");
    }
    for w in &v.wrong {
        say!("  {w}");
    }
    say!("\ntype next:");
    for t in &v.type_next {
        say!("  {t}");
    }
}

pub fn print_plan(v: &PlanView) {
    say!("plan {} as of {} (to {})", v.plan, v.as_of, v.to);
    say!(
        "releases {:.0} m3, {:.1} kWh, cost {:.2}; a plan moves nothing by itself\n",
        v.released_m3,
        v.energy_kwh,
        v.cost
    );
    let mut t = table(&["release", "from", "to", "m3"]);
    for r in &v.releases {
        let row = [r.tide.to_string(), r.from.clone(), r.to.clone(), format!("{:.0}", r.volume_m3)];
        t.add_row(row.to_vec());
    }
    say!("{t}");
    for s in &v.shortfalls {
        let clauses = s.clauses.join(", ");
        say!(
            "SPILL of {:.0} m3 from {} to {} cannot be avoided lawfully (clauses {clauses})",
            s.volume_m3,
            s.from,
            s.to
        );
    }
    for a in &v.assets {
        say!("\n{}", a.asset);
        let mut t = table(&["from", "to", "setpoint", "why"]);
        for s in &a.slots {
            let row = [s.from.clone(), s.to.clone(), s.setpoint.clone(), s.why.clone()];
            t.add_row(row.to_vec());
        }
        say!("{t}");
    }
}

pub fn print_why(v: &WhyView) {
    say!("{}  {}", v.at, v.in_words);
}
