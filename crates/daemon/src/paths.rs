//! Where a site's files lie: one site folder, one state folder.

use std::path::{Path, PathBuf};

/// The state folder: `--state`, else `state` in the site folder.
pub fn state_dir(site: &Path, state: Option<&Path>) -> PathBuf {
    let folder = if site.is_dir() { site } else { site.parent().unwrap_or(Path::new(".")) };
    state.map_or_else(|| folder.join("state"), Path::to_path_buf)
}

pub fn socket(state: &Path) -> PathBuf {
    state.join("control.sock")
}

pub fn clock(state: &Path) -> PathBuf {
    state.join("simulated-clock.json")
}

pub fn plant(state: &Path) -> PathBuf {
    state.join("plant")
}
