//! What a day came to, counted from its rows.

use crate::names::Gathered;
use crate::{Row, Summary, decode, kind};
use engine::{Entry, Outcome};

impl Summary {
    /// Of that day, with nothing in it yet.
    pub fn of(day: i32) -> Self {
        Self { day, ..Self::default() }
    }

    /// Counts a row. The caller sees to it that it is of the day; one that does not read counts as a
    /// row and as nothing else.
    pub fn push(&mut self, row: &Row) {
        self.rows += 1;
        let counted = [
            kind::ACT,
            kind::INTENT,
            kind::OUTCOME,
            kind::REST,
            kind::DISCREPANCY,
            kind::LATCHED,
            kind::RELEASED,
            kind::WINDOW_MISSED,
        ];
        if !counted.contains(&row.kind) {
            return;
        }
        let mut names = Gathered::default();
        let Ok(entry) = decode::read(row.kind, row.version, &row.body, &mut names) else { return };
        match entry {
            Entry::Act { refused, .. } => {
                self.acts += 1;
                self.refusals += u32::from(refused.is_some());
            }
            Entry::Intent { action, .. } => self.openings += u32::from(action.is_active()),
            Entry::Outcome { outcome: Outcome::Refused(_), .. } => self.refusals += 1,
            Entry::Rest { .. } => self.rests += 1,
            Entry::Discrepancy { .. } => self.discrepancies += 1,
            Entry::Latched { .. } => self.trips += 1,
            Entry::Released { volume, .. } => self.released_m3 += volume.get(),
            Entry::WindowMissed { .. } => self.windows_missed += 1,
            _ => {}
        }
    }
}
