//! Against published figures, or figures computed from published equations.

mod site_delaware;
mod structures;
mod structures_pumps;
mod structures_table;

mod tide;
