//! State folders that a mode begins with.

use std::path::Path;

use journal::{FILE_NAME, Journal};
use record::Row;
use rusqlite::Connection;
use units::Utc;

use crate::control::{self, Writer};
use crate::{load, site};

/// So many rows that the next seal packs some of them.
const PACKED_FROM: u64 = 12_400;

/// Form 1 as it was released: never changes.
const FORM_1: &str = "CREATE TABLE evidence (
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
) STRICT;
PRAGMA user_version = 1;";

pub fn prepare(mode: &str, dir: &Path) -> Result<u8, String> {
    let sql = |e: rusqlite::Error| e.to_string();
    let db = match mode {
        "migrate" => {
            let db = Connection::open(dir.join(FILE_NAME)).map_err(sql)?;
            db.execute_batch(&format!("PRAGMA journal_mode=WAL; {FORM_1}")).map_err(sql)?;
            db
        }
        "pack" => {
            let made = Journal::open(dir, &mut |_| {}).and_then(Journal::close);
            made.map_err(|e| load::in_words(&e))?;
            Connection::open(dir.join(FILE_NAME)).map_err(sql)?
        }
        other => return Err(format!("nothing is prepared for {other}")),
    };
    let mut writer = Writer::new(db, control::Durability::Full, None);
    if mode == "pack" {
        return many(writer).map_err(sql);
    }
    let site = site::sallow();
    for no in 1..=8 {
        writer.keep(load::batch(&site, 1, 1, no)).map_err(sql)?;
    }
    Ok(0)
}

fn many(mut writer: Writer) -> rusqlite::Result<u8> {
    let rows: Vec<Row> = (1..=PACKED_FROM)
        .map(|n| {
            let draft = load::draft(1, 100 + n, 0);
            writer.next(draft, 1, Utc::EPOCH, units::Mono::from_nanos(n))
        })
        .collect();
    writer.write(&rows)?;
    crate::say(&load::ack(PACKED_FROM, &rows[rows.len() - 1].hash));
    Ok(0)
}
