//! SI quantities as newtypes: finite by construction, one unit each.

use core::fmt;
use core::ops::{Add, Mul, Neg, Sub};

use crate::time::Span;

/// A number that cannot be this quantity.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct NotAQuantity {
    pub quantity: &'static str,
    pub value: f64,
    pub rule: &'static str,
}

impl fmt::Display for NotAQuantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} is no {}: it must be {}", self.value, self.quantity, self.rule)
    }
}
impl std::error::Error for NotAQuantity {}

macro_rules! quantity {
    ($(#[$doc:meta])* $name:ident, $unit:literal) => {
        $(#[$doc])*
        #[derive(Clone, Copy, PartialEq, PartialOrd, Debug, Default)]
        pub struct $name {
            value: f64,
        }
        impl $name {
            pub const ZERO: Self = Self { value: 0.0 };
            pub const UNIT: &'static str = $unit;

            /// Refuses NaN and the infinities.
            pub fn new(value: f64) -> Result<Self, NotAQuantity> {
                if value.is_finite() {
                    Ok(Self { value })
                } else {
                    Err(NotAQuantity { quantity: stringify!($name), value, rule: "a finite number" })
                }
            }
            /// For values our own arithmetic made from finite ones. Panics on NaN or infinity,
            /// which would be a fault of ours.
            #[track_caller]
            pub const fn of(value: f64) -> Self {
                assert!(value.is_finite(), "our own arithmetic made a value that is not finite");
                Self { value }
            }
            pub const fn get(self) -> f64 {
                self.value
            }
            pub fn min(self, o: Self) -> Self {
                if o.value < self.value { o } else { self }
            }
            pub fn max(self, o: Self) -> Self {
                if o.value > self.value { o } else { self }
            }
            pub fn total_cmp(&self, o: &Self) -> core::cmp::Ordering {
                self.value.total_cmp(&o.value)
            }
        }
        impl fmt::Display for $name {
            /// Two decimals unless the caller asks for others, then the unit.
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                write!(f, "{:.*} {}", f.precision().unwrap_or(2), self.value, $unit)
            }
        }
    };
}

macro_rules! linear {
    ($name:ident) => {
        impl Add for $name {
            type Output = Self;
            fn add(self, o: Self) -> Self {
                Self::of(self.value + o.value)
            }
        }
        impl Sub for $name {
            type Output = Self;
            fn sub(self, o: Self) -> Self {
                Self::of(self.value - o.value)
            }
        }
        impl Neg for $name {
            type Output = Self;
            fn neg(self) -> Self {
                Self::of(-self.value)
            }
        }
        impl Mul<f64> for $name {
            type Output = Self;
            fn mul(self, k: f64) -> Self {
                Self::of(self.value * k)
            }
        }
    };
}

quantity!(
    /// A length or a difference of levels, metres.
    Metres,
    "m"
);
quantity!(
    /// A water level: metres above the site datum, upward.
    Level,
    "m"
);
quantity!(
    /// Speed of water along the channel, metres per second, positive seaward.
    MetresPerSecond,
    "m/s"
);
quantity!(
    /// Flow, cubic metres per second.
    CubicMetresPerSecond,
    "m3/s"
);
quantity!(
    /// Volume, cubic metres.
    CubicMetres,
    "m3"
);
quantity!(
    /// Electrical power, kilowatts.
    Kilowatts,
    "kW"
);
quantity!(
    /// An opening or a speed setting, 0 (shut, stopped) to 100 (full).
    Percent,
    "%"
);
linear!(Metres);
linear!(MetresPerSecond);
linear!(CubicMetresPerSecond);
linear!(CubicMetres);
linear!(Kilowatts);

impl Percent {
    pub const FULL: Self = Self { value: 100.0 };
    /// The nearest setting within 0 to 100; NaN gives 0.
    pub fn clamped(value: f64) -> Self {
        Self { value: if value.is_nan() { 0.0 } else { value.clamp(0.0, 100.0) } }
    }
}
impl Sub for Level {
    type Output = Metres;
    fn sub(self, o: Self) -> Metres {
        Metres::of(self.value - o.value)
    }
}
impl Add<Metres> for Level {
    type Output = Self;
    fn add(self, d: Metres) -> Self {
        Self::of(self.value + d.value)
    }
}
impl Sub<Metres> for Level {
    type Output = Self;
    fn sub(self, d: Metres) -> Self {
        Self::of(self.value - d.value)
    }
}
impl Mul<Span> for CubicMetresPerSecond {
    type Output = CubicMetres;
    fn mul(self, s: Span) -> CubicMetres {
        CubicMetres::of(self.value * s.as_seconds())
    }
}
