//! Making the view anew: beside its place, from the record's first row to its last, then put there
//! as a whole. Whoever reads the old one meanwhile goes on reading it.

use std::fs::File;
use std::ops::ControlFlow;
use std::path::{Path, PathBuf};

use record::Row;

use super::file::{self, ViewHead};
use super::{View, ViewError};
use crate::file::Evidence;
use crate::{Filter, durable, each_row};

/// Rows of a transaction.
pub(crate) const PORTION: usize = 4096;
/// Ends the name of what is not finished.
const PART: &str = ".part";

/// A view that is being made.
pub(crate) struct Rebuild {
    view: Option<View>,
    part: PathBuf,
    place: PathBuf,
}

impl Rebuild {
    pub(crate) fn begin(dir: &Path) -> Result<Self, ViewError> {
        let place = file::path(dir);
        let part = file::beside(&place, PART);
        file::room(&place)?;
        Ok(Self { view: Some(View::begin(&part)?), part, place })
    }

    pub(crate) fn take(&mut self, rows: &[Row]) -> Result<(), ViewError> {
        self.view.as_mut().map_or(Ok(()), |view| view.take(rows))
    }

    pub(crate) fn head(&self) -> ViewHead {
        self.view.as_ref().map(|v| v.head().clone()).unwrap_or_default()
    }

    /// Puts it in its place.
    pub(crate) fn finish(mut self) -> Result<(), ViewError> {
        if let Some(view) = self.view.take() {
            view.finish()?;
        }
        let io = |e| ViewError::io(&self.place, "putting the new one in its place", e);
        File::open(&self.part).and_then(|f| f.sync_all()).map_err(io)?;
        file::remove(&self.place)?;
        durable::rename(&self.part, &self.place).map_err(io)
    }
}

impl Drop for Rebuild {
    /// Nothing half-made stays.
    fn drop(&mut self) {
        drop(self.view.take());
        let _not_there = file::remove(&self.part);
    }
}

/// Makes the view anew while no daemon runs. `progress` is told (rows done, rows in all).
pub fn rebuild_view(dir: &Path, progress: &mut dyn FnMut(u64, u64)) -> Result<ViewHead, ViewError> {
    match View::open(dir) {
        Err(e) if e.stands() => return Err(e),
        _ => {}
    }
    let total = last_seq(dir)?;
    let mut rebuild = Rebuild::begin(dir)?;
    let (mut rows, mut failed) = (Vec::with_capacity(PORTION), None);
    each_row(dir, &Filter::default(), &mut |row| {
        rows.push(row);
        if rows.len() < PORTION {
            return ControlFlow::Continue(());
        }
        failed = rebuild.take(&rows).err();
        rows.clear();
        progress(rebuild.head().seq, total);
        if failed.is_some() { ControlFlow::Break(()) } else { ControlFlow::Continue(()) }
    })
    .map_err(ViewError::Evidence)?;
    failed.map_or(Ok(()), Err)?;
    rebuild.take(&rows)?;
    let head = rebuild.head();
    rebuild.finish()?;
    progress(head.seq, total);
    Ok(head)
}

/// The number of the record's last row, while no daemon runs.
pub(crate) fn last_seq(dir: &Path) -> Result<u64, ViewError> {
    let evidence = Evidence::open_to_read(dir).map_err(ViewError::Evidence)?;
    let last = evidence
        .db
        .query_row("SELECT coalesce(max(seq), 0) FROM evidence", [], |r| r.get::<_, i64>(0))
        .and_then(|live| Ok(live.cast_unsigned().max(evidence.packed_to()?)));
    last.map_err(|e| ViewError::Evidence(evidence.sql("looking for its last row", e)))
}
