//! The whole record verified: every row, every segment that the rows vouch for, every anchor.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use record::{Note, Row, kind};

use crate::anchor::{Anchor, is_signed};
use crate::chain::{self, Head, Walk};
use crate::file::Evidence;
use crate::seal::SEGMENTS;
use crate::{JournalError, forms, segment};

/// What a whole verification found.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Verified {
    pub rows: u64,
    /// The hash of the last row. Two copies of one record have the same; a copy that ends earlier
    /// verifies too, so compare this, or an anchor, with one that was kept elsewhere.
    pub head_hex: String,
    /// Segments whose digest is the one that their row has.
    pub segments: u64,
    /// Segments that retention has deleted, with a row that says so.
    pub segments_deleted: u64,
    pub anchors: u64,
    /// Of these, with a good signature.
    pub anchors_signed: u64,
}

/// What is known from elsewhere.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Checks {
    /// Anchors that were kept: the record must still pass through each.
    pub anchors: Vec<Anchor>,
    /// Every signature must be by this key (Ed25519).
    pub key: Option<[u8; 32]>,
}

/// Verifies the chain from the first row to the last, and the segments. `progress` is told (rows
/// done, rows in all) every few thousand rows and at the end. Memory stays bounded.
///
/// # Errors
/// [`JournalError::FirstBad`] names the first row that is wrong, [`JournalError::Segment`] a segment
/// that is missing or another, [`JournalError::Anchor`] an anchor that does not hold.
pub fn verify(dir: &Path, progress: &mut dyn FnMut(u64, u64)) -> Result<Verified, JournalError> {
    verify_with(dir, &Checks::default(), progress)
}

/// The same, with what is known from elsewhere.
pub fn verify_with(
    dir: &Path,
    checks: &Checks,
    progress: &mut dyn FnMut(u64, u64),
) -> Result<Verified, JournalError> {
    let evidence = Evidence::open_to_read(dir)?;
    // A damaged file may not even count; the walk then says which row is the first.
    let last = "SELECT coalesce(max(seq), 0) FROM evidence";
    let total: i64 = evidence.db.query_row(last, [], |r| r.get(0)).unwrap_or(0);
    let mut seen = Seen::new(checks);
    let mut walk = Walk::WHOLE;
    loop {
        let more = walk.portion(&evidence, PORTION, &mut |row| seen.row(&row))?;
        seen.fault()?;
        progress(walk.head().seq, total.cast_unsigned().max(walk.head().seq));
        if !more {
            break;
        }
    }
    seen.end(walk.head())?;
    seen.segments(dir, &evidence)?;
    Ok(seen.found)
}

const PORTION: usize = 4096;
/// Kinds of rows that say something of what is outside them.
const TELLING: [u16; 5] =
    [kind::SEALED, kind::SEGMENT_DELETED, kind::ANCHORED, kind::LEGAL_HOLD, kind::HOLD_LIFTED];

/// What the rows say of things outside them.
struct Seen {
    found: Verified,
    key: Option<[u8; 32]>,
    kept: BTreeMap<u64, [u8; 32]>,
    previous: Head,
    /// Segments that must be there.
    standing: BTreeMap<String, [u8; 32]>,
    /// Days that a legal hold keeps, the last one too.
    held: Vec<(i32, i32)>,
    fault: Option<JournalError>,
}

impl Seen {
    fn new(checks: &Checks) -> Self {
        let found = Verified {
            rows: 0,
            head_hex: Head::NONE.hex(),
            segments: 0,
            segments_deleted: 0,
            anchors: 0,
            anchors_signed: 0,
        };
        let kept = checks.anchors.iter().map(|a| (a.seq, a.hash)).collect();
        let (previous, standing, held) = (Head::NONE, BTreeMap::new(), Vec::new());
        Self { found, key: checks.key, kept, previous, standing, held, fault: None }
    }

    fn row(&mut self, row: &Row) {
        if self.fault.is_none() {
            self.fault = self.judge(row).err();
        }
        self.previous = Head::after(row);
    }

