//! The fold's state as bytes, so that a start need not begin at row 1.

use core::mem::take;

use engine::Carried;
use model::Site;

use crate::names::Gathered;
use crate::reader::Reader;
use crate::writer::Writer;
use crate::{Fold, RecordError, carried, kind};

/// Names the form of the bytes **and** the rules of the fold: when either changes it goes up, and
/// the snapshots before it are refused, so that the rows are folded anew.
const FORM: u8 = 1;

impl Fold {
    /// All that the rows so far add up to: what [`Fold::restore`] makes of it goes on with the next
    /// row as this would. Names are written out. About nine bytes for each bucket of 5 minutes in
    /// which water left within the last 63 days, and a few hundred for the rest.
    pub fn snapshot(&self) -> Vec<u8> {
        let mut w = Writer::new(&self.names);
        w.u8(FORM);
        // In the order of their indices, which is the order in which things are handed over.
        w.list(self.names.assets(), |w, name| w.text(name));
        // What the fold keeps in maps goes where it would be handed over.
        let state = Carried {
            latches: self.latches.iter().map(|(a, cause)| (*a, cause.clone())).collect(),
            locks: self.locks.iter().map(|(a, who)| (*a, who.clone())).collect(),
            holds: self.holds.iter().map(|(a, until)| (*a, *until)).collect(),
            open_intents: self.open.values().flatten().copied().collect(),
            ..self.carried.clone()
        };
        carried::put(&mut w, &state);
        w.option(self.hold_all, Writer::utc);
        let given_back: Vec<_> = self.given_back.iter().copied().collect();
        w.list(&given_back, |w, asset| w.asset(*asset));
        w.option(self.unreadable.as_ref(), |w, (seq, why)| {
            w.u64(*seq);
            w.text(why);
        });
        w.list(&self.jumps, |w, (before, after)| {
            w.utc(*before);
            w.utc(*after);
        });
        w.bytes
    }

    /// The fold that gave these bytes, for the site file as it is now. Any bytes may come: whatever
    /// is no snapshot of this form is refused, and the rows have to be folded from the first.
    pub fn restore(site: &Site, bytes: &[u8]) -> Result<Self, RecordError> {
        let mut names = Gathered::default();
        let mut r = Reader::new(bytes, &mut names);
        let form = r.u8("form")?;
        if form != FORM {
            return Err(RecordError::Unknown { kind: kind::SNAPSHOT, version: form });
        }
        r.list("names", |r| r.asset())?;
        let mut fold = Self::new(site);
        let mut state = carried::take(&mut r)?;
        fold.latches = take(&mut state.latches).into_iter().collect();
        fold.locks = take(&mut state.locks).into_iter().collect();
        fold.holds = take(&mut state.holds).into_iter().collect();
        for intent in take(&mut state.open_intents) {
            fold.open.entry(intent.asset).or_default().push(intent);
        }
        fold.carried = state;
        fold.hold_all = r.option("hold on all", |r| r.utc("hold on all"))?;
        fold.given_back = r.list("given back", |r| r.asset())?.into_iter().collect();
        fold.unreadable = r.option("strange row", |r| Ok((r.u64("row")?, r.text("why")?)))?;
        fold.jumps = r.list("jumps", |r| Ok((r.utc("before")?, r.utc("after")?)))?;
        r.end()?;
        fold.names = names;
        Ok(fold)
    }
}
