//! What every file must have, and what no file may hold.

use super::{is_test, root, sources, texts, without_tests};

const FILE_LINES_MOST: usize = 500;

fn mute(text: &str) -> bool {
    !text.starts_with("//!")
}

fn long(text: &str) -> bool {
    without_tests(text).lines().count() > FILE_LINES_MOST
}

#[test]
fn every_source_file_says_what_it_is() {
    let found: Vec<String> =
        sources(&[".rs"]).into_iter().filter(|(_, t)| mute(t)).map(|(p, _)| p).collect();
    assert_eq!(found, Vec::<String>::new());
    assert!(mute("use core::fmt;\n//! Too late.\n"));
}

#[test]
fn files_are_no_longer_than_a_reader_bears() {
    let code = sources(&[".rs"]).into_iter().filter(|(p, _)| !is_test(p));
    let found: Vec<String> = code.filter(|(_, t)| long(t)).map(|(p, _)| p).collect();
    assert_eq!(found, Vec::<String>::new());
    assert!(long(&"x\n".repeat(501)) && !long(&"x\n".repeat(500)));
    for (name, most) in [("README.md", 120), ("DEVELOPERS.md", 400)] {
        let lines = std::fs::read_to_string(root().join(name)).unwrap().lines().count();
        assert!(lines <= most, "{name} has {lines} lines, {most} are the most");
    }
}

/// Words that no committed file may hold, put together here so that this file does not: tests that
/// do not run, unfinished code, places on one machine, registries.
const BANNED: &[&[&str]] = &[
    &["#[", "ignore"],
    &[", igno", "re)]"],
    &["```", "ignore"],
    &["todo", "!("],
    &["unimplemented", "!("],
    &["/wo", "rk/"],
    &["/ro", "ot/"],
    &["/ho", "me/"],
    &["../", "shared"],
    &["crates", ".io/api"],
    &["index.", "crates.io"],
    &["static.", "crates.io"],
    &["pypi", ".org"],
    &["files.", "pythonhosted.org"],
    &["registry.", "npmjs.org"],
    &["proxy.", "golang.org"],
];

/// Tests may name a folder that is thrown away; the program asks the system for one.
const BANNED_OUTSIDE_TESTS: &[&[&str]] = &[&["/t", "mp/"]];

fn holds_banned(path: &str, text: &str) -> Option<String> {
    let more = if is_test(path) { &[] } else { BANNED_OUTSIDE_TESTS };
    let words = BANNED.iter().chain(more).map(|parts| parts.concat());
    words.into_iter().find(|word| text.contains(word.as_str()))
}

#[test]
fn nothing_unfinished_no_machine_and_no_registry_is_named() {
    let all = texts();
    let found: Vec<String> = all
        .iter()
        .filter_map(|(p, t)| holds_banned(p, t).map(|word| format!("{p}: {word}")))
        .collect();
    assert_eq!(found, Vec::<String>::new());
    for path in ["tests/run", ".ci/run", ".config/nextest.toml", "tests/data/noaa-2026/SOURCE.md"] {
        assert!(all.iter().any(|(p, _)| p == path), "{path} was not looked at");
    }
}

#[test]
fn the_scanner_finds_each_banned_word() {
    for parts in BANNED {
        let text = format!("line\n    {} and more\n", parts.concat());
        assert_eq!(holds_banned("tests/a.rs", &text), Some(parts.concat()));
    }
    let thrown_away = BANNED_OUTSIDE_TESTS[0].concat();
    assert!(holds_banned("crates/a/src/b.rs", &thrown_away).is_some());
    assert!(holds_banned("tests/a.rs", &thrown_away).is_none());
}

/// Published checks: the four lines that say where the figure comes from.
fn unsourced(text: &str) -> Vec<String> {
    let lines: Vec<&str> = text.lines().collect();
    let is_val = |l: &&str| l.trim_start().starts_with("fn val_");
    let mut found = Vec::new();
    for (i, line) in lines.iter().enumerate().filter(|(_, l)| is_val(l)) {
        let start = (0..i).rev().take_while(|n| !lines[*n].trim().is_empty()).last().unwrap_or(i);
        let has = |head: &str| {
            let begins = |l: &&str| {
                l.trim_start().strip_prefix("/// ").is_some_and(|doc| doc.starts_with(head))
            };
            lines[start..i].iter().any(begins)
        };
        if !["Source", "Where", "Quantity", "Tolerance"].into_iter().all(has) {
            found.push(line.trim().to_owned());
        }
    }
    found
}

#[test]
fn every_published_check_names_its_source() {
    let mut found = Vec::new();
    let mut seen = 0;
    for (path, text) in sources(&[".rs"]) {
        seen += text.lines().filter(|l| l.trim_start().starts_with("fn val_")).count();
        found.extend(unsourced(&text).into_iter().map(|f| format!("{path}: {f}")));
    }
    assert_eq!(found, Vec::<String>::new());
    assert!(seen > 20, "{seen} published checks only");
}

#[test]
fn the_scanner_wants_all_four_lines() {
    let doc = ["Source: a book.", "Where: p. 3.", "Quantity and unit: m.", "Tolerance: 1 mm."];
    let check = |doc: &[&str]| {
        let lines: String = doc.iter().map(|l| format!("/// {l}\n")).collect();
        unsourced(&format!("\n{lines}#[test]\nfn val_x() {{\n"))
    };
    assert_eq!(check(&doc), Vec::<String>::new());
    for left_out in 0..4 {
        let mut three = doc.to_vec();
        three.remove(left_out);
        assert_eq!(check(&three), ["fn val_x() {"]);
    }
}

#[test]
fn every_folder_of_data_has_its_source() {
    let mut seen = 0;
    for entry in std::fs::read_dir(root().join("tests/data")).unwrap().map(Result::unwrap) {
        let source = std::fs::read_to_string(entry.path().join("SOURCE.md")).unwrap_or_default();
        assert!(source.starts_with("# "), "{}: no SOURCE.md", entry.path().display());
        seen += 1;
    }
    assert!(seen > 0, "no data at all");
}
