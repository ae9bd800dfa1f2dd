//! **What flow do these levels give through this structure?**
//!
//! One law a file: storage curve, pipe friction, penstock, outfall against the tide, orifices,
//! weirs, pumps, wet wells, and the stroke of a gate. Every function takes levels, flows and
//! openings as plain numbers with the unit in the name and gives the steady answer.
//!
//! It deliberately does not know the tide, the licence or the time: a level may come from a gauge,
//! a forecast or a test. It integrates nothing (see `plant`) and optimises nothing (see `planner`).
//! Sluice gates in a channel and tide flaps are not here yet.
//!
//! ```
//! use structures::{Friction, Outfall, Pipe};
//! # fn main() -> Result<(), structures::StructureError> {
//! let pipe = Pipe::new(1.20, 380.0, Friction::Darcy(0.018), 3.5)?;
//! let outfall = Outfall::new(pipe, -3.60, 0.02)?;
//! // Water outside at 0.60 m: 0.084 m of the head goes to the salt in it.
//! let flow_m3_s = outfall.flow_m3_s(1.21, 0.60, 1.0);
//! assert!((flow_m3_s - 1.20).abs() < 0.01);
//! # Ok(())
//! # }
//! ```

mod bisect;
mod daily_inflow;
mod error;
mod friction;
mod orifice;
mod outfall;
mod penstock;
mod pipe;
mod pump;
mod pump_system;
mod storage;
mod stroke;
mod villemonte;
mod weir;
mod wet_well;

pub use daily_inflow::daily_inflow_m3_s;
pub use error::StructureError;
pub use friction::{Friction, colebrook_white, swamee_jain};
pub use orifice::{free_orifice_m3_s, submerged_orifice_discharge, submerged_orifice_m3_s};
pub use outfall::Outfall;
pub use penstock::{opening_for_loss, penstock_loss};
pub use pipe::Pipe;
pub use pump::{Efficiency, PumpCurve, shaft_power_kw, specific_energy_kwh_m3};
pub use pump_system::{Duty, duty, static_head_m};
pub use storage::StorageCurve;
pub use stroke::Stroke;
pub use villemonte::drowned_share;
pub use weir::broad_crested_m3_s;
pub use wet_well::{Cycle, cycle, volume_least_m3};

/// Gravity, m/s2. The tables that these laws are checked against all use 9.81, and the site-to-site
/// spread of the true value (0.05 % at most over the latitudes of interest) is far below the
/// uncertainty of any loss coefficient.
pub const GRAVITY_M_S2: f64 = 9.81;
