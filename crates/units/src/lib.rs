//! **What are the quantities, instants and windows that everything else is said in?**
//!
//! The vocabulary of the whole program: SI quantities as checked newtypes, two kinds of time that
//! cannot be mixed, half-open windows with their algebra, regular series, and civil time as data.
//! It deliberately knows nothing of tides, sites or licences, reads no clock and uses no outside
//! crate.
//!
//! Signs, once and for all: levels are metres above the site datum, upward; channel flow and speed
//! are positive seaward; asset flow is positive out of its storage.
//!
//! ```
//! use units::{Span, Utc, Window, Windows};
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! let hw = Utc::from_civil(2027, 3, 1, 6, 30, 0)?;
//! let lawful = Window::new(hw + Span::minutes(30), hw + Span::minutes(210))?;
//! let shut = Window::new(hw + Span::minutes(60), hw + Span::minutes(90))?;
//! let left = Windows::from(lawful).minus(&Windows::from(shut));
//! assert_eq!(left.total(), Span::minutes(150));
//! # Ok(())
//! # }
//! ```

mod civil;
mod digest;
mod quantity;
mod series;
mod time;
mod window;

pub use civil::{Civil, LocalTime, Weekday, ZoneRules};
pub use digest::Digest;
pub use quantity::{
    CubicMetres, CubicMetresPerSecond, Kilowatts, Level, Metres, MetresPerSecond, NotAQuantity,
    Percent,
};
pub use series::{BadSeries, Series};
pub use time::{BadInstant, Mono, Span, Utc};
pub use window::{EmptyWindow, Window, Windows};
