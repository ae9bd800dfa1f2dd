//! Looking at the evidence while no daemon runs. Nothing in it changes.

use std::ops::ControlFlow;
use std::path::Path;

use record::Row;
use rusqlite::params;
use units::Utc;

use crate::chain;
use crate::file::Evidence;
use crate::packs::Place;
use crate::seal::SEGMENTS;
use crate::segment::{Segment, take_minutes};
use crate::varint::Taker;
use crate::{JournalError, Minute, forms};

/// Which rows are wanted; the default is all.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Filter {
    /// The first sequence.
    pub from_seq: u64,
    /// From this instant on, and before that one.
    pub from: Option<Utc>,
    pub to: Option<Utc>,
    /// One of [`record::kind`].
    pub kind: Option<u16>,
    pub subject: Option<String>,
    /// At most so many.
    pub limit: Option<u64>,
}

impl Filter {
    fn fits(&self, row: &Row) -> bool {
        row.seq >= self.from_seq
            && self.from.is_none_or(|t| row.utc >= t)
            && self.to.is_none_or(|t| row.utc < t)
            && self.kind.is_none_or(|k| row.kind == k)
            && self.subject.as_ref().is_none_or(|s| row.subject == *s)
    }

    /// Whether a pack may hold a row that fits.
    fn touches(&self, place: &Place) -> bool {
        self.from.is_none_or(|t| place.last_utc_us >= t.as_micros())
            && self.to.is_none_or(|t| place.first_utc_us < t.as_micros())
    }
}

/// Gives each row that passes the filter to `visit`, in order of sequence, until it breaks off. It
/// does not verify the whole chain: [`verify`](crate::verify) does.
pub fn each_row(
    dir: &Path,
    filter: &Filter,
    visit: &mut dyn FnMut(Row) -> ControlFlow<()>,
) -> Result<(), JournalError> {
    let evidence = Evidence::open_to_read(dir)?;
    let mut left = filter.limit.unwrap_or(u64::MAX);
    let places = evidence.packs(filter.from_seq).map_err(|e| evidence.sql("reading rows", e))?;
    for place in places.iter().filter(|p| filter.touches(p)) {
        for row in evidence.unpack(place)?.into_iter().filter(|r| filter.fits(r)) {
            if left == 0 || visit(row).is_break() {
                return Ok(());
            }
            left -= 1;
        }
    }
    each_live_row(&evidence, filter, left, visit)
}

fn each_live_row(
    evidence: &Evidence,
    filter: &Filter,
    left: u64,
    visit: &mut dyn FnMut(Row) -> ControlFlow<()>,
) -> Result<(), JournalError> {
    let sql = |e| evidence.sql("reading rows", e);
    let text = format!(
        "SELECT {} FROM evidence WHERE seq >= ?1 AND (?2 IS NULL OR utc_us >= ?2) AND \
         (?3 IS NULL OR utc_us < ?3) AND (?4 IS NULL OR kind = ?4) AND \
         (?5 IS NULL OR subject = ?5) ORDER BY seq LIMIT ?6",
        chain::COLUMNS
    );
    let mut statement = evidence.db.prepare(&text).map_err(sql)?;
    let limit = i64::try_from(left).unwrap_or(i64::MAX);
    let micros = |t: Option<Utc>| t.map(Utc::as_micros);
    let from_seq = i64::try_from(filter.from_seq).unwrap_or(i64::MAX);
    let (from, to, subject) = (micros(filter.from), micros(filter.to), filter.subject.as_deref());
    let wanted = params![from_seq, from, to, filter.kind, subject, limit];
    let rows = statement.query_map(wanted, chain::row).map_err(sql)?;
    for row in rows {
        if visit(row.map_err(sql)?).is_break() {
            break;
        }
    }
    Ok(())
}

/// The rows that pass the filter, in order of sequence.
pub fn rows(dir: &Path, filter: &Filter) -> Result<Vec<Row>, JournalError> {
    let mut all = Vec::new();
    each_row(dir, filter, &mut |row| {
        all.push(row);
        ControlFlow::Continue(())
    })?;
    Ok(all)
}

/// Gives every event that the engine was told, in order, to `visit`: from the sealed segments that
/// are still there, then from what waits to be sealed.
pub fn events(dir: &Path, visit: &mut dyn FnMut(&[u8])) -> Result<(), JournalError> {
    each_segment(dir, &mut |segment| segment.events(visit))?;
    each_unsealed(dir, &mut |inputs| {
        let mut taker = Taker(inputs.events);
        while let Some(event) = taker.blob() {
            visit(event);
        }
        Some(())
    })
}

/// The minute readings, likewise.
pub fn minutes(dir: &Path, visit: &mut dyn FnMut(Minute)) -> Result<(), JournalError> {
    each_segment(dir, &mut |segment| {
        segment.minutes()?.into_iter().for_each(&mut *visit);
        Some(())
    })?;
    each_unsealed(dir, &mut |inputs| {
        take_minutes(inputs.minutes)?.into_iter().for_each(&mut *visit);
        Some(())
    })
}

fn each_segment(
    dir: &Path,
    visit: &mut dyn FnMut(&Segment<'_>) -> Option<()>,
) -> Result<(), JournalError> {
    let evidence = Evidence::open_to_read(dir)?;
    if evidence.form < forms::WITH_PACKS {
        return Ok(());
    }
    let sql = |e| evidence.sql("reading where the segments are", e);
    let text = "SELECT file FROM segments WHERE deleted_seq IS NULL ORDER BY sealed_seq";
    let mut statement = evidence.db.prepare(text).map_err(sql)?;
    let files: Vec<String> =
        statement.query_map([], |r| r.get(0)).and_then(Iterator::collect).map_err(sql)?;
    for file in files {
        let path = dir.join(SEGMENTS).join(file);
        let wrong = |why: String| JournalError::Segment { path: path.clone(), why };
        let bytes = std::fs::read(&path).map_err(|e| wrong(e.to_string()))?;
        let read = Segment::new(&bytes).and_then(|s| visit(&s));
        read.ok_or_else(|| wrong("it does not read".to_owned()))?;
    }
    Ok(())
}

/// One row of what waits to be sealed.
struct Inputs<'a> {
    events: &'a [u8],
    minutes: &'a [u8],
}

fn each_unsealed(
    dir: &Path,
    visit: &mut dyn FnMut(&Inputs<'_>) -> Option<()>,
) -> Result<(), JournalError> {
    let evidence = Evidence::open_to_read(dir)?;
    if evidence.form < forms::WITH_PACKS {
        return Ok(());
    }
    let sql = |e| evidence.sql("reading inputs", e);
    let text = "SELECT no, events, minutes FROM inputs ORDER BY no";
    let mut statement = evidence.db.prepare(text).map_err(sql)?;
    let mut rows = statement.query([]).map_err(sql)?;
    while let Some(row) = rows.next().map_err(sql)? {
        let blob = |c: usize| row.get_ref(c).and_then(|v| Ok(v.as_blob()?)).map_err(sql);
        if visit(&Inputs { events: blob(1)?, minutes: blob(2)? }).is_none() {
            let no: i64 = row.get(0).map_err(sql)?;
            return Err(JournalError::Inputs { no });
        }
    }
    Ok(())
}
