//! What the daemon says on standard output: plain words for a person who has just started it, and
//! each committed row.

use engine::State;
use model::Site;
use record::Row;
use units::Utc;

/// Once there is a plan: when the next windows are, and what to type next.
pub fn welcome(site: &Site, state: &State, now: Utc, site_arg: &str) {
    say!("\n{} is watched. Mode observe: nothing moves until a person says so.", site.title);
    if site.all_simulated() {
        say!("The plant is SIMULATED; so is the clock if it runs fast.");
    }
    for (no, outlet) in site.outlets.iter().enumerate() {
        say!("\nNext lawful windows of {}:", outlet.name);
        let windows = state.lawful(no).map_or(&[][..], |l| &l.windows[..]);
        for w in windows.iter().filter(|w| w.window.end() > now).take(3) {
            let cap = w.volume_max.map_or(String::new(), |c| format!(", at most {:.0}", c.max));
            say!("  {} (range {:.1}{cap})", w.window, w.range_rounded);
        }
        if let Some(plan) = state.plan(no) {
            say!("The plan would release:");
            for r in plan.releases.iter().take(3) {
                say!("  {} {:.0}", r.window, r.volume);
            }
            for s in &plan.shortfalls {
                say!("  A SPILL of {:.0} cannot be avoided lawfully: {}", s.volume, s.spill);
            }
        }
    }
    say!("\nIn another terminal, type next:");
    say!("  tidereeve now {site_arg}");
    say!("  tidereeve order {site_arg} --by YOUR-NAME --reason WHY mode automatic");
    let first = site.assets.first().map_or("ASSET", |a| a.name.as_str());
    say!("  tidereeve why {site_arg} {first}");
    say!(
        "This is not a safety system: the plant's own hard-wired protection and the licence stay \
         in charge.\n"
    );
}

/// One committed row, its number first. Without `all`, only what a person would want to see go by.
pub fn row(row: &Row, all: bool) {
    use record::kind;
    let quiet = [kind::RELEASED, kind::PLAN_ADOPTED, kind::OUTCOME, kind::CONFIRMED, kind::INTENT];
    if all || !quiet.contains(&row.kind) {
        say!("row {} {} {}", row.seq, row.utc, record::describe(row));
    }
}
