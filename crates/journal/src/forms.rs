//! The forms of the evidence file, and the numbered steps from each to the next.
//!
//! A step is one transaction that ends by writing the new number, so that a crash leaves one form or
//! the other. A step that has been released is never edited: a test holds its digest.

use rusqlite::Connection;

/// Step `n` (counted from 0) leads from form `n` to form `n + 1`; form 0 is an empty file.
pub(crate) const STEPS: [&str; 2] = [
    // One row a decision; each with the hash of the one before.
    "CREATE TABLE evidence (
    seq INTEGER PRIMARY KEY,
    term INTEGER NOT NULL,
    utc_us INTEGER NOT NULL,
    boot_ns INTEGER NOT NULL,
    kind INTEGER NOT NULL,
    version INTEGER NOT NULL,
    subject TEXT NOT NULL,
    cause TEXT NOT NULL,
    body BLOB NOT NULL,
    hash BLOB NOT NULL
) STRICT;",
    // Old rows in packs; what the engine was told, and minute readings, until they are sealed;
    // where the sealed segments are, and which days a legal hold keeps.
    "CREATE TABLE packs (
    first_seq INTEGER PRIMARY KEY,
    last_seq INTEGER NOT NULL,
    first_utc_us INTEGER NOT NULL,
    last_utc_us INTEGER NOT NULL,
    before BLOB NOT NULL,
    after BLOB NOT NULL,
    body BLOB NOT NULL
) STRICT;
CREATE TABLE inputs (
    no INTEGER PRIMARY KEY AUTOINCREMENT,
    day INTEGER NOT NULL,
    events BLOB NOT NULL,
    minutes BLOB NOT NULL
) STRICT;
CREATE TABLE segments (
    file TEXT PRIMARY KEY,
    day INTEGER NOT NULL,
    digest BLOB NOT NULL,
    sealed_seq INTEGER NOT NULL,
    deleted_seq INTEGER
) STRICT;
CREATE TABLE holds (
    seq INTEGER PRIMARY KEY,
    from_day INTEGER NOT NULL,
    to_day INTEGER NOT NULL,
    lifted_seq INTEGER
) STRICT;",
];

/// The form that this version writes, in SQLite's `user_version`.
pub(crate) const FORM: i64 = STEPS.len() as i64;
/// Packs and inputs are there from this form on.
pub(crate) const WITH_PACKS: i64 = 2;

/// Takes the file from `form` to [`FORM`], one transaction a step.
pub(crate) fn lift(db: &Connection, form: i64) -> rusqlite::Result<()> {
    let first = usize::try_from(form).unwrap_or(STEPS.len());
    for (no, step) in STEPS.iter().enumerate().skip(first) {
        db.execute_batch(&format!(
            "BEGIN EXCLUSIVE;\n{step}\nPRAGMA user_version = {};\nCOMMIT;",
            no + 1
        ))?;
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn released_steps_are_never_edited() {
        let digests = STEPS.map(|s| blake3::hash(s.as_bytes()).to_hex()[..16].to_owned());
        assert_eq!(digests, ["ddd7f6f24bb0c8b3", "344e52b84735e05c"]);
    }

    #[test]
    fn every_form_can_be_lifted_from_every_older_one() {
        for from in 0..FORM {
            let db = Connection::open_in_memory().unwrap();
            for (no, step) in STEPS.iter().enumerate().take(from as usize) {
                db.execute_batch(&format!("{step} PRAGMA user_version = {};", no + 1)).unwrap();
            }
            lift(&db, from).unwrap();
            let form: i64 = db.pragma_query_value(None, "user_version", |r| r.get(0)).unwrap();
            assert_eq!(form, FORM);
            db.execute_batch(
                "SELECT seq FROM evidence; SELECT no FROM inputs; SELECT body FROM packs",
            )
            .unwrap();
        }
    }
}
