//! `run`: the daemon. Events in, effects out; it decides nothing.

mod acts;
mod asked;
mod duties;
mod input;
mod keeping;
mod minutes;
mod open;
mod plant_events;
mod shell;
mod so_far;
mod speak;
mod view;
mod workers;

use anyhow::Result;

use crate::cli::{Exit, RunArgs};

pub use duties::day;
pub use keeping::secret_key;
pub use workers::work;

/// Runs until told to stop. Every start is observe.
pub fn run(args: &RunArgs) -> Result<Exit> {
    let Some(site) = crate::commands::load(&args.site.site, args.site.json) else {
        return Ok(Exit::BadInput);
    };
    if args.speed > 1 && !site.all_simulated() {
        eprintln!(
            "--speed {} refused: {} has adapters that are not simulated, and real equipment \
             runs in real time",
            args.speed, site.name
        );
        return Ok(Exit::Refused);
    }
    open::open(args, site)?.run()
}
