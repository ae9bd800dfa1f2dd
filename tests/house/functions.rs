//! Functions that a reader can hold in mind.

use super::{is_test, sources, without_tests};

const LINES_MOST: usize = 70;
const LINES_MOST_STRICT: usize = 60;
const STRICT: &[&str] = &["crates/interlock/", "crates/journal/", "crates/protocol/"];

/// (name, lines) of every function with a body, by the indentation that rustfmt gives its end.
fn functions(text: &str) -> Vec<(String, usize)> {
    let lines: Vec<&str> = text.lines().collect();
    let named = lines.iter().enumerate().filter_map(|(i, l)| Some((i, function_name(l.trim())?)));
    named.filter_map(|(i, name)| Some((name, length(&lines[i..])?))).collect()
}

/// Lines up to the brace that ends the function which begins on the first; none without a body.
/// Only the signature may end the search early: an arm such as `_ => {}` inside must not.
fn length(lines: &[&str]) -> Option<usize> {
    let signature_ends = |l: &&str| ["{", "}", ";"].iter().any(|end| l.trim_end().ends_with(end));
    let last = lines.iter().position(signature_ends)?;
    if lines[last].trim_end().ends_with(';') {
        return None;
    }
    if lines[last].trim_end().ends_with('}') {
        return Some(last + 1);
    }
    let indent = lines[0].len() - lines[0].trim_start().len();
    let end = format!("{}}}", " ".repeat(indent));
    let body = lines[last..].iter().position(|l| *l == end);
    Some(last + 1 + body.expect("rustfmt ends a function at its own indentation"))
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

/// What is longer than a file at this path may have.
fn too_long(path: &str, text: &str) -> Vec<String> {
    let strict = STRICT.iter().any(|s| path.starts_with(s));
    let most = if strict { LINES_MOST_STRICT } else { LINES_MOST };
    let all = functions(&without_tests(text));
    let long = all.into_iter().filter(|(_, lines)| *lines > most);
    long.map(|(name, lines)| format!("{path}: {name} has {lines} lines, {most} are the most"))
        .collect()
}

#[test]
fn functions_are_short() {
    let code = sources(&[".rs"]).into_iter().filter(|(p, _)| !is_test(p));
    let mut seen = 0;
    let mut long = Vec::new();
    for (path, text) in code {
        seen += functions(&without_tests(&text)).len();
        long.extend(too_long(&path, &text));
    }
    assert_eq!(long, Vec::<String>::new());
    assert!(seen > 500, "the scanner sees {seen} functions only");
}

#[test]
fn the_scanner_counts_a_function_from_its_name_to_its_brace() {
    let text = "impl X {\n    pub(crate) fn long(\n        a: u8,\n    ) {\n        if a {\n        }\n    }\n}\n";
    assert_eq!(functions(text), [("long".to_owned(), 6)]);
    let arms = "fn f(a: u8) {\n    match a {\n        1 => g(),\n        _ => {}\n    }\n}\n";
    assert_eq!(functions(arms), [("f".to_owned(), 6)], "an empty arm is no end");
    let none = "trait T {\n    fn a(&self) -> u8;\n    fn b(&self) {}\n}\n";
    assert_eq!(functions(none), [("b".to_owned(), 1)], "a promise has no body");
}

#[test]
fn the_scanner_finds_a_long_function_also_after_a_test_module() {
    let body = "    x();\n".repeat(LINES_MOST - 2);
    let fits = format!("#[cfg(test)]\nmod tests;\n\nfn f() {{\n{body}}}\n");
    assert_eq!(too_long("crates/engine/src/a.rs", &fits), Vec::<String>::new());
    let over = fits.replacen("    x();", "    x();\n    x();", 1);
    assert_eq!(too_long("crates/engine/src/a.rs", &over).len(), 1);
    assert_eq!(too_long("crates/journal/src/a.rs", &fits).len(), 1, "sixty where it is stricter");
}
