//! The command line.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Args, Parser, Subcommand};

use crate::commands;

/// 0 done, 1 findings, 2 usage, 3 bad input, 4 environment, 5 refused for safety.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Exit {
    Done = 0,
    Findings = 1,
    BadInput = 3,
    Environment = 4,
    Refused = 5,
}

impl From<Exit> for ExitCode {
    fn from(e: Exit) -> Self {
        Self::from(e as u8)
    }
}

/// Runs gates, pumps and outfalls on a tidal river: inside the licence, behind interlocks, on the
/// record.
///
/// It moves nothing until a person sets the mode. It is not a safety system: the plant's own
/// hard-wired protection, the licence and licensed practice stay in charge.
#[derive(Parser, Debug)]
#[command(name = "tidereeve", version, max_term_width = 100)]
pub struct Cli {
    #[command(subcommand)]
    command: Command,
}

/// A site, and where its state is kept.
#[derive(Args, Clone, Debug)]
pub struct SiteArgs {
    /// The site folder (with site.toml and licence.toml)
    pub site: PathBuf,
    /// The state folder [default: `state` in the site folder]
    #[arg(long)]
    pub state: Option<PathBuf>,
    /// For programs: JSON on standard output
    #[arg(long)]
    pub json: bool,
}

impl SiteArgs {
    pub fn state_dir(&self) -> PathBuf {
        crate::paths::state_dir(&self.site, self.state.as_deref())
    }
}

/// The span that a reading command looks at.
#[derive(Args, Clone, Debug)]
pub struct SpanArgs {
    /// From this instant, e.g. 2027-03-01T00:00:00Z [default: now]
    #[arg(long)]
    pub at: Option<String>,
    /// For so many days
    #[arg(long, default_value_t = 3)]
    pub days: u32,
    /// Show times in the site's own zone instead of UTC
    #[arg(long)]
    pub local: bool,
}

#[derive(Subcommand, Debug)]
enum Command {
    /// The daemon: watches, plans, and (once told) drives the site
    Run(RunArgs),
    /// What is happening, what comes next, is anything wrong
    Now(SiteArgs),
    /// A person's act on the running daemon: each needs a name and a reason
    Order(commands::order::OrderArgs),
    /// Reads everything, says what is wrong and where
    Check(SiteArgs),
    /// High and low waters at the port or a place
    Tides(commands::tides::TidesArgs),
    /// When each asset may move, and which clause shuts each edge
    Windows(commands::windows::WindowsArgs),
    /// The plan, with a reason for every slot; moves nothing
    Plan(commands::plan::PlanArgs),
    /// Why an asset is as it is, and what would have to change
    Why(commands::why::WhyArgs),
    /// The record: verified, queried, exported, sealed, copied, saved
    Journal(commands::journal::JournalArgs),
    /// What an error code means and what to do
    Explain(commands::explain::ExplainArgs),
    /// The simulated plant (started by the simulated adapter)
    #[command(hide = true)]
    SimulatedPlant(commands::simulated::PlantArgs),
    /// The simulated plant's adapter (started by the daemon)
    #[command(hide = true)]
    SimulatedAdapter,
}

#[derive(Args, Clone, Debug)]
pub struct RunArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    /// Let simulated time run so many times as fast; only where every adapter is simulated
    #[arg(long, default_value_t = 1, value_parser = clap::value_parser!(u32).range(1..=3600))]
    pub speed: u32,
    /// Print every committed row, its number first, for a program that watches
    #[arg(long)]
    pub rows: bool,
}

pub fn main() -> ExitCode {
    let cli = Cli::parse();
    let done = match cli.command {
        Command::Run(a) => crate::run::run(&a),
        Command::Now(a) => commands::now::now(&a),
        Command::Order(a) => commands::order::order(&a),
        Command::Check(a) => commands::check::check(&a),
        Command::Tides(a) => commands::tides::tides(&a),
        Command::Windows(a) => commands::windows::windows(&a),
        Command::Plan(a) => commands::plan::plan(&a),
        Command::Why(a) => commands::why::why(&a),
        Command::Journal(a) => commands::journal::journal(&a),
        Command::Explain(a) => commands::explain::explain(&a),
        Command::SimulatedPlant(a) => commands::simulated::plant(&a),
        Command::SimulatedAdapter => commands::simulated::adapter(),
    };
    match done {
        Ok(exit) => exit.into(),
        Err(e) => {
            eprintln!("error: {e:#}");
            Exit::Environment.into()
        }
    }
}

#[cfg(test)]
mod tests {
    use clap::CommandFactory;

    #[test]
    fn the_command_line_is_well_formed() {
        super::Cli::command().debug_assert();
    }
}