    fn judge(&mut self, row: &Row) -> Result<(), JournalError> {
        if self.kept.remove(&row.seq).is_some_and(|hash| hash != row.hash) {
            let why = "the record has another row there than when it was kept".to_owned();
            return Err(JournalError::Anchor { seq: row.seq, why });
        }
        if !TELLING.contains(&row.kind) {
            return Ok(());
        }
        let bad = |why: String| JournalError::FirstBad { seq: row.seq, why };
        match record::decode_note(row).map_err(|e| bad(e.to_string()))? {
            Note::Sealed { file, digest, .. } => {
                self.standing.insert(file, digest);
            }
            Note::SegmentDeleted { day, file, .. } => {
                if self.held.iter().any(|(from, to)| (*from..=*to).contains(&day)) {
                    return Err(bad("a legal hold kept what it says was deleted".to_owned()));
                }
                self.standing.remove(&file);
                self.found.segments_deleted += 1;
            }
            Note::LegalHold { from_day, to_day, .. } => self.held.push((from_day, to_day)),
            Note::HoldLifted { from_day, to_day, .. } => {
                let lifted = self.held.iter().position(|days| *days == (from_day, to_day));
                lifted.map(|no| self.held.remove(no));
            }
            Note::Anchored { of_seq, hash, signature } => {
                if (of_seq, hash) != (self.previous.seq, self.previous.hash) {
                    return Err(bad("it anchors another row than the one before it".to_owned()));
                }
                self.found.anchors += 1;
                if let Some(signature) = signature {
                    if !is_signed(&signature, of_seq, &hash) {
                        return Err(bad("its signature is not good".to_owned()));
                    }
                    if self.key.is_some_and(|key| key != signature.key) {
                        return Err(bad("it is signed with another key".to_owned()));
                    }
                    self.found.anchors_signed += 1;
                }
            }
            _ => {}
        }
        Ok(())
    }

    fn fault(&mut self) -> Result<(), JournalError> {
        self.fault.take().map_or(Ok(()), Err)
    }

    /// The tables that retention goes by are what the rows say.
    fn tables(&self, evidence: &Evidence) -> Result<(), JournalError> {
        if evidence.form < forms::WITH_PACKS {
            return Ok(());
        }
        let sql = |e| evidence.sql("reading its own tables", e);
        let text = "SELECT file, digest FROM segments WHERE deleted_seq IS NULL";
        let mut statement = evidence.db.prepare(text).map_err(sql)?;
        let rows = statement.query_map([], |r| Ok((r.get(0)?, chain::array(r, 1)?)));
        let listed: BTreeMap<String, [u8; 32]> = rows.and_then(Iterator::collect).map_err(sql)?;
        let text = "SELECT from_day, to_day FROM holds WHERE lifted_seq IS NULL ORDER BY seq";
        let mut statement = evidence.db.prepare(text).map_err(sql)?;
        let rows = statement.query_map([], |r| Ok((r.get(0)?, r.get(1)?)));
        let holds: Vec<(i32, i32)> = rows.and_then(Iterator::collect).map_err(sql)?;
        if listed != self.standing || holds != self.held {
            let why = "its list of segments or holds is not what the rows say".to_owned();
            return Err(JournalError::FirstBad { seq: self.found.rows + 1, why });
        }
        Ok(())
    }

    fn end(&mut self, head: Head) -> Result<(), JournalError> {
        (self.found.rows, self.found.head_hex) = (head.seq, head.hex());
        match self.kept.keys().next() {
            None => Ok(()),
            Some(&seq) => {
                let why = format!("the record ends at row {}: its end was cut off", head.seq);
                Err(JournalError::Anchor { seq, why })
            }
        }
    }

    fn segments(&mut self, dir: &Path, evidence: &Evidence) -> Result<(), JournalError> {
        self.tables(evidence)?;
        for (file, digest) in &self.standing {
            let path = dir.join(SEGMENTS).join(file);
            let wrong = |why: String| JournalError::Segment { path: path.clone(), why };
            let bytes = fs::read(&path).map_err(|e| wrong(e.to_string()))?;
            if blake3::hash(&bytes).as_bytes() != digest {
                return Err(wrong("it is not what was sealed".to_owned()));
            }
            segment::Segment::new(&bytes).ok_or_else(|| wrong("it does not read".to_owned()))?;
            self.found.segments += 1;
        }
        Ok(())
    }
}
