//! One integration crate. `validation`: against published figures. `scenarios`: stories through the
//! engine. `faults`: what breaks. `compat`: old forms still read. `house`: the house rules.

mod validation;
mod scenarios;
mod faults;
mod compat;
mod house;
