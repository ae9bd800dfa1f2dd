//! The licence file: clauses in the regulator's numbering, with the words of the licence.

use model::{
    Applies, AssetId, Clause, ClauseId, ClauseKind, Governed, Licence, OnStale, Place, PlaceId,
    RangeBand, Rounding, Sense, SignalCondition, TideAnchor,
};
use units::{CubicMetres, CubicMetresPerSecond, Metres, MetresPerSecond, Span};

use crate::codes;
use crate::fields::{FLOW_M3_S_MAX, VOLUME_M3_MAX, all};
use crate::names::Names;
use crate::raw::{Node, Table};
use crate::signals::{Signals, Use};
use crate::text::{FLOW, LENGTH, SPEED, VOLUME};

/// What clauses refer to.
pub(crate) struct Known<'a> {
    pub assets: &'a Names,
    pub places: &'a Names,
    /// The places themselves, where they are sound.
    pub made_places: Option<&'a [Place]>,
    pub signals: &'a Signals<'a>,
}

pub(crate) fn licence(root: &Table<'_>, known: &Known<'_>) -> Option<Licence> {
    let reference = root.words("reference", "HARL/T/1");
    let title = root.words("title", "Permit to discharge");
    let count = root.need("clause_count", "`clause_count = 8`, the number of clauses that follow");
    let count = count.and_then(|n| Some((n, n.whole(1, 1000)?)));
    let tables = root.some_tables("clauses", "clause");
    let has = tables.len();
    if let Some((node, said)) = count
        && said != has as u64
    {
        node.fault::<()>(
            codes::CLAUSE_COUNT,
            format!("this must be the number of clauses that follow, and the file has {has}"),
            "find the clause that is missing or too many; only then change the number",
        );
    }
    let mut numbers: Vec<String> = Vec::new();
    let made: Vec<_> = tables
        .into_iter()
        .enumerate()
        .map(|(i, mut t)| {
            let number = number(&mut t, &mut numbers);
            let made = clause(ClauseId(i as u16), number, &t, known);
            t.finish();
            made
        })
        .collect();
    root.finish();
    Some(Licence { reference: reference?, title: title?, clauses: all(made)? })
}

/// The number as the regulator writes it, once.
fn number(t: &mut Table<'_>, before: &mut Vec<String>) -> Option<String> {
    let node = t.need("number", "`number = \"2.2\"`")?;
    let form = "a clause number must be 1 to 16 digits, letters and points, in quotes";
    if node.is_number() {
        return node.fault(codes::CLAUSE_NUMBER, form, "put it in quotes: bare 2.10 is 2.1");
    }
    let said = node.text("\"2.2\"")?;
    let proper = |b: u8| b.is_ascii_alphanumeric() || b == b'.';
    if said.is_empty() || said.len() > 16 || !said.bytes().all(proper) {
        return node.fault(codes::CLAUSE_NUMBER, form, "write it like \"2.2\"");
    }
    t.what = format!("clause {said}");
    if before.iter().any(|n| n == said) {
        return node.fault(
            codes::CLAUSE_TWICE,
            format!("clause {said} must stand once in the licence"),
            "number the second one as the regulator does",
        );
    }
    before.push(said.to_owned());
    Some(said.to_owned())
}

fn clause(
    id: ClauseId,
    number: Option<String>,
    t: &Table<'_>,
    known: &Known<'_>,
) -> Option<Clause> {
    let words = words(t);
    let read = t.word("kind", &KINDS);
    let kind = read.and_then(|read| read(t, known));
    if read.is_none() {
        t.forgive();
    }
    let governs = t
        .need("governs", "`governs = [{ assets = [\"penstock\"], on_stale = \"hold\" }]`")
        .and_then(|n| governs(&n, known));
    Some(Clause { id, number: number?, words: words?, kind: kind?, governs: governs? })
}

type ReadKind = fn(&Table<'_>, &Known<'_>) -> Option<ClauseKind>;

const KINDS: [(&str, ReadKind); 7] = [
    ("tide-window", tide_window),
    ("current-seaward", current_seaward),
    ("rate", rate),
    ("volume-per-tide", volume_per_tide),
    ("rolling-volume", rolling_volume),
    ("month-volume", month_volume),
    ("signal-gate", signal_gate),
];

fn words(t: &Table<'_>) -> Option<String> {
    let node = t.need_as(codes::WORDS, "words", "`words` with the words of the licence")?;
    let said = node.text("\"the words of the licence\"")?.trim();
    if said.chars().count() >= 10 {
        return Some(said.to_owned());
    }
    node.fault(
        codes::WORDS,
        "a clause must carry the words of the licence",
        "copy them from the permit",
    )
}

