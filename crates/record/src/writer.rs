//! Putting fields into a body: little-endian, fixed order, names as text.
//!
//! Rows have fields of fixed length. Snapshots and events, which are many or long, have `small`
//! numbers (seven bits a byte, lowest first, the top bit says that more follow) and `step`s from the
//! number before.

use interlock::Action;
use model::{AdapterId, AssetId, ClauseId, RestAction, SignalId};
use units::{Mono, Percent, Utc, Window};

use engine::{ClockTrust, Mode};

use crate::names::Named;

/// Writes one body. Names are written out, so that it reads without the site file.
pub(crate) struct Writer<'a> {
    pub(crate) bytes: Vec<u8>,
    names: &'a dyn Named,
}

impl<'a> Writer<'a> {
    pub(crate) fn new(names: &'a dyn Named) -> Self {
        Self { bytes: Vec::new(), names }
    }
    pub(crate) fn u8(&mut self, v: u8) {
        self.bytes.push(v);
    }
    pub(crate) fn u32(&mut self, v: u32) {
        self.bytes.extend(v.to_le_bytes());
    }
    pub(crate) fn i32(&mut self, v: i32) {
        self.bytes.extend(v.to_le_bytes());
    }
    pub(crate) fn small(&mut self, mut n: u64) {
        while n >= 0x80 {
            self.u8(0x80 | (n & 0x7f) as u8);
            n >>= 7;
        }
        self.u8(n as u8);
    }
    /// How far it is from one number to another, small ones either way in one byte. It wraps, so
    /// that any two numbers have a step.
    pub(crate) fn step(&mut self, from: i64, to: i64) {
        let step = to.wrapping_sub(from);
        self.small(((step << 1) ^ (step >> 63)).cast_unsigned());
    }
    pub(crate) fn u64(&mut self, v: u64) {
        self.bytes.extend(v.to_le_bytes());
    }
    pub(crate) fn i64(&mut self, v: i64) {
        self.bytes.extend(v.to_le_bytes());
    }
    /// The bits, so that every value comes back as it was.
    pub(crate) fn f64(&mut self, v: f64) {
        self.u64(v.to_bits());
    }
    pub(crate) fn flag(&mut self, v: bool) {
        self.u8(u8::from(v));
    }
    /// A length or a count.
    pub(crate) fn count(&mut self, n: usize) {
        let n = u32::try_from(n).expect("no list or text has four thousand million items");
        self.bytes.extend(n.to_le_bytes());
    }
    pub(crate) fn blob(&mut self, v: &[u8]) {
        self.count(v.len());
        self.bytes.extend(v);
    }
    pub(crate) fn text(&mut self, v: &str) {
        self.blob(v.as_bytes());
    }
    pub(crate) fn option<T>(&mut self, v: Option<T>, put: impl FnOnce(&mut Self, T)) {
        self.flag(v.is_some());
        if let Some(v) = v {
            put(self, v);
        }
    }
    pub(crate) fn list<T>(&mut self, items: &[T], mut put: impl FnMut(&mut Self, &T)) {
        self.count(items.len());
        for item in items {
            put(self, item);
        }
    }
    pub(crate) fn utc(&mut self, t: Utc) {
        self.i64(t.as_micros());
    }
    pub(crate) fn mono(&mut self, t: Mono) {
        self.u64(t.as_nanos());
    }
    pub(crate) fn window(&mut self, w: &Window) {
        self.utc(w.start());
        self.utc(w.end());
    }
    pub(crate) fn percent(&mut self, p: Percent) {
        self.f64(p.get());
    }
    pub(crate) fn asset(&mut self, id: AssetId) {
        let names = self.names;
        self.text(names.asset_name(id));
    }
    pub(crate) fn signal(&mut self, id: SignalId) {
        let names = self.names;
        self.text(names.signal_name(id));
    }
    pub(crate) fn adapter(&mut self, id: AdapterId) {
        let names = self.names;
        self.text(names.adapter_name(id));
    }
    pub(crate) fn clause(&mut self, id: ClauseId) {
        let names = self.names;
        self.text(names.clause_number(id));
    }
    pub(crate) fn action(&mut self, action: Action) {
        match action {
            Action::Open(p) => {
                self.u8(1);
                self.percent(p);
            }
            Action::Shut => self.u8(2),
            Action::Run => self.u8(3),
            Action::Stop => self.u8(4),
        }
    }
    pub(crate) fn rest_action(&mut self, action: RestAction) {
        self.u8(match action {
            RestAction::Close => 1,
            RestAction::Open => 2,
            RestAction::Stop => 3,
            RestAction::Hold => 4,
            RestAction::HandToLocal => 5,
        });
    }
    pub(crate) fn mode(&mut self, mode: Mode) {
        self.u8(match mode {
            Mode::Observe => 1,
            Mode::Advise => 2,
            Mode::Automatic => 3,
        });
    }
    pub(crate) fn trust(&mut self, trust: ClockTrust) {
        self.u8(match trust {
            ClockTrust::Trusted => 1,
            ClockTrust::Distrusted => 2,
        });
    }
}
