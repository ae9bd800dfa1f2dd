//! What can be wrong with a row.

use core::fmt;

#[derive(Clone, PartialEq, Eq, Debug)]
pub enum RecordError {
    /// A kind or a form that this version does not know.
    Unknown { kind: u16, version: u8 },
    /// The body ends before its fields do.
    Short { field: &'static str },
    /// Bytes are left after the last field.
    Long { bytes: usize },
    /// A field that cannot have this value.
    Bad { field: &'static str, why: String },
    /// A name that the site file does not have (any more).
    NoSuchName { what: &'static str, name: String },
    /// A committed row is not what its permit says.
    Mismatch { field: &'static str, permit: String, row: String },
}

impl fmt::Display for RecordError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Unknown { kind, version } => {
                write!(f, "kind {kind} in form {version} is not known to this version")
            }
            Self::Short { field } => write!(f, "the body ends within `{field}`"),
            Self::Long { bytes } => write!(f, "{bytes} bytes are left after the last field"),
            Self::Bad { field, why } => write!(f, "`{field}` cannot be: {why}"),
            Self::NoSuchName { what, name } => write!(f, "the site file has no {what} `{name}`"),
            Self::Mismatch { field, permit, row } => {
                write!(f, "`{field}` is {permit} in the permit but {row} in the row")
            }
        }
    }
}
impl std::error::Error for RecordError {}
