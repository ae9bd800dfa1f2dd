//! Names that stay: made or renamed, and the folder synced, which SQLite and the standard library leave
//! to their caller.

use std::fs::{self, File};
use std::io;
use std::path::Path;

pub(crate) fn rename(from: &Path, to: &Path) -> io::Result<()> {
    fs::rename(from, to)?;
    File::open(to.parent().unwrap_or(Path::new(".")))?.sync_all()
}

/// The folder, made if it is not there. Synced each time: an earlier attempt may have made it and
/// failed to.
pub(crate) fn folder(dir: &Path) -> io::Result<()> {
    fs::create_dir_all(dir)?;
    File::open(dir.parent().unwrap_or(Path::new(".")))?.sync_all()
}
