//! A batch taken apart: rows in their order, permits elsewhere.

use record::{Draft, Intent, Row};
use units::{Mono, Utc};

use crate::chain::GENESIS;
use crate::{Batch, Seen, Stamp};

/// A batch with every row in its place; the permits are elsewhere.
#[derive(Clone, Debug)]
pub(crate) struct Planned {
    term: u64,
    utc: Utc,
    boot: Mono,
    pub(crate) drafts: Vec<Draft>,
    /// For each intent the place of its row, and the row to be written if it never left.
    intents: Vec<(usize, Draft)>,
    pub(crate) seen: Seen,
    /// Who waits for it.
    pub(crate) whose: Whose,
}

/// Whose rows these are, and so whom they are answered to.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Whose {
    /// A batch that was handed over.
    Batch,
    /// What follows from the batch before, and is answered with it.
    Before,
    /// A task's of ours: done again when it is due, so that nobody waits.
    Task,
}

impl Planned {
    /// Rows in order, and each intent with the place of its row.
    pub(crate) fn of(batch: Batch) -> (Self, Vec<(usize, Intent)>) {
        let Batch { term, utc, boot, mut drafts, intents, seen } = batch;
        let mut placed: Vec<(usize, Intent)> = Vec::with_capacity(intents.len());
        for intent in intents {
            let free = |no: &usize| placed.iter().all(|(taken, _)| taken != no);
            let among = (0..drafts.len()).filter(free).find(|no| drafts[*no] == *intent.draft());
            let place = among.unwrap_or_else(|| {
                drafts.push(intent.draft().clone());
                drafts.len() - 1
            });
            placed.push((place, intent));
        }
        let intents = placed.iter().map(|(no, i)| (*no, i.never_left().clone())).collect();
        (Self { term, utc, boot, drafts, intents, seen, whose: Whose::Batch }, placed)
    }

    /// Rows of our own.
    pub(crate) fn task(stamp: &Stamp, drafts: Vec<Draft>) -> Self {
        let &Stamp { term, utc, boot } = stamp;
        let (intents, seen, whose) = (Vec::new(), Seen::default(), Whose::Task);
        Self { term, utc, boot, drafts, intents, seen, whose }
    }

    /// What it takes of the room in memory: its rows, or one for what was seen.
    pub(crate) fn weight(&self) -> usize {
        self.drafts.len().max(1)
    }

    pub(crate) fn utc(&self) -> Utc {
        self.utc
    }

    pub(crate) fn row(&self, draft: &Draft) -> Row {
        let Draft { kind, version, subject, cause, body } = draft.clone();
        let (term, utc, boot) = (self.term, self.utc, self.boot);
        Row { seq: 0, term, utc, boot, kind, version, subject, cause, body, hash: GENESIS }
    }

    /// The permits are gone and no such row is on disk: there was no intent.
    pub(crate) fn without_intents(&mut self) {
        let mut places: Vec<usize> = self.intents.drain(..).map(|(no, _)| no).collect();
        places.sort_unstable();
        for no in places.into_iter().rev() {
            self.drafts.remove(no);
        }
    }

    /// The permits are gone but the rows are on disk: what is to be written after them.
    pub(crate) fn never_left(self) -> Option<Self> {
        let drafts: Vec<Draft> = self.intents.into_iter().map(|(_, draft)| draft).collect();
        if drafts.is_empty() {
            return None;
        }
        let (seen, whose) = (Seen::default(), Whose::Before);
        Some(Self { drafts, intents: Vec::new(), seen, whose, ..self })
    }
}