fn tide_window(t: &Table<'_>, known: &Known<'_>) -> Option<ClauseKind> {
    let place = place(t, known);
    let anchor = t.word(
        "anchor",
        &[("high-water", TideAnchor::HighWater), ("low-water", TideAnchor::LowWater)],
    );
    let read = |key: &'static str, example: &str| -> Option<(Node<'_>, Span)> {
        let n = t.need(key, &format!("`{key} = {example}`"))?;
        Some((n, n.offset(Span::hours(12))?))
    };
    let (from, to) = (read("from", "\"+0:30\""), read("to", "\"+3:30\""));
    let ((_, from), (node, to)) = (from?, to?);
    if to <= from {
        return node.fault(
            codes::WINDOW,
            format!("a window must end after it begins, and it begins at {from} (h:mm:ss)"),
            "check both signs; + is after the turn of the tide",
        );
    }
    Some(ClauseKind::TideWindow { place: place?, anchor: anchor?, from, to })
}

fn place(t: &Table<'_>, known: &Known<'_>) -> Option<PlaceId> {
    t.need("place", "`place = \"outfall\"`").and_then(|n| known.places.find(&n)).map(PlaceId)
}

fn current_seaward(t: &Table<'_>, known: &Known<'_>) -> Option<ClauseKind> {
    let place = place(t, known).and_then(|id| with_current(t, id, known));
    let speed_min = t.quantity("speed_min", &SPEED, 0.0, 5.0).map(MetresPerSecond::of);
    let meter = match t.get("meter") {
        Some(n) => known.signals.find_as(&n, Use::Speed).map(Some),
        None => Some(None),
    };
    Some(ClauseKind::CurrentSeaward { place: place?, speed_min: speed_min?, meter: meter? })
}

/// The place, which must have current figures.
fn with_current(t: &Table<'_>, id: PlaceId, known: &Known<'_>) -> Option<PlaceId> {
    let Some(places) = known.made_places else { return Some(id) };
    if places[id.index()].differences.current.is_some() {
        return Some(id);
    }
    t.get("place")?.fault(
        codes::NO_CURRENT,
        "the place of a current clause must have a table of current differences",
        "add [places.differences.current] to that place in the site file",
    )
}

fn rate(t: &Table<'_>, _: &Known<'_>) -> Option<ClauseKind> {
    let flow_max = t.flow("flow_max");
    let averaging = t.duration("averaging", Span::seconds(10), Span::hours(24));
    let ramp = t
        .get("ramp_max_per_min")
        .map(|n| n.quantity(&FLOW, 0.0001, FLOW_M3_S_MAX).map(CubicMetresPerSecond::of));
    Some(ClauseKind::Rate {
        flow_max: flow_max?,
        averaging: averaging?,
        ramp_max_per_min: match ramp {
            Some(r) => Some(r?),
            None => None,
        },
    })
}

const BANDS: &str = "[{ range_min = \"0 m\", volume_max = \"0 m3\" }, \
                     { range_min = \"4.0 m\", volume_max = \"9000 m3\" }]";

fn volume_per_tide(t: &Table<'_>, _: &Known<'_>) -> Option<ClauseKind> {
    let rounding = t
        .need("rounding", "`rounding = { step = \"0.1 m\", halves = \"up\" }`")
        .and_then(|n| rounding(&n, t));
    let bands = t.need("bands", &format!("`bands = {BANDS}`")).and_then(|n| bands(&n, rounding));
    Some(ClauseKind::VolumePerTide { rounding: rounding?, bands: bands? })
}

fn rounding(node: &Node<'_>, t: &Table<'_>) -> Option<Rounding> {
    let r = node.table(format!("the rounding of {}", t.what))?;
    let step = r.need("step", "`step = \"0.1 m\"`");
    let value = step.and_then(|n| Some((n, n.quantity(&LENGTH, -1000.0, 1000.0)?)));
    let halves = r.word("halves", &[("up", ())]);
    r.finish();
    let (node, step_m) = value?;
    halves?;
    if (0.001..=1.0).contains(&step_m) {
        return Some(Rounding { step: Metres::of(step_m) });
    }
    node.fault(
        codes::ROUNDING,
        "the step of rounding must be from 0.001 to 1 m",
        "write what the permit says, like \"0.1 m\"",
    )
}

fn bands(node: &Node<'_>, rounding: Option<Rounding>) -> Option<Vec<RangeBand>> {
    let rows = node.list(BANDS)?;
    let read: Vec<_> = rows.iter().map(band).collect();
    let list = all(read)?;
    if list.first().is_none_or(|b| b.range_min.get() != 0.0) {
        return node.fault(
            codes::BANDS,
            "the first band must begin at 0 m, so that every range has a band",
            "add it, with \"0 m3\" if such tides are nil",
        );
    }
    for (pair, row) in list.windows(2).zip(&rows[1..]) {
        if pair[1].range_min <= pair[0].range_min {
            return row.fault(
                codes::BANDS,
                format!("each band must begin above the one before it, {}", pair[0].range_min),
                "put the bands in order, each range once",
            );
        }
    }
    let step_m = rounding?.step.get();
    for (band, row) in list.iter().zip(&rows) {
        let steps = band.range_min.get() / step_m;
        if (steps - steps.round()).abs() > 1e-6 {
            return row.fault(
                codes::BANDS,
                format!("a band must begin on a step of the rounding, {step_m} m"),
                "write the edge as the rounded range that first falls in the band",
            );
        }
    }
    Some(list)
}

