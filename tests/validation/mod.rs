//! Against published figures, or figures computed from published equations.

mod site_delaware;
mod structures;
mod structures_pumps;
mod structures_table;
mod tide;
mod tide_delaware;
mod tide_hat_lat;
mod tide_port_ansel;
