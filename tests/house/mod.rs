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

/// Every source below the folders with one of these endings, data apart: (path from the root, text).
pub fn sources(endings: &[&str]) -> Vec<(String, String)> {
    let ends = |path: &str| endings.iter().any(|e| path.ends_with(e)) && !path.contains("/data/");
    let list: Vec<_> = texts().into_iter().filter(|(p, _)| ends(p)).collect();
    assert!(list.len() > 10, "the scanner found next to nothing");
    list
}

/// Every text file of the repository but the licence and the lock file, in order of its path.
pub fn texts() -> Vec<(String, String)> {
    let mut list = Vec::new();
    for top in ["crates", "plugins", "tests", "deploy", ".ci", ".config"] {
        collect(&root().join(top), &mut list);
    }
    for name in ["README.md", "DEVELOPERS.md", "Cargo.toml", ".clippy.toml", ".rustfmt.toml"] {
        list.push((name.to_owned(), std::fs::read_to_string(root().join(name)).unwrap()));
    }
    list.sort();
    list
}

fn collect(folder: &Path, list: &mut Vec<(String, String)>) {
    for entry in std::fs::read_dir(folder).unwrap().map(Result::unwrap) {
        let path = entry.path();
        let name = entry.file_name().to_string_lossy().into_owned();
        if path.is_dir() {
            // What a build or a run leaves behind is not ours to keep tidy.
            if !["target", "state", "__pycache__"].contains(&name.as_str()) {
                collect(&path, list);
            }
        } else if let Ok(text) = std::fs::read_to_string(&path) {
            let from_root = path.strip_prefix(root()).unwrap().display().to_string();
            list.push((from_root, text));
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
        || path.contains("/benches/")
}

/// The text without its `#[cfg(test)]` items, wherever they stand.
pub fn without_tests(text: &str) -> String {
    let mut kept = String::new();
    let mut lines = text.lines();
    while let Some(line) = lines.next() {
        if line != "#[cfg(test)]" {
            kept.push_str(line);
            kept.push('\n');
            continue;
        }
        // The item ends with a semicolon, or with a brace at the left edge.
        let ends =
            |l: &str| l == "}" || !l.starts_with(' ') && (l.ends_with(';') || l.ends_with("{}"));
        let _ = lines.by_ref().find(|l| ends(l));
    }
    kept
}

#[test]
fn only_test_items_are_left_out() {
    let text = "//! A.\n#[cfg(test)]\nmod fixture;\nfn a() {\n}\n#[cfg(test)]\nmod tests {\n    use b;\n}\nfn c() {}\n";
    assert_eq!(without_tests(text), "//! A.\nfn a() {\n}\nfn c() {}\n");
}
