//! TOML as it stands in the file, walked with its spans. Every question that is asked of a table is
//! noted, so that a key nobody asked for is refused.

use std::cell::{Cell, RefCell};
use std::ops::Range;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use crate::codes::{self, Code};
use crate::names::nearest;
use crate::report::{Fault, fault_at};

/// How an absent value is shown.
pub(crate) const NOTHING: &str = "(nothing)";

/// The newest form of the files that this program reads.
const FORMAT: f64 = 1.0;

/// One file: its name, its text, and where faults go.
pub(crate) struct Source<'a> {
    pub file: &'a str,
    pub text: &'a str,
    pub faults: &'a RefCell<Vec<Fault>>,
}

impl Source<'_> {
    pub fn fault(
        &self,
        code: Code,
        at: Range<usize>,
        value: Option<String>,
        rule: impl Into<String>,
        remedy: impl Into<String>,
    ) {
        let words = (rule.into(), remedy.into());
        let fault = fault_at(code, (self.file, self.text), at, value, words);
        self.faults.borrow_mut().push(fault);
    }
    /// Parses the text; each fault of its grammar is noted.
    pub fn parse(&self) -> Option<Spanned<DeTable<'_>>> {
        let (table, errors) = DeTable::parse_recoverable(self.text);
        for e in &errors {
            let at = e.span().unwrap_or(0..0);
            // The grammar's own span may be empty, so the value shown is the line.
            let start = self.text[..self.text.floor_char_boundary(at.start)]
                .rfind('\n')
                .map_or(0, |n| n + 1);
            let line = self.text[start..].lines().next().unwrap_or_default().trim().to_owned();
            self.fault(
                codes::SYNTAX,
                at,
                Some(line),
                format!("the file must be TOML, but here: {}", e.message()),
                "mend the line; text needs quotes, a key comes once, a list needs commas",
            );
        }
        errors.is_empty().then_some(table)
    }
    /// The whole file as a table, its `format` line checked.
    pub fn root<'a>(&'a self, table: &'a Spanned<DeTable<'a>>, what: &str) -> Table<'a> {
        let root = Table::new(self, table.get_ref(), 0..0, what.to_owned());
        if let Some(format) = root.need("format", "`format = 1` as the first line") {
            format.check_format(table.get_ref());
        }
        root
    }
}

/// One value with its place in the file.
#[derive(Clone, Copy)]
pub(crate) struct Node<'a> {
    pub src: &'a Source<'a>,
    value: &'a Spanned<DeValue<'a>>,
}

impl<'a> Node<'a> {
    pub fn span(&self) -> Range<usize> {
        self.value.span()
    }
    /// Notes a fault of this value; always `None`, so that it can end a decoder.
    pub fn fault<T>(
        &self,
        code: Code,
        rule: impl Into<String>,
        remedy: impl Into<String>,
    ) -> Option<T> {
        self.src.fault(code, self.span(), None, rule, remedy);
        None
    }
    fn wrong_kind<T>(&self, wanted: &str, example: &str) -> Option<T> {
        let is = self.value.get_ref().type_str();
        self.fault(
            codes::WRONG_KIND,
            format!("this must be {wanted}, not {is}"),
            format!("write it like {example}"),
        )
    }
    pub fn is_number(&self) -> bool {
        matches!(self.value.get_ref(), DeValue::Integer(_) | DeValue::Float(_))
    }
    pub fn text(&self, example: &str) -> Option<&'a str> {
        match self.value.get_ref() {
            DeValue::String(s) => Some(s),
            _ => self.wrong_kind("text in quotes", example),
        }
    }
    /// Text, or a TOML date-time as its text: for instants.
    pub fn text_or_instant(&self, example: &str) -> Option<String> {
        match self.value.get_ref() {
            DeValue::Datetime(d) => Some(d.to_string()),
            _ => self.text(example).map(str::to_owned),
        }
    }
    /// A number without a unit, finite and within the range.
    pub fn number(&self, min: f64, max: f64) -> Option<f64> {
        let value = match self.value.get_ref() {
            DeValue::Integer(i) if i.radix() == 10 => i.as_str().parse().ok(),
            DeValue::Float(f) => f.as_str().parse().ok(),
            _ => return self.wrong_kind("a number without quotes", "0.95"),
        };
        match value {
            Some(v) if v >= min && v <= max => Some(v),
            _ => self.fault(
                codes::OUT_OF_RANGE,
                format!("this number must be from {min} to {max}"),
                "check the figure and what it counts",
            ),
        }
    }
    /// A whole number.
    pub fn whole(&self, min: u64, max: u64) -> Option<u64> {
        let parsed = match self.value.get_ref() {
            DeValue::Integer(i) if i.radix() == 10 => i.as_str().parse::<u64>().ok(),
            DeValue::Integer(_) => None,
            _ => return self.wrong_kind("a whole number without quotes", "8"),
        };
        match parsed {
            Some(v) if v >= min && v <= max => Some(v),
            _ => self.fault(
                codes::OUT_OF_RANGE,
                format!("this must be a whole number from {min} to {max}"),
                "check the figure and what it counts",
            ),
        }
    }
    pub fn list(&self, example: &str) -> Option<Vec<Node<'a>>> {
        match self.value.get_ref() {
            DeValue::Array(a) => {
                Some(a.iter().map(|value| Node { src: self.src, value }).collect())
            }
            _ => self.wrong_kind("a list", example),
        }
    }
    /// A list of exactly `N`.
    pub fn row<const N: usize>(&self, example: &str) -> Option<[Node<'a>; N]> {
        let list = self.list(example)?;
        let n = list.len();
        list.try_into().ok().or_else(|| {
            self.fault(
                codes::WRONG_KIND,
                format!("this list must have {N} entries, not {n}"),
                format!("write it like {example}"),
            )
        })
    }
    pub fn table(&self, what: impl Into<String>) -> Option<Table<'a>> {
        match self.value.get_ref() {
            DeValue::Table(t) => Some(Table::new(self.src, t, self.span(), what.into())),
            _ => self.wrong_kind("a table", "{ key = value }"),
        }
    }
    /// One of the words given, with what each stands for.
    pub fn word<T: Copy>(&self, choices: &[(&'static str, T)]) -> Option<T> {
        let names = || choices.iter().map(|c| c.0);
        let all = names().map(|n| format!("{n:?}")).collect::<Vec<_>>().join(", ");
        let said = self.text(&all)?;
        if let Some(c) = choices.iter().find(|c| c.0 == said) {
            return Some(c.1);
        }
        let remedy = match nearest(said, names()) {
            Some(n) => format!("did you mean {n:?}?"),
            None => format!("write one of {all}"),
        };
        self.fault(codes::NOT_A_CHOICE, format!("this must be one of {all}"), remedy)
    }
    fn check_format(&self, root: &DeTable<'_>) {
        let first = root.values().map(|v| v.span().start).min();
        if first.is_some_and(|f| f < self.span().start) {
            self.fault::<()>(
                codes::FORMAT,
                "`format` must be the first key of the file",
                "move `format = 1` to the top",
            );
        }
        let is = match self.value.get_ref() {
            DeValue::Integer(i) => i.as_str().parse::<f64>().ok(),
            _ => None,
        };
        match is {
            Some(FORMAT) => {}
            Some(n) if n > FORMAT => {
                self.fault::<()>(
                    codes::FORMAT_NEWER,
                    "this program reads format 1 and the file says that it is newer",
                    "use the program that the file was written for, or write the file in format 1",
                );
            }
            _ => {
                self.fault::<()>(
                    codes::FORMAT,
                    "`format` must be the whole number 1",
                    "write `format = 1` as the first line",
                );
            }
        }
    }
}

/// A table that remembers what it was asked for.
pub(crate) struct Table<'a> {
    pub src: &'a Source<'a>,
    entries: &'a DeTable<'a>,
    at: Range<usize>,
    /// What it describes, for people: ``asset `penstock` ``.
    pub what: String,
    asked: RefCell<Vec<&'static str>>,
    forgiven: Cell<bool>,
}

