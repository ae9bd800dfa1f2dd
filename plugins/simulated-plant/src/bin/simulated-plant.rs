//! The plant and its adapter as a program of their own, for tests and for trying an adapter host
//! without the daemon. The daemon carries the same two functions in its own binary.

use std::path::PathBuf;
use std::process::ExitCode;

use simulated_plant::{ClockMap, PlantArgs, SimulationError, run_adapter, run_plant};

const USAGE: &str = "simulated-plant adapter\n\
    simulated-plant plant SITE FOLDER [REAL_BOOT_NS SIM_BOOT_NS SIM_UTC_US SPEED]";

fn main() -> ExitCode {
    let words: Vec<String> = std::env::args().skip(1).collect();
    let words: Vec<&str> = words.iter().map(String::as_str).collect();
    let done = match words[..] {
        ["adapter"] => run_adapter(),
        ["plant", site, folder] => plant(site, folder, ClockMap::real()),
        ["plant", site, folder, real_boot, sim_boot, sim_utc, speed] => {
            match clock(real_boot, sim_boot, sim_utc, speed) {
                Some(clock) => plant(site, folder, clock),
                None => return usage(),
            }
        }
        _ => return usage(),
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(e) => {
            let mut error: Option<&dyn std::error::Error> = Some(&e);
            while let Some(e) = error {
                eprintln!("{e}");
                error = e.source();
            }
            ExitCode::from(4)
        }
    }
}

fn plant(site: &str, folder: &str, clock: ClockMap) -> Result<(), SimulationError> {
    run_plant(&PlantArgs { site: PathBuf::from(site), folder: PathBuf::from(folder), clock })
}

fn clock(real_boot: &str, sim_boot: &str, sim_utc: &str, speed: &str) -> Option<ClockMap> {
    Some(ClockMap {
        real_boot_origin_ns: real_boot.parse().ok()?,
        sim_boot_origin_ns: sim_boot.parse().ok()?,
        sim_utc_origin_us: sim_utc.parse().ok()?,
        speed: speed.parse().ok()?,
    })
}

fn usage() -> ExitCode {
    eprintln!("{USAGE}");
    ExitCode::from(2)
}