fn band(node: &Node<'_>) -> Option<RangeBand> {
    let t = node.table("a range band")?;
    let range_min = t.length("range_min", 0.0, 20.0);
    let volume = t.quantity("volume_max", &VOLUME, 0.0, VOLUME_M3_MAX).map(CubicMetres::of);
    let flow = match t.get("flow_max") {
        Some(n) => {
            n.quantity(&FLOW, 0.001, FLOW_M3_S_MAX).map(|f| Some(CubicMetresPerSecond::of(f)))
        }
        None => Some(None),
    };
    t.finish();
    Some(RangeBand { range_min: range_min?, volume_max: volume?, flow_max: flow? })
}

fn rolling_volume(t: &Table<'_>, _: &Known<'_>) -> Option<ClauseKind> {
    let span = t.duration("span", Span::hours(1), Span::days(31));
    let volume_max = t.volume("volume_max");
    Some(ClauseKind::RollingVolume { span: span?, volume_max: volume_max? })
}

fn month_volume(t: &Table<'_>, _: &Known<'_>) -> Option<ClauseKind> {
    // The only months there are here, and yet the file must say whose they are.
    let months = t.word("months", &[("site-zone", ())]);
    let volume_max = t.volume("volume_max");
    months?;
    Some(ClauseKind::MonthVolume { volume_max: volume_max? })
}

const CONDITION: &str = "{ signal = \"ammonia\", at_most = \"5 mg/l\", age_max = \"30 min\" }";

fn signal_gate(t: &Table<'_>, known: &Known<'_>) -> Option<ClauseKind> {
    let applies =
        t.word("applies", &[("to-start", Applies::ToStart), ("throughout", Applies::Throughout)]);
    let conditions = t.need("conditions", &format!("`conditions = [{CONDITION}]`")).and_then(|n| {
        let list = n.list(&format!("[{CONDITION}]"))?;
        if list.is_empty() {
            return n.fault(
                codes::CONDITION,
                "a signal gate must have at least one condition",
                format!("write it like [{CONDITION}]"),
            );
        }
        let read: Vec<_> = list.iter().map(|c| condition(c, known)).collect();
        all(read)
    });
    Some(ClauseKind::SignalGate { conditions: conditions?, applies: applies? })
}

fn condition(node: &Node<'_>, known: &Known<'_>) -> Option<SignalCondition> {
    let t = node.table("the condition")?;
    let signal = t.need("signal", "`signal = \"ammonia\"`").and_then(|n| known.signals.find(&n));
    let (most, least) = (t.get("at_most"), t.get("at_least"));
    let age_max = t.duration("age_max", Span::seconds(1), Span::days(31));
    t.finish();
    let (node, sense) = match (most, least) {
        (Some(n), None) => (n, Sense::AtMost),
        (None, Some(n)) => (n, Sense::AtLeast),
        _ => {
            return node.fault(
                codes::CONDITION,
                "a condition must say exactly one of `at_most` and `at_least`",
                format!("write it like {CONDITION}"),
            );
        }
    };
    let signal = signal?;
    let limit = known.signals.value(signal, &node);
    Some(SignalCondition { signal, limit: limit?, sense, age_max: age_max? })
}

fn governs(node: &Node<'_>, known: &Known<'_>) -> Option<Vec<Governed>> {
    let example = "[{ assets = [\"penstock\"], on_stale = \"hold\" }]";
    let rows = node.list(example)?;
    let read: Vec<_> = rows.iter().map(|r| governed(r, known)).collect();
    let list: Vec<Governed> = all(read)?.into_iter().flatten().collect();
    let twice = list.iter().enumerate().any(|(i, g)| list[..i].iter().any(|o| o.asset == g.asset));
    if list.is_empty() || twice {
        return node.fault(
            codes::GOVERNS,
            "a clause must govern at least one asset, and each once",
            format!("write it like {example}"),
        );
    }
    Some(list)
}

fn governed(node: &Node<'_>, known: &Known<'_>) -> Option<Vec<Governed>> {
    let t = node.table("an entry of `governs`")?;
    let assets =
        t.need("assets", "`assets = [\"penstock\"]`").and_then(|n| known.assets.find_all(&n));
    let said = t
        .need_as(codes::ON_STALE, "on_stale", "`on_stale = \"hold\"`, or \"allow\", or \"reduced\"")
        .and_then(|n| n.word(&[("hold", 0), ("allow", 1), ("reduced", 2)]));
    let on_stale = match said {
        Some(0) => Some(OnStale::Hold),
        Some(1) => Some(OnStale::Allow),
        Some(_) => t.flow("flow").map(OnStale::Reduced),
        None => None,
    };
    t.finish();
    let on_stale = on_stale?;
    Some(assets?.into_iter().map(|i| Governed { asset: AssetId(i), on_stale }).collect())
}
