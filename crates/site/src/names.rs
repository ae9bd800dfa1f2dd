//! Names of the file, looked up with help for a slip of the finger.

use crate::codes;
use crate::raw::{Node, Source, Table};

/// The names of one list of the site file, in its order.
pub(crate) struct Names {
    /// `asset`, `signal`: for people.
    kind: &'static str,
    list: Vec<String>,
}

impl Names {
    /// Takes the `name` of each table; a wrong or repeated one is noted.
    pub fn of(kind: &'static str, tables: &mut [Table<'_>]) -> Self {
        let mut list: Vec<String> = Vec::new();
        for t in tables {
            let name = t.need("name", "a `name` of small letters, digits and hyphens");
            let text = name.and_then(|n| proper_name(&n)).unwrap_or_default().to_owned();
            if let Some(n) = name
                && !text.is_empty()
            {
                t.what = format!("{kind} `{text}`");
                if list.contains(&text) {
                    n.fault::<()>(
                        codes::DUPLICATE_NAME,
                        format!("two {kind}s must not have the same name"),
                        "rename one of them, and what refers to it",
                    );
                }
            }
            list.push(text);
        }
        Self { kind, list }
    }
    /// `an asset`, `a place`.
    fn one(&self) -> String {
        let article = if self.kind.starts_with('a') { "an" } else { "a" };
        format!("{article} {}", self.kind)
    }
    pub fn name(&self, index: usize) -> &str {
        &self.list[index]
    }
    /// The index that this text names.
    pub fn find(&self, node: &Node<'_>) -> Option<u16> {
        let said = node.text(&format!("the name of {}, in quotes", self.one()))?;
        self.find_text(node.src, node.span(), said)
    }
    pub fn find_text(
        &self,
        src: &Source<'_>,
        at: std::ops::Range<usize>,
        said: &str,
    ) -> Option<u16> {
        if let Some(i) = self.list.iter().position(|n| n == said) {
            return u16::try_from(i).ok();
        }
        let known = self.list.iter().map(String::as_str).filter(|n| !n.is_empty());
        let remedy = match nearest(said, known.clone()) {
            Some(n) => format!("did you mean `{n}`?"),
            None => format!("known {}s: {}", self.kind, join_or_none(known)),
        };
        let rule = format!("`{said}` must be {} of the site file, and there is none", self.one());
        src.fault(codes::UNKNOWN_NAME, at, None, rule, remedy);
        None
    }
    /// Each name of a list once.
    pub fn find_all(&self, node: &Node<'_>) -> Option<Vec<u16>> {
        let nodes = node.list("[\"a\", \"b\"]")?;
        let mut found = Vec::with_capacity(nodes.len());
        for n in &nodes {
            let Some(i) = self.find(n) else { continue };
            if found.contains(&i) {
                n.fault::<()>(
                    codes::DUPLICATE_NAME,
                    format!("a {} must not be listed twice here", self.kind),
                    "take the second one out",
                );
                continue;
            }
            found.push(i);
        }
        (found.len() == nodes.len()).then_some(found)
    }
}

fn join_or_none<'a>(names: impl Iterator<Item = &'a str>) -> String {
    let list: Vec<_> = names.collect();
    if list.is_empty() { "none".to_owned() } else { list.join(", ") }
}

/// Text that may be a name: it stands in file names, rows and commands.
pub(crate) fn proper_name<'a>(node: &Node<'a>) -> Option<&'a str> {
    let said = node.text("\"lagoon-level-a\"")?;
    let proper = |b: u8| b.is_ascii_lowercase() || b.is_ascii_digit() || b == b'-';
    let ends = said.starts_with('-') || said.ends_with('-');
    if said.is_empty() || said.len() > 64 || ends || !said.bytes().all(proper) {
        return node.fault(
            codes::NAME,
            "a name must be 1 to 64 small letters, digits and hyphens, no hyphen at its ends",
            format!("write {:?}", suggest_name(said)),
        );
    }
    Some(said)
}

fn suggest_name(said: &str) -> String {
    let swap = |c: char| if c.is_ascii_alphanumeric() { c.to_ascii_lowercase() } else { '-' };
    let made: String = said.chars().map(swap).take(64).collect();
    let trimmed = made.trim_matches('-');
    if trimmed.is_empty() { "name".to_owned() } else { trimmed.to_owned() }
}

/// The known word nearest to `said`, if it is near enough to be a slip; the first on a tie.
pub(crate) fn nearest<'a>(said: &str, known: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    let reach = said.chars().count().div_ceil(3).clamp(1, 4);
    known
        .map(|k| (edits(said, k), k))
        .filter(|(d, _)| *d <= reach)
        .min_by_key(|(d, _)| *d)
        .map(|(_, k)| k)
}

/// Insertions, deletions and replacements from one text to the other. Source: V. I. Levenshtein
/// (1966), by the usual table of two rows.
fn edits(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.chars().collect();
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, ca) in a.chars().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, cb) in b.iter().enumerate() {
            let replaced = diagonal + usize::from(ca != *cb);
            diagonal = row[j + 1];
            row[j + 1] = replaced.min(row[j] + 1).min(diagonal + 1);
        }
    }
    row[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_slip_is_recognised_and_a_stranger_is_not() {
        assert_eq!(edits("kitten", "sitting"), 3);
        assert_eq!(nearest("penstok", ["pump-1", "penstock"].into_iter()), Some("penstock"));
        assert_eq!(nearest("weir", ["pump-1", "penstock"].into_iter()), None);
    }
}
