//! Functions that a reader can hold in mind.

use super::{is_test, sources, without_tests};

const LINES_MOST: usize = 70;
const LINES_MOST_STRICT: usize = 60;
const STRICT: &[&str] = &["crates/interlock/", "crates/journal/", "crates/protocol/"];

/// (name, lines) of every function, by the indentation that rustfmt gives its end.
fn functions(text: &str) -> Vec<(String, usize)> {
    let lines: Vec<&str> = text.lines().collect();
    let mut list = Vec::new();
    for (i, line) in lines.iter().enumerate() {
        let indent = line.len() - line.trim_start().len();
        let Some(name) = function_name(line.trim_start()) else { continue };
        let end = format!("{}}}", " ".repeat(indent));
        let length = lines[i..].iter().position(|l| *l == end || l.ends_with(" {}"));
        list.extend(length.map(|n| (name, n + 1)));
    }
    list
}

fn function_name(line: &str) -> Option<String> {
    let words: Vec<&str> = line.split_whitespace().collect();
    let at = words.iter().position(|w| *w == "fn")?;
    let leads = |w: &str| {
        w.starts_with("pub") || ["const", "async", "unsafe", "extern"].contains(&w) || w == "crate)"
    };
    if !words[..at].iter().all(|w| leads(w)) {
        return None;
    }
    words.get(at + 1).map(|n| n.split(['(', '<']).next().unwrap_or(n).to_owned())
}

#[test]
fn functions_are_short() {
    let mut long = Vec::new();
    for (path, text) in sources(&[".rs"]).iter().filter(|(p, _)| !is_test(p)) {
        let strict = STRICT.iter().any(|s| path.starts_with(s));
        let most = if strict { LINES_MOST_STRICT } else { LINES_MOST };
        for (name, lines) in functions(without_tests(text)) {
            if lines > most {
                long.push(format!("{path}: {name} has {lines} lines, {most} are the most"));
            }
        }
    }
    assert_eq!(long, Vec::<String>::new());
}

#[test]
fn the_scanner_counts_a_function_from_its_name_to_its_brace() {
    let text = "impl X {\n    pub(crate) fn long(\n        a: u8,\n    ) {\n        if a {\n        }\n    }\n}\n";
    assert_eq!(functions(text), [("long".to_owned(), 6)]);
}
