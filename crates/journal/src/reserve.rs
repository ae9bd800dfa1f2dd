//! The reserve: room on the disk that is given up when the disk is full, so that the record of
//! that can still be written.

use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Enough for some fifty commits, each of a few pages in the WAL.
const BYTES: usize = 1 << 20;

fn path(dir: &Path) -> PathBuf {
    dir.join("reserve")
}

/// Takes the room, with bytes that no file system stores as a hole.
pub(crate) fn fill(dir: &Path) -> io::Result<()> {
    let path = path(dir);
    if fs::metadata(&path).is_ok_and(|m| m.len() == BYTES as u64) {
        return Ok(());
    }
    let filled = File::create(&path).and_then(|mut file| {
        file.write_all(&[0xa5; BYTES])?;
        file.sync_all()
    });
    // Half a reserve would be taken for a whole one by nobody, but it fills the disk.
    filled.inspect_err(|_| spend(dir))
}

/// Gives the room back. That it is not there any more is no error.
pub(crate) fn spend(dir: &Path) {
    let _not_there = fs::remove_file(path(dir));
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_reserve_is_taken_once_and_given_back() {
        let dir = tempfile::tempdir().unwrap();
        fill(dir.path()).unwrap();
        let taken = fs::metadata(path(dir.path())).unwrap();
        assert_eq!(taken.len(), BYTES as u64);
        fill(dir.path()).unwrap();
        spend(dir.path());
        spend(dir.path());
        assert!(!path(dir.path()).exists());
    }
}
