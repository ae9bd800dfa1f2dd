//! Rows for people and for programs: a table, JSON lines, CSV.

use comfy_table::Table;
use journal::Cell;
use serde_json::{Map, Value, json};

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Form {
    Table,
    Json,
    Csv,
}

/// Rows on their way out; a table is shown at the end, the rest as it comes.
pub struct Lines {
    form: Form,
    table: Option<Table>,
}

impl Lines {
    pub fn new(form: Form, with_table: bool) -> Self {
        Self { form, table: with_table.then(Table::new) }
    }

    pub fn head(&mut self, columns: &[String]) {
        match self.form {
            Form::Table => {
                if let Some(table) = &mut self.table {
                    table.set_header(columns);
                }
            }
            Form::Csv => csv(columns.iter().map(|c| Value::String(c.clone()))),
            Form::Json => {}
        }
    }

    /// As many cells as columns.
    pub fn row(&mut self, columns: &[String], cells: &[Value]) {
        match self.form {
            Form::Table => {
                if let Some(table) = &mut self.table {
                    table.add_row(cells.iter().map(text));
                }
            }
            Form::Csv => csv(cells.iter().cloned()),
            Form::Json => {
                let pairs = columns.iter().cloned().zip(cells.iter().cloned());
                say!("{}", Value::Object(pairs.collect::<Map<_, _>>()));
            }
        }
    }

    pub fn end(self) {
        if let (Form::Table, Some(table)) = (self.form, self.table) {
            say!("{table}");
        }
    }
}

/// A value of the view. JSON has no bytes: they are hexadecimal; nor infinities: they are missing.
pub fn value(cell: &Cell<'_>) -> Value {
    match cell {
        Cell::Nothing => Value::Null,
        Cell::Whole(n) => json!(n),
        Cell::Number(v) => json!(v),
        Cell::Text(text) => json!(text),
        Cell::Bytes(bytes) => {
            json!(bytes.iter().map(|b| format!("{b:02x}")).collect::<String>())
        }
    }
}

fn text(value: &Value) -> String {
    match value {
        Value::Null => String::new(),
        Value::String(text) => text.clone(),
        other => other.to_string(),
    }
}

/// A line by RFC 4180; texts that a spreadsheet would run are guarded as in an export.
fn csv(cells: impl Iterator<Item = Value>) {
    let cells = cells.map(|cell| match cell {
        Value::String(text) => journal::guarded(&text).into_owned(),
        other => text(&other),
    });
    say!(part "{}", journal::csv_line(cells));
}
