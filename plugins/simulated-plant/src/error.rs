//! What can go wrong around the plant.

use std::fmt;
use std::io;
use std::path::{Path, PathBuf};

/// Names its subject; the lower error is the source.
#[derive(Debug)]
pub enum SimulationError {
    /// The site file was refused; the report says why and where.
    Site(Box<site::Report>),
    /// The site is sound, but this simulation cannot stand in for it.
    NotSimulated(String),
    Plant(plant::PlantError),
    /// The water of a span could not be worked out.
    Water(String),
    File {
        what: &'static str,
        path: PathBuf,
        source: io::Error,
    },
    /// Another plant works in the same folder.
    AlreadyRunning(PathBuf),
    /// The daemon's settings are not what the adapter needs.
    Setting {
        name: String,
        rule: &'static str,
    },
    /// The adapter's loop ended badly.
    Sdk(sdk::SdkError),
    /// The adapter and the plant do not understand each other.
    Link(String),
}

impl SimulationError {
    pub(crate) fn file(what: &'static str, path: &Path, source: io::Error) -> Self {
        Self::File { what, path: path.to_owned(), source }
    }
}

impl fmt::Display for SimulationError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Site(report) => write!(f, "the plant cannot read its site:\n{report}"),
            Self::NotSimulated(why) => write!(f, "this site cannot be simulated: {why}"),
            Self::Plant(_) => f.write_str("the simulated plant refused"),
            Self::Water(why) => write!(f, "the water outside could not be worked out: {why}"),
            Self::File { what, path, .. } => write!(f, "{what} {}", path.display()),
            Self::AlreadyRunning(p) => write!(f, "a plant already works in {}", p.display()),
            Self::Setting { name, rule } => write!(f, "setting {name} must be {rule}"),
            Self::Sdk(_) => f.write_str("the adapter of the simulated plant ended"),
            Self::Link(why) => write!(f, "the link to the plant: {why}"),
        }
    }
}

impl std::error::Error for SimulationError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            Self::Plant(e) => Some(e),
            Self::Sdk(e) => Some(e),
            Self::File { source, .. } => Some(source),
            _ => None,
        }
    }
}

impl From<plant::PlantError> for SimulationError {
    fn from(e: plant::PlantError) -> Self {
        Self::Plant(e)
    }
}
