//! **What will the water do at the port and at each place, and how sure is that?**
//!
//! Astronomical prediction at the reference port, brought to each place by the method that the site
//! chooses ([`PortToPlace`]), as one immutable [`model::Forecast`]. In this version the one method is
//! tabulated differences ([`Differences`]), and there is no surge: a residual of the gauge is not
//! carried forward yet, so levels are the predicted ones, and only the interlock and the licence's
//! meters see the weather. It decides nothing.
//!
//! A table of differences comes from the site file, or from two sets of constants:
//!
//! ```
//! use nowcast::{Station, differences_from_constants};
//! use tide::{Constants, Nodal, Predictor};
//! use units::{Metres, MetresPerSecond, Span, Utc, Window};
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! let of = |m2: f64, s2: f64, g_deg: f64| {
//!     let list = [("M2", m2, g_deg), ("S2", s2, g_deg + 30.0)];
//!     Constants::new(0.0, Nodal::MidYear, &list).map(|c| Predictor::new(&c))
//! };
//! let (mouth, town) = (of(2.0, 0.6, 100.0)?, of(2.2, 0.66, 130.0)?);
//! let start = Utc::from_civil(2027, 1, 1, 0, 0, 0)?;
//! let table = differences_from_constants(
//!     Station { predictor: &mouth, m2_phase_lag_deg: 100.0 },
//!     Station { predictor: &town, m2_phase_lag_deg: 130.0 },
//!     &Window::new(start, start + Span::days(60))?,
//!     model::NeapSpring { neap: Metres::new(2.8)?, spring: Metres::new(5.2)? },
//!     Span::minutes(20),
//!     (MetresPerSecond::new(1.0)?, MetresPerSecond::new(1.1)?),
//! )?;
//! // 30 degrees of the moon's tide are an hour and two minutes.
//! assert!((table.high_lag.spring.as_minutes() - 62.0).abs() < 2.0);
//! # Ok(())
//! # }
//! ```

mod curve;
mod differences;
mod fit;
mod forecast;
mod port;

pub use differences::{Differences, PlaceError, PortToPlace};
pub use fit::{FitError, Station, differences_from_constants};
pub use forecast::{ForecastError, forecast};
pub use port::{PortTide, port_tide};
