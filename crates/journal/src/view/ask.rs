//! People's own SQL: one statement that reads, for so long and so many rows at the most.

use std::ops::ControlFlow;
use std::path::Path;
use std::sync::mpsc::{RecvTimeoutError, channel};
use std::time::Duration;

use rusqlite::fallible_iterator::FallibleIterator;
use rusqlite::hooks::{AuthAction, AuthContext, Authorization};
use rusqlite::limits::Limit;
use rusqlite::types::ValueRef;
use rusqlite::{Batch, Connection, ErrorCode, Statement};

use super::{ViewError, ViewReader};

/// Bytes of one value at the most: a query may not fill the memory.
const VALUE_BYTES_MAX: i32 = 16 << 20;

/// What one question may cost.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct AskedFor {
    pub time: Duration,
    pub rows: u64,
}

/// A value of an answer.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Cell<'a> {
    Nothing,
    Whole(i64),
    Number(f64),
    Text(&'a str),
    Bytes(&'a [u8]),
}

/// How an answer ended.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Asked {
    pub rows: u64,
    /// There were more rows than were allowed, or than `visit` wanted.
    pub more: bool,
}

/// Gets the names of the columns, and a row's values; breaks off where it has enough.
pub type Visit<'a> = dyn FnMut(&[String], Option<&[Cell<'_>]>) -> ControlFlow<()> + 'a;

/// Asks the view in the state folder. `visit` gets the names of the columns and the values of a row;
/// with no rows it is called once, with the names alone.
///
/// # Errors
/// [`ViewError::Refused`] for anything but one statement that reads, for one that SQLite does not
/// understand, and for one that takes longer than `most.time`.
pub fn ask(
    dir: &Path,
    sql: &str,
    most: AskedFor,
    visit: &mut Visit<'_>,
) -> Result<Asked, ViewError> {
    let ViewReader { mut db, .. } = ViewReader::open(dir)?;
    let refused = |e| refusal(sql, most, &e);
    db.set_limit(Limit::SQLITE_LIMIT_ATTACHED, 0).map_err(refused)?;
    db.set_limit(Limit::SQLITE_LIMIT_LENGTH, VALUE_BYTES_MAX).map_err(refused)?;
    db.authorizer(Some(reading)).map_err(refused)?;
    let interrupt = db.get_interrupt_handle();
    let (done, ended) = channel::<()>();
    std::thread::scope(|scope| {
        scope.spawn(move || {
            if ended.recv_timeout(most.time) == Err(RecvTimeoutError::Timeout) {
                interrupt.interrupt();
            }
        });
        let answer = answer(&db, sql, most, visit);
        drop(done);
        answer
    })
}

fn answer(
    db: &Connection,
    sql: &str,
    most: AskedFor,
    visit: &mut Visit<'_>,
) -> Result<Asked, ViewError> {
    let refused = |e| refusal(sql, most, &e);
    let mut batch = Batch::new(db, sql);
    let mut statement = batch.next().map_err(refused)?.ok_or_else(|| told(sql, ONE))?;
    // A second one is not understood, or is one too many: neither was asked for.
    if !matches!(batch.next(), Ok(None)) {
        return Err(told(sql, ONE));
    }
    if !statement.readonly() {
        return Err(told(sql, READS));
    }
    rows(&mut statement, most, visit).map_err(refused)
}

fn rows(
    statement: &mut Statement<'_>,
    most: AskedFor,
    visit: &mut Visit<'_>,
) -> rusqlite::Result<Asked> {
    let names: Vec<String> = statement.column_names().map(str::to_owned).collect();
    let mut asked = Asked { rows: 0, more: false };
    let mut rows = statement.query([])?;
    while let Some(row) = rows.next()? {
        if asked.rows == most.rows {
            asked.more = true;
            return Ok(asked);
        }
        let cells = (0..names.len()).map(|c| row.get_ref(c).and_then(cell));
        let cells: Vec<Cell<'_>> = cells.collect::<Result<_, _>>()?;
        asked.rows += 1;
        if visit(&names, Some(&cells)).is_break() {
            asked.more = true;
            return Ok(asked);
        }
    }
    if asked.rows == 0 {
        let _there_is_no_more = visit(&names, None);
    }
    Ok(asked)
}

fn cell(value: ValueRef<'_>) -> rusqlite::Result<Cell<'_>> {
    Ok(match value {
        ValueRef::Null => Cell::Nothing,
        ValueRef::Integer(n) => Cell::Whole(n),
        ValueRef::Real(v) => Cell::Number(v),
        ValueRef::Text(_) => Cell::Text(value.as_str()?),
        ValueRef::Blob(bytes) => Cell::Bytes(bytes),
    })
}

/// Selecting and reading; no writing, no settings, no other files.
fn reading(context: AuthContext<'_>) -> Authorization {
    match context.action {
        AuthAction::Select | AuthAction::Read { .. } | AuthAction::Recursive => {
            Authorization::Allow
        }
        AuthAction::Function { function_name } if function_name != "load_extension" => {
            Authorization::Allow
        }
        _ => Authorization::Deny,
    }
}

const ONE: &str = "give one statement, e.g. SELECT kind, count(*) FROM entries GROUP BY kind";
const READS: &str =
    "only reading is allowed: one SELECT on the view's tables, no PRAGMA, no ATTACH";

fn told(sql: &str, remedy: &str) -> ViewError {
    ViewError::Refused { field: "sql", value: sql.to_owned(), remedy: remedy.to_owned() }
}

fn refusal(sql: &str, most: AskedFor, e: &rusqlite::Error) -> ViewError {
    match e.sqlite_error_code() {
        Some(ErrorCode::OperationInterrupted) => told(
            sql,
            &format!(
                "it took longer than {} s and was ended; narrow it down, e.g. by days: WHERE seq \
                 BETWEEN (SELECT first_seq FROM days WHERE day = '2027-05-01') AND ...",
                most.time.as_secs_f64()
            ),
        ),
        Some(ErrorCode::AuthorizationForStatementDenied | ErrorCode::ReadOnly) => told(sql, READS),
        _ => told(sql, &format!("{e}; the tables and views: SELECT sql FROM sqlite_schema")),
    }
}
