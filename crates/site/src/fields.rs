//! A key and its kind of value in one question.

use model::NeapSpring;
use units::{CubicMetres, CubicMetresPerSecond, Kilowatts, Level, Metres, Span, Window};

use crate::codes;
use crate::raw::{Node, Table};
use crate::text::{Datums, FLOW, LENGTH, POWER, Unit, VOLUME};

/// Most that any flow or volume of such a works can be; larger is a slip of units.
pub(crate) const FLOW_M3_S_MAX: f64 = 200.0;
pub(crate) const VOLUME_M3_MAX: f64 = 1e9;

impl<'a> Table<'a> {
    pub fn quantity(&self, key: &'static str, unit: &Unit, min: f64, max: f64) -> Option<f64> {
        self.need(key, &format!("`{key} = {:?}`", unit.example))?.quantity(unit, min, max)
    }
    pub fn length(&self, key: &'static str, min: f64, max: f64) -> Option<Metres> {
        self.quantity(key, &LENGTH, min, max).map(Metres::of)
    }
    /// A flow above zero.
    pub fn flow(&self, key: &'static str) -> Option<CubicMetresPerSecond> {
        self.quantity(key, &FLOW, 0.001, FLOW_M3_S_MAX).map(CubicMetresPerSecond::of)
    }
    /// A volume above zero.
    pub fn volume(&self, key: &'static str) -> Option<CubicMetres> {
        self.quantity(key, &VOLUME, 1.0, VOLUME_M3_MAX).map(CubicMetres::of)
    }
    pub fn power(&self, key: &'static str) -> Option<Kilowatts> {
        self.quantity(key, &POWER, 0.0, 10_000.0).map(Kilowatts::of)
    }
    pub fn duration(&self, key: &'static str, min: Span, max: Span) -> Option<Span> {
        self.need(key, &format!("`{key} = \"8 min\"`"))?.duration(min, max)
    }
    pub fn number(&self, key: &'static str, min: f64, max: f64) -> Option<f64> {
        self.need(key, &format!("`{key} = {min}` or another number up to {max}"))?.number(min, max)
    }
    pub fn whole(&self, key: &'static str, min: u64, max: u64) -> Option<u64> {
        self.need(key, &format!("`{key} = {min}` or another whole number up to {max}"))?
            .whole(min, max)
    }
    pub fn level(&self, key: &'static str, datums: &Datums) -> Option<Level> {
        datums.level(&self.need(key, &format!("`{key} = \"6.60 m HD\"`"))?)
    }
    /// Text that says something.
    pub fn words(&self, key: &'static str, example: &str) -> Option<String> {
        let node = self.need(key, &format!("`{key} = {example:?}`"))?;
        let text = node.text(&format!("{example:?}"))?.trim();
        if text.is_empty() || text.len() > 4000 {
            return node.fault(
                codes::OUT_OF_RANGE,
                format!("`{key}` must have from 1 to 4000 characters"),
                format!("write it like {example:?}"),
            );
        }
        Some(text.to_owned())
    }
    pub fn word<T: Copy>(&self, key: &'static str, choices: &[(&'static str, T)]) -> Option<T> {
        let first = choices.first().map_or("", |c| c.0);
        self.need(key, &format!("`{key} = {first:?}` or another choice"))?.word(choices)
    }
    /// `{ neap = ..., spring = ... }`.
    pub fn neap_spring<T>(
        &self,
        key: &'static str,
        example: &str,
        read: impl Fn(&Node<'a>) -> Option<T>,
    ) -> Option<NeapSpring<T>> {
        let shape = format!("`{key} = {{ neap = {example}, spring = {example} }}`");
        let t = self.need(key, &shape)?.table(format!("`{key}` of {}", self.what))?;
        let neap = t.need("neap", &format!("`neap = {example}`")).and_then(|n| read(&n));
        let spring = t.need("spring", &format!("`spring = {example}`")).and_then(|n| read(&n));
        t.finish();
        Some(NeapSpring { neap: neap?, spring: spring? })
    }
    /// `[from, to]`, the second after the first.
    pub fn window(&self, key: &'static str) -> Option<Window> {
        let example = "[\"2020-01-01T00:00:00Z\", \"2036-01-01T00:00:00Z\"]";
        let node = self.need(key, &format!("`{key} = {example}`"))?;
        let [from, to] = node.row::<2>(example)?;
        let (from, to) = (from.instant(), to.instant());
        let (from, to) = (from?, to?);
        Window::new(from, to).ok().or_else(|| {
            node.fault(
                codes::WINDOW_ORDER,
                "a stretch of time must end after it starts",
                format!("put them in order: [\"{to}\", \"{from}\"], or mend the wrong one"),
            )
        })
    }
    /// The rows of `key`, at least one, or a fault that there is none.
    pub fn some_tables(&self, key: &'static str, what: &str) -> Vec<Table<'a>> {
        let list = self.tables(key, what);
        if list.is_empty() {
            self.fault::<()>(
                codes::EMPTY,
                format!("{} must have at least one {what}", self.what),
                format!("add a table [[{key}]]"),
            );
        }
        list
    }
}

/// All of them, or none if one is missing.
pub(crate) fn all<T>(list: impl IntoIterator<Item = Option<T>>) -> Option<Vec<T>> {
    list.into_iter().collect()
}
