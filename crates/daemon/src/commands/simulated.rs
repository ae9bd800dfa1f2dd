//! The two hidden commands that make this binary its own simulated plant: the plant and its adapter
//! are two processes, so that killing daemon, adapter or both leaves the plant's own record.

use std::path::PathBuf;

use anyhow::Result;
use clap::Args;

use crate::cli::Exit;

#[derive(Args, Debug)]
pub struct PlantArgs {
    /// The site folder
    #[arg(long)]
    pub site: PathBuf,
    /// The plant's own folder: its socket and its record
    #[arg(long)]
    pub dir: PathBuf,
    #[arg(long)]
    pub real_boot_origin_ns: u64,
    #[arg(long)]
    pub sim_boot_origin_ns: u64,
    #[arg(long, allow_hyphen_values = true)]
    pub sim_utc_origin_us: i64,
    #[arg(long)]
    pub speed: u32,
}

pub fn plant(args: &PlantArgs) -> Result<Exit> {
    simulated_plant::run_plant(&simulated_plant::PlantArgs {
        site: args.site.clone(),
        folder: args.dir.clone(),
        clock: simulated_plant::ClockMap {
            real_boot_origin_ns: args.real_boot_origin_ns,
            sim_boot_origin_ns: args.sim_boot_origin_ns,
            sim_utc_origin_us: args.sim_utc_origin_us,
            speed: args.speed,
        },
    })?;
    Ok(Exit::Done)
}

pub fn adapter() -> Result<Exit> {
    simulated_plant::run_adapter()?;
    Ok(Exit::Done)
}
