//! What is wrong with a site, as people and as programs read it.

use std::fmt;
use std::ops::Range;

use annotate_snippets::{AnnotationKind, Level, Renderer, Snippet};
use serde::Serialize;

use crate::codes::Code;

/// One thing that is wrong: what, where, with which value, against which rule, and what to do.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Fault {
    /// Stable: `S012`, `L004`. See [`crate::explain`].
    pub code: &'static str,
    pub file: String,
    /// Counted from 1. Line 1 column 1 where the whole file is meant.
    pub line: usize,
    /// In characters, counted from 1.
    pub column: usize,
    /// The value as it stands in the file, or `(nothing)` where something is missing.
    pub value: String,
    pub rule: String,
    pub remedy: String,
    #[serde(skip)]
    at: Range<usize>,
}

/// How many faults the form for people shows; nobody mends more at once.
const SHOWN_MAX: usize = 50;

/// Every fault of every file of a site, in the order of the files and of their lines.
#[derive(Clone, PartialEq, Debug, Serialize)]
pub struct Report {
    pub faults: Vec<Fault>,
    #[serde(skip)]
    texts: Vec<(String, String)>,
}

impl Report {
    /// `texts` are (file name, content) of each file that was read, in order.
    pub(crate) fn new(mut faults: Vec<Fault>, texts: Vec<(String, String)>) -> Self {
        let rank = |f: &Fault| texts.iter().position(|t| t.0 == f.file);
        faults.sort_by(|a, b| {
            (rank(a), a.at.start, a.code, &a.rule).cmp(&(rank(b), b.at.start, b.code, &b.rule))
        });
        faults.dedup();
        Self { faults, texts }
    }
    /// How many, in words: `1 fault`, `3 faults`.
    pub fn count(&self) -> String {
        match self.faults.len() {
            1 => "1 fault".to_owned(),
            n => format!("{n} faults"),
        }
    }
    fn render(&self, fault: &Fault) -> String {
        let empty = String::new();
        let text = self.texts.iter().find(|t| t.0 == fault.file).map_or(&empty, |t| &t.1);
        let title = Level::ERROR.primary_title(fault.rule.as_str()).id(fault.code);
        let help = Level::HELP.message(fault.remedy.as_str());
        if text.is_empty() {
            let group = title.element(Level::NOTE.message(format!(
                "{}:{}:{}: {}",
                fault.file, fault.line, fault.column, fault.value
            )));
            return Renderer::plain().render(&[group.element(help)]);
        }
        let mark = AnnotationKind::Primary.span(first_line(text, &fault.at));
        let snippet = Snippet::source(text.as_str()).path(fault.file.as_str()).annotation(mark);
        Renderer::plain().render(&[title.element(snippet).element(help)])
    }
}

impl fmt::Display for Report {
    /// Each fault with its line and a caret, then how many there were.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for fault in self.faults.iter().take(SHOWN_MAX) {
            writeln!(f, "{}\n", self.render(fault))?;
        }
        if self.faults.len() > SHOWN_MAX {
            writeln!(f, "... and {} more\n", self.faults.len() - SHOWN_MAX)?;
        }
        write!(
            f,
            "{}; the site is refused whole. `tidereeve explain CODE` says more of a code.",
            self.count()
        )
    }
}

impl std::error::Error for Report {}

/// The part of `at` that lies on its first line, so that a table is marked by its header.
fn first_line(text: &str, at: &Range<usize>) -> Range<usize> {
    let start = text.floor_char_boundary(at.start);
    let end = text.floor_char_boundary(at.end).max(start);
    let stop = text[start..end].find('\n').map_or(end, |n| start + n);
    start..stop.max(start)
}

/// Line and column, both from 1, of a byte offset.
fn line_column(text: &str, offset: usize) -> (usize, usize) {
    let before = &text[..text.floor_char_boundary(offset)];
    let line_start = before.rfind('\n').map_or(0, |n| n + 1);
    (before.matches('\n').count() + 1, before[line_start..].chars().count() + 1)
}

/// Makes a fault about a part of a text.
pub(crate) fn fault_at(
    code: Code,
    (file, text): (&str, &str),
    at: Range<usize>,
    value: Option<String>,
    (rule, remedy): (String, String),
) -> Fault {
    let (line, column) = line_column(text, at.start);
    let shown = value.unwrap_or_else(|| text[first_line(text, &at)].trim().to_owned());
    Fault {
        code: code.0,
        file: file.to_owned(),
        line,
        column,
        value: if shown.is_empty() { crate::raw::NOTHING.to_owned() } else { shown },
        rule,
        remedy,
        at,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn line_and_column_count_characters_not_bytes() {
        assert_eq!(line_column("a\nåb = 1", 5), (2, 3));
        assert_eq!(line_column("", 0), (1, 1));
        assert_eq!(first_line("[[a]]\nb = 1", &(0..11)), 0..5);
    }
}
