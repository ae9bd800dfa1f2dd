//! Wrong on purpose: writers of the same rows that break one promise each. A sweep that finds
//! nothing wrong with them is worth nothing.

use journal::{FILE_NAME, Journal};
use record::{Row, canonical_bytes};
use rusqlite::{Connection, params};
use units::{Mono, Utc};

use crate::{Orders, load, say, site};

const REFUSED: u8 = 4;

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Durability {
    /// The journal itself.
    Full,
    /// `synchronous=NORMAL`: acknowledged without a sync.
    Normal,
    /// `synchronous=OFF`: never a sync.
    Off,
    /// Acknowledged, and its commands sent, before the commit.
    Early,
    /// Errors are not heard: acknowledged all the same.
    Deaf,
}

impl Durability {
    pub fn named(name: &str) -> Option<Self> {
        Some(match name {
            "full" => Self::Full,
            "normal" => Self::Normal,
            "off" => Self::Off,
            "early" => Self::Early,
            "deaf" => Self::Deaf,
            _ => return None,
        })
    }
}

/// The real journal makes the file; these go on with it.
pub fn run(orders: &Orders) -> Result<u8, String> {
    let mut last = None;
    let made = Journal::open(&orders.dir, &mut |row| last = Some(row)).and_then(Journal::close);
    let opened = made
        .map_err(|e| load::in_words(&e))
        .and_then(|()| settled(orders).map_err(|e| e.to_string()));
    let db = match opened {
        Ok(db) => db,
        Err(why) => {
            say(&format!("REFUSED {why}"));
            return Ok(REFUSED);
        }
    };
    let term = last.as_ref().map_or(0, |r| r.term) + 1;
    let mut writer = Writer::new(db, orders.durability, last.as_ref());
    let site = site::sallow();
    for no in 1..=orders.batches {
        if let Err(e) = writer.keep(load::batch(&site, orders.seed, term, no)) {
            say(&format!("LOST {e}"));
            return Ok(3);
        }
    }
    if orders.mode == "append" {
        std::mem::forget(writer.db);
    }
    say(&format!("DONE {term}"));
    Ok(0)
}

fn settled(orders: &Orders) -> rusqlite::Result<Connection> {
    let db = Connection::open(orders.dir.join(FILE_NAME))?;
    let synchronous = match orders.durability {
        Durability::Normal => "NORMAL",
        Durability::Off => "OFF",
        _ => "FULL",
    };
    db.execute_batch(&format!(
        "PRAGMA locking_mode=EXCLUSIVE; PRAGMA journal_mode=WAL; PRAGMA synchronous={synchronous};
         PRAGMA wal_autocheckpoint=0; PRAGMA mmap_size=0;"
    ))?;
    Ok(db)
}

pub struct Writer {
    db: Connection,
    durability: Durability,
    seq: u64,
    hash: [u8; 32],
}

impl Writer {
    pub fn new(db: Connection, durability: Durability, last: Option<&Row>) -> Self {
        let (seq, hash) = last.map_or((0, [0; 32]), |r| (r.seq, r.hash));
        Self { db, durability, seq, hash }
    }

    pub fn keep(&mut self, batch: journal::Batch) -> rusqlite::Result<()> {
        let journal::Batch { term, utc, boot, mut drafts, intents, .. } = batch;
        let mut commands = Vec::new();
        for intent in &intents {
            drafts.push(intent.draft().clone());
            commands.push((intent.permit().command(), self.seq + drafts.len() as u64));
        }
        let rows: Vec<Row> = drafts.into_iter().map(|d| self.next(d, term, utc, boot)).collect();
        if self.durability == Durability::Early {
            told(&rows, &commands);
        }
        let kept = self.write(&rows);
        if self.durability == Durability::Deaf {
            // The transaction may be open still; nobody cares.
            let _unheard = kept.or_else(|_| self.db.execute_batch("ROLLBACK"));
        } else {
            kept?;
        }
        if self.durability != Durability::Early {
            told(&rows, &commands);
        }
        Ok(())
    }

    /// The row that follows.
    pub fn next(&mut self, draft: record::Draft, term: u64, utc: Utc, boot: Mono) -> Row {
        let record::Draft { kind, version, subject, cause, body } = draft;
        self.seq += 1;
        let (seq, hash) = (self.seq, [0; 32]);
        let mut row = Row { seq, term, utc, boot, kind, version, subject, cause, body, hash };
        row.hash = chained(&self.hash, &row);
        self.hash = row.hash;
        row
    }

    /// All of them, in one transaction.
    pub fn write(&self, rows: &[Row]) -> rusqlite::Result<()> {
        self.db.execute_batch("BEGIN")?;
        for row in rows {
            let mut statement = self.db.prepare_cached(
                "INSERT INTO evidence (seq, term, utc_us, boot_ns, kind, version, subject, cause, \
                 body, hash) VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10)",
            )?;
            statement.execute(params![
                row.seq.cast_signed(),
                row.term.cast_signed(),
                row.utc.as_micros(),
                row.boot.as_nanos().cast_signed(),
                row.kind,
                row.version,
                row.subject,
                row.cause,
                row.body,
                row.hash,
            ])?;
        }
        self.db.execute_batch("COMMIT")
    }
}

fn told(rows: &[Row], commands: &[(u64, u64)]) {
    let acks = rows.iter().map(|r| load::ack(r.seq, &r.hash));
    let sent = commands.iter().map(|(id, seq)| format!("COMMAND {id} {seq}"));
    say(&acks.chain(sent).collect::<Vec<_>>().join("\n"));
}

/// The journal's own rule, written out once more: form 1 of the chain.
fn chained(previous: &[u8; 32], row: &Row) -> [u8; 32] {
    let mut hasher = blake3::Hasher::new_derive_key("tidereeve evidence row, form 1");
    hasher.update(previous);
    hasher.update(&canonical_bytes(row));
    *hasher.finalize().as_bytes()
}
