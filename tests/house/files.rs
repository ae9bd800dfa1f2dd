//! What every file must have, and what no file may hold.

use super::{is_test, root, sources, without_tests};

const FILE_LINES_MOST: usize = 500;

#[test]
fn every_source_file_says_what_it_is() {
    let mute: Vec<String> = sources(&[".rs"])
        .into_iter()
        .filter(|(_, t)| !t.starts_with("//!"))
        .map(|(p, _)| p)
        .collect();
    assert_eq!(mute, Vec::<String>::new());
}

#[test]
fn files_are_no_longer_than_a_reader_bears() {
    let long: Vec<String> = sources(&[".rs"])
        .into_iter()
        .filter(|(p, t)| !is_test(p) && without_tests(t).lines().count() > FILE_LINES_MOST)
        .map(|(p, _)| p)
        .collect();
    assert_eq!(long, Vec::<String>::new());
    let lines = |name: &str| std::fs::read_to_string(root().join(name)).unwrap().lines().count();
    assert!(lines("README.md") <= 120);
    assert!(lines("DEVELOPERS.md") <= 400);
}

/// Words that no committed file may hold, put together here so that this file does not.
fn banned() -> Vec<String> {
    let parts: [&[&str]; 8] = [
        &["#[", "ignore"],
        &["todo", "!("],
        &["unimplemented", "!("],
        &["/wo", "rk/"],
        &["/ro", "ot/"],
        &["../", "shared"],
        &["crates", ".io/api"],
        &["pypi", ".org"],
    ];
    parts.iter().map(|p| p.concat()).collect()
}

fn holds_banned(text: &str) -> Option<String> {
    banned().into_iter().find(|b| text.contains(b.as_str()))
}

#[test]
fn nothing_unfinished_no_machine_and_no_registry_is_named() {
    let all = sources(&[".rs", ".toml", ".md", ".service", ".txt"]);
    let found: Vec<String> =
        all.iter().filter_map(|(p, t)| holds_banned(t).map(|b| format!("{p}: {b}"))).collect();
    assert_eq!(found, Vec::<String>::new());
    let bad = format!("#[{}] fn x() {{}}", "ignore");
    assert!(holds_banned(&bad).is_some(), "the scanner finds nothing");
}

/// Published checks: the four lines that say where the figure comes from.
fn unsourced(text: &str) -> Vec<String> {
    let lines: Vec<&str> = text.lines().collect();
    let is_val = |l: &&str| l.trim_start().starts_with("fn val_");
    let mut found = Vec::new();
    for (i, line) in lines.iter().enumerate().filter(|(_, l)| is_val(l)) {
        let start = (0..i).rev().take_while(|n| !lines[*n].trim().is_empty()).last().unwrap_or(i);
        let doc = lines[start..i].join("\n");
        let heads = ["Source", "Where", "Quantity", "Tolerance"];
        if heads.iter().any(|h| !doc.contains(h)) {
            found.push(line.trim().to_owned());
        }
    }
    found
}

#[test]
fn every_published_check_names_its_source() {
    let mut found = Vec::new();
    for (path, text) in sources(&[".rs"]) {
        found.extend(unsourced(&text).into_iter().map(|f| format!("{path}: {f}")));
    }
    assert_eq!(found, Vec::<String>::new());
    assert_eq!(unsourced("\n/// Source: a book.\n#[test]\nfn val_x() {"), ["fn val_x() {"]);
}

#[test]
fn every_folder_of_data_has_its_source() {
    for entry in std::fs::read_dir(root().join("tests/data")).unwrap().map(Result::unwrap) {
        assert!(entry.path().join("SOURCE.md").exists(), "{}", entry.path().display());
    }
}
