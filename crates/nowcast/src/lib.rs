//! **What will the water do at the port and at each place, and how sure is that?**
//!
//! Astronomical prediction at the reference port, brought to each place by the method that the site
//! chooses ([`PortToPlace`]), as one immutable [`model::Forecast`]. In this version the one method is
//! tabulated differences ([`Differences`]), and there is no surge: a residual of the gauge is not
//! carried forward yet, so levels are the predicted ones, and only the interlock and the licence's
//! meters see the weather. It decides nothing.

mod curve;
mod differences;
mod fit;
mod forecast;
mod port;

pub use differences::{Differences, PortToPlace};
pub use fit::{FitError, Station, differences_from_constants};
pub use forecast::{ForecastError, forecast};
pub use port::{PortTide, port_tide};
