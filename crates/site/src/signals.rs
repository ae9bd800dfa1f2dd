//! Adapters, and the signals that they bring.

use model::{Adapter, AdapterId, AdapterProgram, Signal, SignalId};
use units::Span;

use crate::codes;
use crate::fields::all;
use crate::names::Names;
use crate::raw::{Node, Table};
use crate::text::{Datums, split_number};

/// The adapters of the site.
pub(crate) fn adapters(tables: &mut [Table<'_>]) -> (Names, Option<Vec<Adapter>>) {
    let names = Names::of("adapter", tables);
    let list = tables.iter().enumerate().map(|(i, t)| {
        let made = adapter(AdapterId(i as u16), names.name(i), t);
        t.finish();
        made
    });
    let list = all(list.collect::<Vec<_>>());
    (names, list)
}

fn adapter(id: AdapterId, name: &str, t: &Table<'_>) -> Option<Adapter> {
    let program = match (t.has("program"), t.has("command")) {
        (true, true) => t.fault(
            codes::WRONG_KIND,
            format!("{} must say `program` or `command`, not both", t.what),
            "take one of them out",
        ),
        (_, true) => t.get("command").and_then(|n| command(&n)),
        _ => t.word("program", &[("simulated-plant", ())]).map(|()| AdapterProgram::SimulatedPlant),
    };
    let settings = match t.get("settings") {
        Some(n) => n.table(format!("`settings` of {}", t.what)).and_then(|t| settings(&t)),
        None => Some(Vec::new()),
    };
    Some(Adapter { id, name: name.to_owned(), program: program?, settings: settings? })
}

fn command(node: &Node<'_>) -> Option<AdapterProgram> {
    let example = "[\"./adapter\", \"--port\", \"502\"]";
    let words = node.list(example)?;
    let said = all(words.iter().map(|w| w.text(example).map(str::to_owned)))?;
    if said.first().is_none_or(|program| program.trim().is_empty()) {
        return node.fault(
            codes::EMPTY,
            "a command must begin with the program to start",
            format!("write it like {example}"),
        );
    }
    Some(AdapterProgram::Command(said))
}

fn settings(t: &Table<'_>) -> Option<Vec<(String, String)>> {
    let example = "\"text\"; settings are passed on as they stand";
    all(t.all().into_iter().map(|(key, _, n)| Some((key.to_owned(), n.text(example)?.to_owned()))))
}

/// What a signal is used as.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum Use {
    Level,
    Flow,
    Speed,
    Position,
    Switch,
}

impl Use {
    const fn unit(self) -> (&'static str, &'static str) {
        match self {
            Self::Level => ("a water level", "m"),
            Self::Flow => ("a flow", "m3/s"),
            Self::Speed => ("a current meter", "m/s"),
            Self::Position => ("a position or running state", "%"),
            Self::Switch => ("a switch", "flag"),
        }
    }
}

/// The unit of a signal; a level also has its datum.
#[derive(Clone)]
struct SignalUnit {
    unit: String,
    is_level: bool,
}

/// The signals of the site, with what is needed to refer to them.
pub(crate) struct Signals<'a> {
    names: Names,
    units: Vec<Option<SignalUnit>>,
    datums: &'a Datums,
    pub list: Option<Vec<Signal>>,
}

