//! The reference port: its constants, their conventions and how long they hold.

use model::{NodalRule, Port, PortConstant};
use units::Metres;

use crate::codes;
use crate::constituents;
use crate::names::nearest;
use crate::raw::{Node, Table};
use crate::signals::{Signals, Use};
use crate::text::{ANGLE, Datums, LENGTH};

const ROW: &str = "[\"M2\", \"3.05 m\", \"170 deg\"]";

/// No constituent of any sea is higher than this, metres.
const AMPLITUDE_M_MAX: f64 = 10.0;

/// The least M2 by which a tide can be counted, metres.
const M2_AMPLITUDE_M_MIN: f64 = 0.01;

pub(crate) fn port(root: &Table<'_>, datums: &Datums, signals: &Signals<'_>) -> Option<Port> {
    let t = root.need("port", "a table [port] with the constants")?.table("[port]")?;
    let name = t.words("name", "Port Ansel");
    let mean_level = t.level("mean_level", datums);
    let nodal =
        t.word("nodal", &[("mid-year", NodalRule::MidYear), ("continuous", NodalRule::Continuous)]);
    let valid = t.window("valid");
    let gauge = t.get("gauge").map(|n| signals.find_as(&n, Use::Level));
    let constants = t.need("constants", &format!("`constants = [{ROW}]`")).and_then(|n| {
        let rows = n.list(&format!("[{ROW}]"))?;
        constants(&n, &rows)
    });
    t.finish();
    Some(Port {
        name: name?,
        mean_level: mean_level?,
        nodal: nodal?,
        constants: constants?,
        valid: valid?,
        gauge: match gauge {
            Some(g) => Some(g?),
            None => None,
        },
    })
}

fn constants(whole: &Node<'_>, rows: &[Node<'_>]) -> Option<Vec<PortConstant>> {
    let mut list: Vec<PortConstant> = Vec::with_capacity(rows.len());
    let mut sound = true;
    for row in rows {
        let Some(c) = constant(row, &list) else {
            sound = false;
            continue;
        };
        list.push(c);
    }
    let m2 = list
        .iter()
        .any(|c| constituents::same(&c.name, "M2") && c.amplitude.get() >= M2_AMPLITUDE_M_MIN);
    if sound && !m2 {
        return whole.fault(
            codes::NO_M2,
            format!("the constants must have an M2 of at least {M2_AMPLITUDE_M_MIN} m"),
            format!("add its row, like {ROW}"),
        );
    }
    sound.then_some(list)
}

fn constant(row: &Node<'_>, before: &[PortConstant]) -> Option<PortConstant> {
    let [name, amplitude, phase] = row.row::<3>(ROW)?;
    let amplitude = amplitude.quantity(&LENGTH, 0.0, AMPLITUDE_M_MAX);
    let phase = phase_lag(&phase);
    let said = name.text("\"M2\"").and_then(|said| constituent(&name, said))?;
    if before.iter().any(|c| constituents::same(&c.name, said)) {
        return name.fault(
            codes::CONSTITUENT_TWICE,
            format!("{said} must stand once in the constants, under whatever name"),
            "take one of its rows out, after checking which is right",
        );
    }
    Some(PortConstant {
        name: said.to_owned(),
        amplitude: Metres::of(amplitude?),
        phase_lag_greenwich_deg: phase?,
    })
}

fn constituent<'a>(node: &Node<'a>, said: &'a str) -> Option<&'a str> {
    if constituents::is_known(said) {
        return Some(said);
    }
    let remedy = match nearest(said, constituents::usual()) {
        Some(n) => format!("did you mean {n:?}?"),
        None => "check the name in the list that the constants came from".to_owned(),
    };
    node.fault(
        codes::CONSTITUENT,
        format!("{said:?} must be a constituent that this program can reckon"),
        remedy,
    )
}

/// Greenwich phase lag from 0 up to 360 degrees.
fn phase_lag(node: &Node<'_>) -> Option<f64> {
    let deg = node.quantity(&ANGLE, -100_000.0, 100_000.0)?;
    if (0.0..360.0).contains(&deg) {
        return Some(deg);
    }
    node.fault(
        codes::PHASE,
        "a Greenwich phase lag must be from 0 up to but not including 360 deg",
        format!("if it is a Greenwich lag, write \"{} deg\"", deg.rem_euclid(360.0)),
    )
}
