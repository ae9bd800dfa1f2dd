//! The files held to what was heard: opened as the daemon would, walked, and written to once more.

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;
use std::sync::mpsc::channel;

use engine::{Entry, Outcome};
use journal::{FILE_NAME, Journal, JournalError, Opening, Reply, verify};
use record::{Note, Row, decode, kind};
use rusqlite::Connection;

use crate::heard::Heard;
use crate::{load, site};

/// What is good, in a line; the error says what is not.
pub fn check(dir: &Path, acked: u64, heard: &Heard) -> Result<String, String> {
    let acked = acked.max(heard.acked.keys().next_back().copied().unwrap_or(0));
    untouched(dir, acked)?;
    let found = opened(dir, heard)?;
    if found.rows < acked {
        return Err(format!("LOST-ROWS {} rows, {acked} were acknowledged", found.rows));
    }
    found.held_to(heard)?;
    seen(dir, heard)?;
    if let Some(file) = &found.backup {
        backup(dir, file)?;
    }
    let integrity = integrity(dir)?;
    if integrity != "ok" {
        return Err(format!("INTEGRITY {integrity}"));
    }
    let verified = verify(dir, &mut |_, _| {}).map_err(|e| format!("VERIFY {}", said(&e)))?;
    if verified.rows != found.rows + 1 {
        return Err(format!("VERIFY {} rows after one was added", verified.rows));
    }
    Ok(format!("{} rows, {acked} acknowledged", found.rows))
}

/// With not a block left: it opens, and everything is there. Nothing can be added.
pub fn opens_full(dir: &Path, acked: u64, heard: &Heard) -> Result<String, String> {
    let acked = acked.max(heard.acked.keys().next_back().copied().unwrap_or(0));
    untouched(dir, acked)?;
    let (found, journal) = walked(dir, heard)?;
    drop(journal);
    found.held_to(heard)?;
    seen(dir, heard)?;
    Ok(format!("{} rows, {acked} acknowledged", found.rows))
}

fn said(e: &JournalError) -> String {
    load::in_words(e)
}

/// A verification before anything is put right by an opening. A file that is not there or has no
/// tables yet is as good as an empty one, as long as nothing was acknowledged.
fn untouched(dir: &Path, acked: u64) -> Result<(), String> {
    match verify(dir, &mut |_, _| {}) {
        Ok(v) if v.rows >= acked => Ok(()),
        Ok(v) => Err(format!("LOST-ROWS {} rows, {acked} were acknowledged", v.rows)),
        Err(JournalError::Missing { .. } | JournalError::NotAJournal { .. }) if acked == 0 => {
            Ok(())
        }
        Err(e) => Err(format!("VERIFY {}", said(&e))),
    }
}

#[derive(Default)]
struct Found {
    rows: u64,
    hashes: BTreeMap<u64, String>,
    intents: BTreeMap<u64, u64>,
    never_left: BTreeSet<u64>,
    outcomes: BTreeSet<u64>,
    /// The last that a row vouches for: (file, rows, hash of the last).
    backup: Option<(String, u64, [u8; 32])>,
}

/// Opens it as the daemon does.
fn walked(dir: &Path, heard: &Heard) -> Result<(Found, Journal), String> {
    let mut found = Found::default();
    let site = site::sallow();
    let mut unread = None;
    let visit = &mut |row: Row| {
        if let Err(why) = found.take(&row, &site, heard) {
            unread.get_or_insert(why);
        }
    };
    let journal = Journal::open(dir, visit).map_err(|e| format!("OPEN {}", said(&e)))?;
    if let Some(why) = unread {
        return Err(format!("ROW {why}"));
    }
    found.rows = journal.rows();
    Ok((found, journal))
}

/// Opens it as a start does that need not walk the whole chain.
fn from_later(dir: &Path) -> Result<Journal, String> {
    let opening = Opening::begin(dir).map_err(|e| format!("LATER {}", said(&e)))?;
    let later = opening.last_of_kind(kind::STOPPING).map_err(|e| format!("LATER {}", said(&e)))?;
    let from = later.map_or(0, |row| row.seq);
    opening.walk(from, &mut |_| {}).map_err(|e| format!("LATER {}", said(&e)))
}

