//! **What does astronomy do to the water at a port?**
//!
//! Astronomical arguments, node factors, harmonic prediction, and high and low waters. It knows no
//! weather, no channel and no licence, and takes levels in plain metres on the datum of the
//! constants that it is given.
//!
//! Numbers come from P. Schureman (1940), *Manual of Harmonic Analysis and Prediction of Tides*,
//! US Coast and Geodetic Survey Special Publication 98 (formulas from memory, confirmed against
//! published predictions, see `tests/validation`), and from the IHO list of constituents.
//!
//! ```
//! use tide::{Constants, Nodal, Predictor};
//! use units::{Span, Utc, Window};
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! let port = Constants::new(0.3, Nodal::MidYear, &[("M2", 3.05, 170.0), ("S2", 1.06, 215.0)])?;
//! let predictor = Predictor::new(&port);
//! let day = Utc::from_civil(2027, 3, 1, 0, 0, 0)?;
//! let turns = predictor.turns(&Window::new(day, day + Span::days(1))?);
//! assert!(turns.len() >= 3 && turns.windows(2).all(|w| w[0].high != w[1].high));
//! # Ok(())
//! # }
//! ```

mod arguments;
mod constants;
mod node;
mod number;
mod predict;
mod table;
mod turns;

pub use arguments::{Arguments, arguments};
pub use constants::{Constants, Nodal, TideError};
pub use node::{NodeFactor, node_factor};
pub use number::number;
pub use predict::Predictor;
pub use table::speed_deg_h;
pub use turns::PortTurn;