impl<'a> Signals<'a> {
    pub fn of(tables: &mut [Table<'_>], adapters: &Names, datums: &'a Datums) -> Self {
        let names = Names::of("signal", tables);
        let units: Vec<_> = tables.iter().map(|t| unit(t, datums)).collect();
        let made: Vec<_> = tables
            .iter()
            .enumerate()
            .map(|(i, t)| {
                let made =
                    signal(SignalId(i as u16), names.name(i), t, &units[i], adapters, datums);
                t.finish();
                made
            })
            .collect();
        Self { names, units, datums, list: all(made) }
    }
    pub fn find(&self, node: &Node<'_>) -> Option<SignalId> {
        self.names.find(node).map(SignalId)
    }
    /// The signal, which must have the unit of its use.
    pub fn find_as(&self, node: &Node<'_>, used: Use) -> Option<SignalId> {
        let id = self.find(node)?;
        self.fits(node, id, used)
    }
    pub fn find_all_as(&self, node: &Node<'_>, used: Use) -> Option<Vec<SignalId>> {
        let ids = self.names.find_all(node)?;
        let nodes = node.list("")?;
        all(ids.iter().zip(&nodes).map(|(i, n)| self.fits(n, SignalId(*i), used)))
    }
    fn fits(&self, node: &Node<'_>, id: SignalId, used: Use) -> Option<SignalId> {
        // A signal whose own unit is at fault has said so already.
        let is = self.units[id.index()].as_ref()?;
        let (what, wanted) = used.unit();
        if is.unit == wanted && (used != Use::Level || is.is_level) {
            return Some(id);
        }
        let name = self.names.name(id.index());
        let form = if used == Use::Level { "m DATUM" } else { wanted };
        node.fault(
            codes::SIGNAL_USE,
            format!("{what} must be read in `{form}`, and signal `{name}` is in `{}`", is.unit),
            "name another signal here, or mend the unit of that one",
        )
    }
    /// A value in the signal's own unit.
    pub fn value(&self, id: SignalId, node: &Node<'_>) -> Option<f64> {
        value(node, self.units[id.index()].as_ref()?, self.datums)
    }
    /// A value for the signal of this name.
    pub fn value_named(
        &self,
        name: &str,
        at: std::ops::Range<usize>,
        node: &Node<'_>,
    ) -> Option<f64> {
        let id = self.names.find_text(node.src, at, name)?;
        self.value(SignalId(id), node)
    }
    pub fn knows(&self, node: &Node<'_>) -> Option<String> {
        self.find(node).map(|id| self.names.name(id.index()).to_owned())
    }
}

/// `m HD` for a level; any other text stands for itself.
fn unit(t: &Table<'_>, datums: &Datums) -> Option<SignalUnit> {
    let node = t.need("unit", "`unit = \"mg/l\"`, or `unit = \"m HD\"` for a level")?;
    let text = node.text("\"mg/l\"")?.trim();
    if text.is_empty() || text.len() > 24 || text.starts_with(|c: char| c.is_ascii_digit()) {
        return node.fault(
            codes::UNIT,
            "the unit of a signal must be a short text that does not begin with a digit",
            "write it like \"m HD\", \"m3/s\", \"%\", \"flag\" or \"mg/l\"",
        );
    }
    let Some(datum) = text.strip_prefix("m ") else {
        return Some(SignalUnit { unit: text.to_owned(), is_level: false });
    };
    match datums.offset_m(datum.trim()) {
        Some(0.0) => Some(SignalUnit { unit: "m".to_owned(), is_level: true }),
        Some(offset_m) => node.fault(
            codes::SIGNAL_USE,
            "readings are not shifted, so a level signal must come on the site datum",
            format!("let the adapter add {offset_m} m and deliver it on the site datum"),
        ),
        None => node.fault(
            codes::UNKNOWN_DATUM,
            "a level signal must name a datum of [datums]",
            "write \"m \" and the site datum, or add the datum to [datums]",
        ),
    }
}

fn value(node: &Node<'_>, unit: &SignalUnit, datums: &Datums) -> Option<f64> {
    if unit.is_level {
        return datums.level(node).map(units::Level::get);
    }
    let example = format!("\"5 {}\"", unit.unit);
    match split_number(node.text(&example)?) {
        Some((v, said)) if said == unit.unit => Some(v),
        Some(_) => node.fault(
            codes::UNIT,
            format!("this value must be in `{}`, the unit of its signal", unit.unit),
            format!("write it like {example}"),
        ),
        None => node.fault(
            codes::OUT_OF_RANGE,
            "this value must be one plain number and its unit",
            format!("write it like {example}"),
        ),
    }
}

fn signal(
    id: SignalId,
    name: &str,
    t: &Table<'_>,
    unit: &Option<SignalUnit>,
    adapters: &Names,
    datums: &Datums,
) -> Option<Signal> {
    let adapter = t.need("adapter", "`adapter = \"plant\"`").and_then(|n| adapters.find(&n));
    let point = t.words("point", "lagoon-level-a");
    let bound = |key| {
        let node = t.need(key, &format!("`{key}` in the unit of the signal"));
        node.and_then(|n| Some((n, value(&n, unit.as_ref()?, datums)?)))
    };
    let (min, max) = (bound("min"), bound("max"));
    if let (Some((_, low)), Some((node, high))) = (min, max)
        && low >= high
    {
        return node.fault(
            codes::OUT_OF_RANGE,
            "the greatest value of a signal must lie above its least",
            "check both figures",
        );
    }
    let rate = t.get("rate_max").map(|n| rate_per_s(&n, unit.as_ref()?));
    let age_max = t.duration("age_max", Span::seconds(1), Span::days(31));
    let frozen = t
        .need("frozen_after", "`frozen_after = \"30 min\"`, or \"never\" where flat is healthy")
        .and_then(|n| match n.text("\"30 min\"")? {
            "never" => Some(None),
            _ => n.duration(Span::seconds(10), Span::days(31)).map(Some),
        });
    Some(Signal {
        id,
        name: name.to_owned(),
        adapter: AdapterId(adapter?),
        point: point?,
        unit: unit.as_ref()?.unit.clone(),
        value_min: min?.1,
        value_max: max?.1,
        rate_max_per_s: match rate {
            Some(r) => Some(r?),
            None => None,
        },
        age_max: age_max?,
        frozen_after: frozen?,
    })
}

/// `0.5 m/min`: in the unit of the signal, by s, min or h.
fn rate_per_s(node: &Node<'_>, unit: &SignalUnit) -> Option<f64> {
    let example = format!("\"0.5 {}/min\"", unit.unit);
    let parsed = split_number(node.text(&example)?).and_then(|(v, said)| {
        let per = said.strip_prefix(unit.unit.as_str())?.strip_prefix('/')?;
        let seconds = match per {
            "s" => 1.0,
            "min" => 60.0,
            "h" => 3600.0,
            _ => return None,
        };
        (v > 0.0).then_some(v / seconds)
    });
    parsed.or_else(|| {
        node.fault(
            codes::UNIT,
            "a rate must be above zero, in the unit of the signal by s, min or h",
            format!("write it like {example}"),
        )
    })
}
