//! **What would the equipment and the water really have done?**
//!
//! The simulated truth of a works that stores water and lets it out on the tide: a storage with an
//! inflow and a passive spill weir, a gate that moves at its stroke, assist pumps, a pipe to ports
//! under the tide, and the controller that holds the leases and rests by itself when one runs out.
//! It differs from the planner's model on purpose: coefficients, the lag of the water outside and
//! inflow that nobody forecast are drawn from a seed ([`Truth::drawn`]).
//!
//! It deliberately knows nothing of licences, plans, interlocks or adapters, reads no clock and
//! writes no file: time comes in with [`Plant::advance`], and its own [`Record`] stands apart from
//! anything the program under test writes down.
//!
//! What is simple here, and how large it is: flow is steady at each instant (the pipe holds 430 m3
//! and answers in seconds); the gate's share of stroke is its share of area; the water that leaves
//! during drain-down is taken from the storage as it leaves the ports, see [`PlantConfig`];
//! a pump delivers its rated flow up to the lift that its power gives.
//!
//! ```
//! use plant::{Plant, PlantConfig, Truth, example};
//! use units::Span;
//! # fn main() -> Result<(), plant::PlantError> {
//! let config: PlantConfig = example::small_works(Truth::drawn(7));
//! let (start, boot) = (config.start, config.boot);
//! let mut plant = Plant::new(config)?;
//! plant.drive(0, 50.0, boot + Span::seconds(120))?;
//! // Nobody renews: after two minutes the controller shuts the gate by itself.
//! plant.advance(start + Span::minutes(20), boot + Span::minutes(20))?;
//! assert_eq!(plant.gate_percent(), 0.0);
//! # Ok(())
//! # }
//! ```

mod config;
mod device;
mod error;
pub mod example;
mod flows;
mod passage;
mod plant;
mod record;
mod sense;
mod truth;
mod water;

pub use config::{
    Beginning, Fault, FaultKind, GateConfig, InflowProfile, OutfallFigures, PlantConfig,
    PumpConfig, RestDo, SpillWeir,
};
pub use error::PlantError;
pub use plant::Plant;
pub use record::{Event, EventKind, Record, Sample, Totals};
pub use sense::{PlantReadings, Point, Sensed};
pub use truth::{SplitMix64, Truth};
pub use water::Water;
