//! Apache Parquet: columns with their types, packed with zstd. Instants (`_us`) are timestamps in
//! UTC; every column may be missing.

use std::fs::File;
use std::path::Path;
use std::sync::Arc;

use parquet::basic::{Compression, ZstdLevel};
use parquet::data_type::{ByteArray, ByteArrayType, DoubleType, Int64Type};
use parquet::errors::Result as Written;
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::writer::{SerializedColumnWriter, SerializedFileWriter};
use parquet::schema::parser::parse_message_type;
use rusqlite::Row;
use rusqlite::types::ValueRef;

use super::columns::{self, Column, Type};
use crate::view::{ViewError, ViewHead, ViewReader};

/// Rows of a group: what stays in memory at a time.
const GROUP_ROWS: usize = 65_536;

pub(super) fn write(
    reader: &ViewReader,
    table: &str,
    head: &ViewHead,
    to: &Path,
    progress: &mut dyn FnMut(u64, u64),
) -> Result<u64, ViewError> {
    let wrong = |source| ViewError::Parquet { path: to.to_owned(), source };
    let list = columns::columns(reader, table)?;
    let file = File::create(to).map_err(|e| ViewError::io(to, "writing it", e))?;
    let mut writer = begin(file, table, &list, head).map_err(wrong)?;
    let mut group: Vec<Values> = list.iter().map(|c| Values::of(c.is)).collect();
    let mut waiting = 0;
    let rows = columns::each_row(reader, table, progress, &mut |row| {
        for (no, values) in group.iter_mut().enumerate() {
            values.push(row, no).map_err(|e| reader.sql("reading a table", e))?;
        }
        waiting += 1;
        if waiting == GROUP_ROWS {
            waiting = 0;
            write_group(&mut writer, &mut group).map_err(wrong)?;
        }
        Ok(())
    })?;
    if waiting > 0 {
        write_group(&mut writer, &mut group).map_err(wrong)?;
    }
    writer.close().map_err(wrong)?;
    Ok(rows)
}

fn begin(
    file: File,
    table: &str,
    list: &[Column],
    head: &ViewHead,
) -> Written<SerializedFileWriter<File>> {
    let fields: String = list
        .iter()
        .map(|Column { name, is }| match is {
            Type::Whole => format!("optional int64 {name};"),
            Type::Instant => format!("optional int64 {name} (TIMESTAMP(MICROS,true));"),
            Type::Number => format!("optional double {name};"),
            Type::Text => format!("optional binary {name} (UTF8);"),
        })
        .collect();
    let schema = parse_message_type(&format!("message {table} {{ {fields} }}"))?;
    let entry = |key: &str, value: String| KeyValue::new(key.to_owned(), value);
    let whence = vec![
        entry("record_head_seq", head.seq.to_string()),
        entry("record_head_hash", head.hash.clone()),
    ];
    let properties = WriterProperties::builder()
        .set_compression(Compression::ZSTD(ZstdLevel::default()))
        .set_created_by("tidereeve".to_owned())
        .set_key_value_metadata(Some(whence))
        .build();
    SerializedFileWriter::new(file, Arc::new(schema), Arc::new(properties))
}

fn write_group(writer: &mut SerializedFileWriter<File>, group: &mut [Values]) -> Written<()> {
    let mut out = writer.next_row_group()?;
    for values in group {
        if let Some(column) = out.next_column()? {
            values.write(column)?;
        }
    }
    out.close().map(drop)
}

/// The values of a column that are there, and for each row whether it has one.
struct Values {
    of: Of,
    there: Vec<i16>,
}

enum Of {
    Whole(Vec<i64>),
    Number(Vec<f64>),
    Text(Vec<ByteArray>),
}

impl Values {
    fn of(is: Type) -> Self {
        let of = match is {
            Type::Whole | Type::Instant => Of::Whole(Vec::new()),
            Type::Number => Of::Number(Vec::new()),
            Type::Text => Of::Text(Vec::new()),
        };
        Self { of, there: Vec::new() }
    }

    fn push(&mut self, row: &Row<'_>, no: usize) -> rusqlite::Result<()> {
        let is_there = row.get_ref(no)? != ValueRef::Null;
        self.there.push(i16::from(is_there));
        if is_there {
            match &mut self.of {
                Of::Whole(list) => list.push(row.get(no)?),
                Of::Number(list) => list.push(row.get(no)?),
                Of::Text(list) => list.push(ByteArray::from(row.get_ref(no)?.as_str()?)),
            }
        }
        Ok(())
    }

    fn write(&mut self, mut column: SerializedColumnWriter<'_>) -> Written<()> {
        let there = Some(&self.there[..]);
        match &self.of {
            Of::Whole(list) => column.typed::<Int64Type>().write_batch(list, there, None)?,
            Of::Number(list) => column.typed::<DoubleType>().write_batch(list, there, None)?,
            Of::Text(list) => column.typed::<ByteArrayType>().write_batch(list, there, None)?,
        };
        self.there.clear();
        match &mut self.of {
            Of::Whole(list) => list.clear(),
            Of::Number(list) => list.clear(),
            Of::Text(list) => list.clear(),
        }
        column.close()
    }
}
