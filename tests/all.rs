//! One integration crate. `validation`: against published figures. `scenarios`: stories through the
//! engine. `faults`: what breaks. `compat`: old forms still read. `house`: the house rules.

mod compat;
mod faults;
mod house;
mod scenarios;
mod validation;
