//! **What if there were a plant?**
//!
//! The simulated plant and its adapter, carried by the main binary as two processes. The plant
//! ([`run_plant`]) is the equipment: it holds the leases, moves with simulated time and writes its
//! own record, and lives on when the daemon or the adapter dies. The adapter ([`run_adapter`])
//! speaks the adapter protocol to the daemon and a small line protocol of its own to the plant.
//!
//! It deliberately has no part in any decision, reads no licence and no plan, and never touches the
//! journal: its record is what the program is judged by.
//!
//! ```no_run
//! use std::path::PathBuf;
//! # fn main() -> Result<(), simulated_plant::SimulationError> {
//! let args = simulated_plant::PlantArgs {
//!     site: PathBuf::from("deploy/sites/tarrow-works"),
//!     folder: PathBuf::from("state/plant"),
//!     clock: simulated_plant::ClockMap::real(),
//! };
//! simulated_plant::run_plant(&args)
//! # }
//! ```

mod adapter;
mod ahead;
mod clock;
mod error;
mod keeper;
mod lines;
mod link;
mod process;
mod resume;
mod settings;
mod socket;
mod start;
mod station;
mod wire;
mod works;

pub use adapter::run_adapter;
pub use clock::ClockMap;
pub use error::SimulationError;
pub use process::{PlantArgs, SOCKET, run_plant};
pub use works::{plant_for, point_of};
