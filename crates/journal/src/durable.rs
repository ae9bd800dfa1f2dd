//! A name that stays: renamed, and the folder synced, which SQLite and the standard library leave
//! to their caller.

use std::fs::{self, File};
use std::io;
use std::path::Path;

pub(crate) fn rename(from: &Path, to: &Path) -> io::Result<()> {
    fs::rename(from, to)?;
    File::open(to.parent().unwrap_or(Path::new(".")))?.sync_all()
}
