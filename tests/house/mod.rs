//! The house rules as ordinary tests. Each scanner is itself tested on a bad example.

mod clocks;
mod edges;
mod files;
mod functions;

use std::path::{Path, PathBuf};

/// The repository's folder.
pub fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).parent().expect("tests lie in the repository").into()
}

/// Every file below the source folders with one of these endings: (path from the root, text).
pub fn sources(endings: &[&str]) -> Vec<(String, String)> {
    let mut list = Vec::new();
    for top in ["crates", "plugins", "tests", "deploy"] {
        collect(&root().join(top), endings, &mut list);
    }
    for name in ["README.md", "DEVELOPERS.md", "Cargo.toml"] {
        if endings.iter().any(|e| name.ends_with(e)) {
            list.push((name.to_owned(), std::fs::read_to_string(root().join(name)).unwrap()));
        }
    }
    list.sort();
    assert!(list.len() > 10, "the scanner found next to nothing");
    list
}

fn collect(folder: &Path, endings: &[&str], list: &mut Vec<(String, String)>) {
    for entry in std::fs::read_dir(folder).unwrap().map(Result::unwrap) {
        let path = entry.path();
        let name = entry.file_name().to_string_lossy().into_owned();
        if path.is_dir() {
            if name != "target" && name != "state" && name != "data" {
                collect(&path, endings, list);
            }
        } else if endings.iter().any(|e| name.ends_with(e)) {
            let from_root = path.strip_prefix(root()).unwrap().display().to_string();
            list.push((from_root, std::fs::read_to_string(&path).unwrap()));
        }
    }
}

/// Whether a source file is for tests only.
pub fn is_test(path: &str) -> bool {
    path.starts_with("tests/")
        || path.contains("/tests/")
        || path.ends_with("/tests.rs")
        || path.ends_with("/fixture.rs")
        || path.contains("/examples/")
}

/// The text before its own test module.
pub fn without_tests(text: &str) -> &str {
    text.split("\n#[cfg(test)]").next().unwrap_or(text)
}
