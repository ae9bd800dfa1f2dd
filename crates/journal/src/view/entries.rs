//! Entries as they are read, one at a time or many in memory.

use rusqlite::Connection;
use units::Utc;

/// Room that is made for the words of one entry; about what they take.
const WORDS_BYTES: usize = 64;

/// One entry, as it lies in the view.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Entry<'a> {
    pub seq: u64,
    pub utc: Utc,
    pub kind: &'a str,
    pub subject: &'a str,
    pub words: &'a str,
    /// Where [`Wanted::whole`] asks for it.
    pub rest: Option<Rest<'a>>,
}

/// What the words of an entry do not add up to by themselves.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Rest<'a> {
    pub term: u64,
    pub cause: &'a str,
}

/// Entries in memory, their texts one after the other.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Entries {
    names: Names,
    text: String,
    marks: Vec<Mark>,
    /// Term, and where the cause begins.
    rests: Vec<(u64, usize)>,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
struct Mark {
    seq: u64,
    utc: Utc,
    about: u32,
    /// Where its words, and then its cause, begin in the text.
    words: usize,
}

impl Entries {
    pub(crate) fn with(names: Names, rows: usize) -> Self {
        let text = String::with_capacity(rows * WORDS_BYTES);
        Self { names, text, marks: Vec::with_capacity(rows), rests: Vec::new() }
    }

    pub(crate) fn push(&mut self, raw: &Raw<'_>) {
        let &Raw { seq, utc, about, .. } = raw;
        self.marks.push(Mark { seq, utc, about, words: self.text.len() });
        self.text.push_str(raw.words);
        if let Some(rest) = raw.rest {
            self.rests.push((rest.term, self.text.len()));
            self.text.push_str(rest.cause);
        }
    }

    pub fn len(&self) -> usize {
        self.marks.len()
    }

    pub fn is_empty(&self) -> bool {
        self.marks.is_empty()
    }

    pub fn iter(&self) -> impl Iterator<Item = Entry<'_>> {
        let ends = self.marks.iter().skip(1).map(|m| m.words).chain([self.text.len()]);
        self.marks.iter().zip(ends).enumerate().map(|(no, (mark, end))| {
            let rest = self.rests.get(no);
            let cause = rest.map_or(end, |(_, cause)| *cause);
            let (kind, subject) = self.names.of(mark.about);
            Entry {
                seq: mark.seq,
                utc: mark.utc,
                kind,
                subject,
                words: &self.text[mark.words..cause],
                rest: rest.map(|&(term, cause)| Rest { term, cause: &self.text[cause..end] }),
            }
        })
    }
}

/// Kind and subject behind each number of `abouts`.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub(crate) struct Names(Vec<(String, String)>);

impl Names {
    pub(crate) fn read(db: &Connection) -> rusqlite::Result<Self> {
        let mut names: Vec<(String, String)> = Vec::new();
        let mut statement = db.prepare_cached("SELECT number, kind, subject FROM abouts")?;
        let mut rows = statement.query([])?;
        while let Some(row) = rows.next()? {
            let number = usize::from(row.get::<_, u16>(0)?);
            names.resize(names.len().max(number + 1), Default::default());
            names[number] = (row.get(1)?, row.get(2)?);
        }
        Ok(Self(names))
    }

    /// Empty for a number without names, which only a damaged view has.
    pub(crate) fn of(&self, about: u32) -> (&str, &str) {
        self.0.get(about as usize).map_or(("", ""), |(kind, subject)| (kind, subject))
    }
}

/// An entry with a number for its kind and subject.
pub(crate) struct Raw<'a> {
    pub(crate) seq: u64,
    pub(crate) utc: Utc,
    pub(crate) about: u32,
    pub(crate) words: &'a str,
    pub(crate) rest: Option<Rest<'a>>,
}

impl<'a> Raw<'a> {
    /// From `utc_us, about, words`, then `term, cause` if the whole is wanted.
    pub(crate) fn of(seq: u64, row: &'a rusqlite::Row<'_>, whole: bool) -> rusqlite::Result<Self> {
        let rest = if whole {
            let cause = row.get_ref(4)?.as_str()?;
            Some(Rest { term: row.get::<_, i64>(3)?.cast_unsigned(), cause })
        } else {
            None
        };
        let (utc, about) = (Utc::from_micros(row.get(0)?), row.get(1)?);
        Ok(Self { seq, utc, about, words: row.get_ref(2)?.as_str()?, rest })
    }
}
