//! CSV by RFC 4180: a header, CRLF, quotes where they are needed, UTF-8.
//!
//! A spreadsheet runs a cell that begins with `=`, `+`, `-` or `@` as a formula, whoever wrote it;
//! so such a text gets an apostrophe in front (common practice). Numbers are left as they are.

use std::borrow::Cow;
use std::fs::File;
use std::path::Path;

use csv::{QuoteStyle, Terminator, WriterBuilder};
use rusqlite::types::ValueRef;

use super::columns;
use crate::view::{ViewError, ViewReader};

/// A text as it stands in a CSV export: with an apostrophe in front if a spreadsheet might run it,
/// or if it begins with one. Taking one leading apostrophe away gives the text back, always.
pub fn guarded(text: &str) -> Cow<'_, str> {
    match text.as_bytes().first() {
        Some(b'=' | b'+' | b'-' | b'@' | b'\t' | b'\r' | b'\'') => Cow::Owned(format!("'{text}")),
        _ => Cow::Borrowed(text),
    }
}

/// One line of CSV by RFC 4180, its CRLF too. Texts are to be [`guarded`] before.
pub fn csv_line(cells: impl Iterator<Item = String>) -> String {
    let mut writer = builder().from_writer(Vec::new());
    let written = cells.map(String::into_bytes).try_for_each(|cell| writer.write_field(cell));
    written
        .and_then(|()| writer.write_record(None::<&[u8]>))
        .expect("memory takes a line of any length");
    let bytes = writer.into_inner().expect("memory takes a line of any length");
    String::from_utf8(bytes).expect("texts with ASCII between them are text")
}

fn builder() -> WriterBuilder {
    let mut builder = WriterBuilder::new();
    builder.terminator(Terminator::CRLF).quote_style(QuoteStyle::Necessary);
    builder
}

pub(super) fn write(
    reader: &ViewReader,
    table: &str,
    to: &Path,
    progress: &mut dyn FnMut(u64, u64),
) -> Result<u64, ViewError> {
    let wrong = |source| ViewError::Csv { path: to.to_owned(), source };
    let file = File::create(to).map_err(|e| ViewError::io(to, "writing it", e))?;
    let mut writer = builder().buffer_capacity(1 << 16).from_writer(file);
    let columns = columns::columns(reader, table)?;
    writer.write_record(columns.iter().map(|c| &c.name)).map_err(wrong)?;
    let rows = columns::each_row(reader, table, progress, &mut |row| {
        for no in 0..columns.len() {
            let value = row.get_ref(no).map_err(|e| reader.sql("reading a table", e))?;
            writer.write_field(cell(&value).as_bytes()).map_err(wrong)?;
        }
        writer.write_record(None::<&[u8]>).map_err(wrong)
    })?;
    writer.flush().map_err(|e| ViewError::io(to, "writing it", e))?;
    Ok(rows)
}

/// Numbers in the shortest form that reads back as the same.
fn cell<'a>(value: &ValueRef<'a>) -> Cow<'a, str> {
    match value {
        ValueRef::Null => Cow::Borrowed(""),
        ValueRef::Integer(n) => Cow::Owned(n.to_string()),
        ValueRef::Real(v) => Cow::Owned(v.to_string()),
        ValueRef::Text(bytes) => match String::from_utf8_lossy(bytes) {
            Cow::Borrowed(text) => guarded(text),
            Cow::Owned(text) => Cow::Owned(guarded(&text).into_owned()),
        },
        ValueRef::Blob(bytes) => Cow::Owned(crate::view::hex(bytes)),
    }
}
