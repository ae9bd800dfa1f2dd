//! Salvage: every row before the first damage, in a new file, with the same hashes.

use std::path::Path;

use record::Row;

use crate::chain::Walk;
use crate::file::Evidence;
use crate::journal::insert;
use crate::{FILE_NAME, JournalError};

/// What could be saved.
#[derive(Debug)]
pub struct Salvaged {
    pub rows: u64,
    /// Why it ended there; `None` if the whole record was good.
    pub end: Option<JournalError>,
}

/// Rows a transaction takes.
const GROUP: u64 = 4096;

/// Reads the evidence in `from`, which stays as it is, and writes the rows before the first that is
/// wrong into `to`, where no record may be yet. `progress` is told how many rows there are so far.
pub fn salvage(
    from: &Path,
    to: &Path,
    progress: &mut dyn FnMut(u64),
) -> Result<Salvaged, JournalError> {
    let path = to.join(FILE_NAME);
    if path.exists() {
        return Err(JournalError::NotEmpty { path });
    }
    let source = Evidence::open_to_read(from)?;
    let mut target = Evidence::open(to)?;
    let mut walk = Walk::WHOLE;
    let end = loop {
        let mut rows: Vec<Row> = Vec::new();
        let portion = walk.portion(&source, GROUP as usize, &mut |row| rows.push(row));
        write(&target, &rows)?;
        progress(walk.head().seq);
        match portion {
            Ok(true) => {}
            Ok(false) => break None,
            Err(end) => break Some(end),
        }
    };
    target.checkpoint()?;
    target.close()?;
    Ok(Salvaged { rows: walk.head().seq, end })
}

fn write(target: &Evidence, rows: &[Row]) -> Result<(), JournalError> {
    let sql = |e| target.sql("writing salvaged rows", e);
    let transaction = target.db.unchecked_transaction().map_err(sql)?;
    for row in rows {
        insert(&transaction, row).map_err(sql)?;
    }
    transaction.commit().map_err(sql)
}
