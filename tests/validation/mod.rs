//! Against published figures, or figures computed from published equations.

mod structures;
mod structures_pumps;
mod structures_table;

mod tide;