impl<'a> Table<'a> {
    fn new(src: &'a Source<'a>, entries: &'a DeTable<'a>, at: Range<usize>, what: String) -> Self {
        Self { src, entries, at, what, asked: RefCell::default(), forgiven: Cell::new(false) }
    }
    pub fn get(&self, key: &'static str) -> Option<Node<'a>> {
        self.asked.borrow_mut().push(key);
        let value = self.entries.get(key)?;
        Some(Node { src: self.src, value })
    }
    pub fn has(&self, key: &str) -> bool {
        self.entries.contains_key(key)
    }
    /// The value, or a fault that it is missing; `example` shows what to write.
    pub fn need(&self, key: &'static str, example: &str) -> Option<Node<'a>> {
        self.need_as(codes::MISSING, key, example)
    }
    /// The same under a code of its own.
    pub fn need_as(&self, code: Code, key: &'static str, example: &str) -> Option<Node<'a>> {
        self.get(key).or_else(|| {
            self.fault(
                code,
                format!("{} must say `{key}`; there is no default", self.what),
                format!("add {example}"),
            )
        })
    }
    /// A fault of the table as a whole, shown at its head.
    pub fn fault<T>(
        &self,
        code: Code,
        rule: impl Into<String>,
        remedy: impl Into<String>,
    ) -> Option<T> {
        self.src.fault(code, self.at.clone(), Some(NOTHING.to_owned()), rule, remedy);
        None
    }
    /// All entries, for tables whose keys are names.
    pub fn all(&self) -> Vec<(&'a str, Range<usize>, Node<'a>)> {
        let mut list: Vec<_> = self
            .entries
            .iter()
            .map(|(k, value)| {
                let key: &str = k.get_ref();
                (key, k.span(), Node { src: self.src, value })
            })
            .collect();
        list.sort_by_key(|(_, at, _)| at.start);
        list
    }
    /// The tables of `[[key]]`, none if it is absent.
    pub fn tables(&self, key: &'static str, what: &str) -> Vec<Table<'a>> {
        let list = self.get(key).and_then(|n| n.list(&format!("[[{key}]]"))).unwrap_or_default();
        list.iter().filter_map(|n| n.table(what)).collect()
    }
    /// Lets unknown keys pass: what the table is has been refused already, so nothing can be said
    /// of the keys that only one kind has.
    pub fn forgive(&self) {
        self.forgiven.set(true);
    }
    /// Refuses every key that nobody asked for.
    pub fn finish(&self) {
        if self.forgiven.get() {
            return;
        }
        let asked = self.asked.borrow();
        for (key, at, _) in self.all() {
            if asked.contains(&key) {
                continue;
            }
            let remedy = match nearest(key, asked.iter().copied()) {
                Some(n) => format!("did you mean `{n}`? else take the line out"),
                None => format!("take it out; known here: {}", asked.join(", ")),
            };
            let rule = format!(
                "there is no key `{key}` in {}; nothing is passed over in silence",
                self.what
            );
            self.src.fault(codes::UNKNOWN_KEY, at, None, rule, remedy);
        }
    }
}
