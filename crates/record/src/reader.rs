//! Taking fields out of a body. Any bytes may come: nothing here panics or reserves what is not there.

use interlock::Action;
use model::{AdapterId, AssetId, ClauseId, RestAction, SignalId};
use units::{CubicMetres, Mono, Percent, Utc, Window};

use engine::{ClockTrust, Mode};

use crate::RecordError;
use crate::names::Names;

pub(crate) struct Reader<'a> {
    rest: &'a [u8],
    names: &'a mut dyn Names,
}

type Read<T> = Result<T, RecordError>;

impl<'a> Reader<'a> {
    pub(crate) fn new(body: &'a [u8], names: &'a mut dyn Names) -> Self {
        Self { rest: body, names }
    }
    /// Refuses bytes after the last field.
    pub(crate) fn end(&self) -> Read<()> {
        match self.rest.len() {
            0 => Ok(()),
            bytes => Err(RecordError::Long { bytes }),
        }
    }
    pub(crate) fn bytes<const N: usize>(&mut self, field: &'static str) -> Read<[u8; N]> {
        let (head, rest) =
            self.rest.split_first_chunk::<N>().ok_or(RecordError::Short { field })?;
        self.rest = rest;
        Ok(*head)
    }
    pub(crate) fn u8(&mut self, field: &'static str) -> Read<u8> {
        Ok(self.bytes::<1>(field)?[0])
    }
    pub(crate) fn u32(&mut self, field: &'static str) -> Read<u32> {
        Ok(u32::from_le_bytes(self.bytes(field)?))
    }
    pub(crate) fn i32(&mut self, field: &'static str) -> Read<i32> {
        Ok(i32::from_le_bytes(self.bytes(field)?))
    }
    pub(crate) fn u64(&mut self, field: &'static str) -> Read<u64> {
        Ok(u64::from_le_bytes(self.bytes(field)?))
    }
    pub(crate) fn i64(&mut self, field: &'static str) -> Read<i64> {
        Ok(i64::from_le_bytes(self.bytes(field)?))
    }
    pub(crate) fn f64(&mut self, field: &'static str) -> Read<f64> {
        Ok(f64::from_bits(self.u64(field)?))
    }
    /// Refuses more than 64 bits.
    pub(crate) fn small(&mut self, field: &'static str) -> Read<u64> {
        let mut n = 0_u64;
        for shift in (0..64).step_by(7) {
            let byte = self.u8(field)?;
            let part = u64::from(byte & 0x7f);
            if (part << shift) >> shift != part {
                break;
            }
            n |= part << shift;
            if byte < 0x80 {
                return Ok(n);
            }
        }
        Err(RecordError::Bad { field, why: "a number of more than 64 bits".to_owned() })
    }
    pub(crate) fn step(&mut self, field: &'static str, from: i64) -> Read<i64> {
        let n = self.small(field)?;
        let step = (n >> 1).cast_signed() ^ -((n & 1).cast_signed());
        Ok(from.wrapping_add(step))
    }
    /// A count of items, each of at least this many bytes: a longer list is not in this body.
    pub(crate) fn small_count(&mut self, field: &'static str, bytes: u64) -> Read<u64> {
        let n = self.small(field)?;
        let most = self.rest.len() as u64 / bytes;
        if n > most { Err(RecordError::Short { field }) } else { Ok(n) }
    }
    pub(crate) fn flag(&mut self, field: &'static str) -> Read<bool> {
        match self.u8(field)? {
            0 => Ok(false),
            1 => Ok(true),
            n => Err(unknown(field, n)),
        }
    }
    fn count(&mut self, field: &'static str) -> Read<usize> {
        let n = u32::from_le_bytes(self.bytes(field)?) as usize;
        // Every item takes a byte at least, so a longer list is not in this body.
        if n > self.rest.len() { Err(RecordError::Short { field }) } else { Ok(n) }
    }
    /// Bytes after their length.
    pub(crate) fn blob(&mut self, field: &'static str) -> Read<&'a [u8]> {
        let n = self.count(field)?;
        let (head, rest) = self.rest.split_at(n);
        self.rest = rest;
        Ok(head)
    }
    fn borrowed(&mut self, field: &'static str) -> Read<&'a str> {
        core::str::from_utf8(self.blob(field)?)
            .map_err(|e| RecordError::Bad { field, why: format!("not UTF-8: {e}") })
    }
    pub(crate) fn text(&mut self, field: &'static str) -> Read<String> {
        self.borrowed(field).map(str::to_owned)
    }
    pub(crate) fn fixed_text(&mut self, field: &'static str) -> Read<&'static str> {
        crate::cause::fixed(field, self.borrowed(field)?)
    }
    pub(crate) fn option<T>(
        &mut self,
        field: &'static str,
        take: impl FnOnce(&mut Self) -> Read<T>,
    ) -> Read<Option<T>> {
        if self.flag(field)? { take(self).map(Some) } else { Ok(None) }
    }
    pub(crate) fn list<T>(
        &mut self,
        field: &'static str,
        mut take: impl FnMut(&mut Self) -> Read<T>,
    ) -> Read<Vec<T>> {
        let n = self.count(field)?;
        (0..n).map(|_| take(self)).collect()
    }
    pub(crate) fn utc(&mut self, field: &'static str) -> Read<Utc> {
        self.i64(field).map(Utc::from_micros)
    }
    pub(crate) fn mono(&mut self, field: &'static str) -> Read<Mono> {
        self.u64(field).map(Mono::from_nanos)
    }
    pub(crate) fn window(&mut self, field: &'static str) -> Read<Window> {
        let (start, end) = (self.utc(field)?, self.utc(field)?);
        Window::new(start, end).map_err(|e| RecordError::Bad { field, why: e.to_string() })
    }
    pub(crate) fn percent(&mut self, field: &'static str) -> Read<Percent> {
        Percent::new(self.f64(field)?).map_err(|e| RecordError::Bad { field, why: e.to_string() })
    }
    pub(crate) fn volume(&mut self, field: &'static str) -> Read<CubicMetres> {
        CubicMetres::new(self.f64(field)?)
            .map_err(|e| RecordError::Bad { field, why: e.to_string() })
    }
    pub(crate) fn asset(&mut self) -> Read<AssetId> {
        let name = self.borrowed("asset")?;
        self.names.asset(name)
    }
    pub(crate) fn signal(&mut self) -> Read<SignalId> {
        let name = self.borrowed("signal")?;
        self.names.signal(name)
    }
    pub(crate) fn adapter(&mut self) -> Read<AdapterId> {
        let name = self.borrowed("adapter")?;
        self.names.adapter(name)
    }
    pub(crate) fn clause(&mut self) -> Read<ClauseId> {
        let number = self.borrowed("clause")?;
        self.names.clause(number)
    }
    pub(crate) fn action(&mut self) -> Read<Action> {
        match self.u8("action")? {
            1 => self.percent("opening").map(Action::Open),
            2 => Ok(Action::Shut),
            3 => Ok(Action::Run),
            4 => Ok(Action::Stop),
            n => Err(unknown("action", n)),
        }
    }
    pub(crate) fn rest_action(&mut self) -> Read<RestAction> {
        match self.u8("rest action")? {
            1 => Ok(RestAction::Close),
            2 => Ok(RestAction::Open),
            3 => Ok(RestAction::Stop),
            4 => Ok(RestAction::Hold),
            5 => Ok(RestAction::HandToLocal),
            n => Err(unknown("rest action", n)),
        }
    }
    pub(crate) fn mode(&mut self) -> Read<Mode> {
        match self.u8("mode")? {
            1 => Ok(Mode::Observe),
            2 => Ok(Mode::Advise),
            3 => Ok(Mode::Automatic),
            n => Err(unknown("mode", n)),
        }
    }
    pub(crate) fn trust(&mut self) -> Read<ClockTrust> {
        match self.u8("trust")? {
            1 => Ok(ClockTrust::Trusted),
            2 => Ok(ClockTrust::Distrusted),
            n => Err(unknown("trust", n)),
        }
    }
}

pub(crate) fn unknown(field: &'static str, n: u8) -> RecordError {
    RecordError::Bad { field, why: format!("{n} stands for nothing") }
}
