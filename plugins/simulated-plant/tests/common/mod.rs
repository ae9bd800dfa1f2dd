//! Shared by the process tests: a folder, a fast clock, and the plant's record.
#![allow(clippy::unwrap_used, reason = "a test stops where an assumption breaks")]

use std::fs;
use std::path::{Path, PathBuf};

use serde_json::Value;
use simulated_plant::ClockMap;
use units::Utc;

/// The demonstration site.
pub fn site() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../deploy/sites/tarrow-works")
}

/// A folder of this test's own, removed at the end.
pub struct Folder(pub PathBuf);

impl Folder {
    pub fn new(name: &str) -> Self {
        let path = std::env::temp_dir().join(format!("tidereeve-{name}-{}", std::process::id()));
        let _ = fs::remove_dir_all(&path);
        fs::create_dir_all(&path).unwrap();
        Self(path)
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = fs::remove_dir_all(&self.0);
    }
}

pub fn fast(speed: u32) -> ClockMap {
    let start = Utc::from_civil(2027, 3, 1, 8, 0, 0).unwrap();
    ClockMap { sim_utc_origin_us: start.as_micros(), speed, ..ClockMap::real() }
}

/// The events of one kind in the record.
pub fn events(folder: &Path, kind: &str) -> Vec<Value> {
    let text = fs::read_to_string(folder.join("plant.jsonl")).unwrap();
    let lines = text.lines().filter_map(|l| serde_json::from_str::<Value>(l).ok());
    lines.filter_map(|l| l.get("event").cloned()).filter(|e| e["kind"] == kind).collect()
}

pub fn boot_ns(event: &Value) -> u64 {
    event["boot_ns"].as_u64().unwrap()
}