/// Opens it both ways, adds a row, and closes it.
fn opened(dir: &Path, heard: &Heard) -> Result<Found, String> {
    let (found, journal) = walked(dir, heard)?;
    let head = journal.head_hex();
    drop(journal);
    let journal = from_later(dir)?;
    if (journal.rows(), journal.head_hex()) != (found.rows, head) {
        return Err(format!("LATER a start from a later row ends at row {}", journal.rows()));
    }
    let term = journal.next_term();
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    let batch = load::one_row(term);
    handle.submit(batch).map_err(|e| format!("APPEND {}", said(&e)))?;
    match replies.recv() {
        Ok(Reply::Acked(a)) if a.rows.first().is_some_and(|r| r.seq == found.rows + 1) => {}
        other => return Err(format!("APPEND {other:?}")),
    }
    handle.close().map_err(|e| format!("CLOSE {}", said(&e)))?;
    Ok(found)
}

impl Found {
    fn take(&mut self, row: &Row, site: &model::Site, heard: &Heard) -> Result<(), String> {
        if heard.acked.contains_key(&row.seq) {
            let line = load::ack(row.seq, &row.hash);
            let hash = line.rsplit(' ').next().unwrap_or_default().to_owned();
            self.hashes.insert(row.seq, hash);
        }
        if row.kind == kind::BACKED_UP
            && let Ok(Note::BackedUp { file, of_seq, hash, .. }) = record::decode_note(row)
        {
            self.backup = Some((file, of_seq, hash));
        }
        if ![kind::INTENT, kind::OUTCOME].contains(&row.kind) {
            return Ok(());
        }
        match decode(row, site).map_err(|e| format!("{}: {e}", row.seq))? {
            Entry::Intent { command, .. } => {
                self.intents.insert(command, row.seq);
            }
            Entry::Outcome { command, outcome, .. } => {
                self.outcomes.insert(command);
                if matches!(outcome, Outcome::Refused(_)) {
                    self.never_left.insert(command);
                }
            }
            _ => {}
        }
        Ok(())
    }

    fn held_to(&self, heard: &Heard) -> Result<(), String> {
        for (seq, hash) in &heard.acked {
            if self.hashes.get(seq) != Some(hash) {
                let found = self.hashes.get(seq);
                return Err(format!(
                    "OTHER-ROW {seq}: {hash} was acknowledged, {found:?} is there"
                ));
            }
        }
        for (command, seq) in &heard.commands {
            if self.intents.get(command) != Some(seq) {
                return Err(format!("PHANTOM command {command} has no intent in row {seq}"));
            }
            if self.never_left.contains(command) {
                return Err(format!("PHANTOM command {command} left, and a row denies it"));
            }
        }
        let ended = |c: &&u64| heard.done.contains(&load::term_of(**c));
        let open = |c: &&u64| !heard.commands.contains_key(c) && !self.outcomes.contains(c);
        if let Some(command) = self.intents.keys().filter(ended).find(open) {
            return Err(format!("OPEN-INTENT {command} never left, and no row says so"));
        }
        Ok(())
    }
}

/// Every event that was acknowledged is there, and none twice.
fn seen(dir: &Path, heard: &Heard) -> Result<(), String> {
    let mut left = heard.seen.clone();
    let mut all = BTreeSet::new();
    let mut twice = None;
    let visit = &mut |event: &[u8]| {
        let hash = load::short_hash(event);
        left.remove(&hash);
        if !all.insert(hash) {
            twice = Some(String::from_utf8_lossy(event).into_owned());
        }
    };
    journal::events(dir, visit).map_err(|e| format!("EVENTS {}", said(&e)))?;
    if let Some(event) = twice {
        return Err(format!("TWICE {event}"));
    }
    if !left.is_empty() && !heard.may_go {
        return Err(format!("LOST-EVENTS {} of {}", left.len(), heard.seen.len()));
    }
    Ok(())
}

/// The backup is there, restores, and is the record up to its row.
fn backup(dir: &Path, (file, of_seq, hash): &(String, u64, [u8; 32])) -> Result<(), String> {
    let to = dir.with_file_name("restored");
    let _not_there = std::fs::remove_dir_all(&to);
    let from = dir.with_file_name("backups").join(file);
    let rows = journal::restore(&from, &to).map_err(|e| format!("RESTORE {file}: {}", said(&e)))?;
    let verified = verify(&to, &mut |_, _| {}).map_err(|e| format!("RESTORED {}", said(&e)))?;
    let hash = blake3::Hash::from_bytes(*hash).to_hex().to_string();
    if rows != *of_seq || verified.head_hex != hash {
        return Err(format!("RESTORED {file} has {rows} rows, its row says {of_seq}"));
    }
    Ok(())
}

fn integrity(dir: &Path) -> Result<String, String> {
    let sql = |e: rusqlite::Error| format!("INTEGRITY {e}");
    let db = Connection::open(dir.join(FILE_NAME)).map_err(sql)?;
    db.query_row("PRAGMA integrity_check", [], |r| r.get(0)).map_err(sql)
}
