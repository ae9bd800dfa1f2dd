//! A table's columns, and its rows one after the other.

use rusqlite::Row;

use crate::view::{ViewError, ViewReader};

/// What a column's values are; each may be missing.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(super) enum Type {
    Whole,
    /// Microseconds from 1970-01-01, UTC.
    Instant,
    Number,
    Text,
}

#[derive(Clone, PartialEq, Eq, Debug)]
pub(super) struct Column {
    pub(super) name: String,
    pub(super) is: Type,
}

pub(super) fn columns(reader: &ViewReader, table: &str) -> Result<Vec<Column>, ViewError> {
    let sql = |e| reader.sql("reading a table's columns", e);
    let mut statement = reader
        .db
        .prepare("SELECT name, type FROM pragma_table_info(?1) ORDER BY cid")
        .map_err(sql)?;
    let list = statement.query_map([table], |r| {
        let (name, is): (String, String) = (r.get(0)?, r.get(1)?);
        let is = match is.as_str() {
            "INTEGER" if name.ends_with("_us") => Type::Instant,
            "INTEGER" => Type::Whole,
            "REAL" => Type::Number,
            _ => Type::Text,
        };
        Ok(Column { name, is })
    });
    list.and_then(Iterator::collect).map_err(sql)
}

/// Gives every row to `visit`, and tells `progress` (rows done, rows in all) now and then.
pub(super) fn each_row(
    reader: &ViewReader,
    table: &str,
    progress: &mut dyn FnMut(u64, u64),
    visit: &mut dyn FnMut(&Row<'_>) -> Result<(), ViewError>,
) -> Result<u64, ViewError> {
    let sql = |e| reader.sql("reading a table", e);
    // `entries` is counted by its number, since counting looks at every row.
    let count = match table {
        "entries" => "SELECT head_seq FROM meta".to_owned(),
        _ => format!("SELECT count(*) FROM {table}"),
    };
    let of: i64 = reader.db.query_row(&count, [], |r| r.get(0)).map_err(sql)?;
    let of = of.cast_unsigned();
    let mut statement =
        reader.db.prepare(&format!("SELECT * FROM {table} ORDER BY 1")).map_err(sql)?;
    let mut rows = statement.query([]).map_err(sql)?;
    let mut done = 0;
    while let Some(row) = rows.next().map_err(sql)? {
        visit(row)?;
        done += 1;
        if done % 4096 == 0 {
            progress(done, of);
        }
    }
    progress(done, of);
    Ok(done)
}
