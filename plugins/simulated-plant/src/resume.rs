//! Taking up where an earlier life of the plant left off: water and steel do not vanish with the
//! process that stood in for them.

use std::fs::File;
use std::io::{Read, Seek, SeekFrom};
use std::path::Path;

use plant::{Beginning, Totals};
use serde_json::Value;
use units::{Span, Utc};

use crate::lines::FILE;

/// As much of the record's end as surely holds one sample.
const TAIL_BYTES: u64 = 256 * 1024;
/// A plant that stood unattended for longer begins anew.
const GAP_MAX: Span = Span::days(60);

/// The last sample before `now` in the folder's record, if there is one to go on from.
pub(crate) fn last_state(folder: &Path, now: Utc) -> Option<(Utc, Beginning)> {
    let text = tail(&folder.join(FILE))?;
    let (at, beginning) = text.lines().rev().find_map(sample)?;
    (at <= now && now - at <= GAP_MAX).then_some((at, beginning))
}

/// The end of the record; `None` when it cannot be read.
pub(crate) fn tail(path: &Path) -> Option<String> {
    let mut file = File::open(path).ok()?;
    let length = file.metadata().ok()?.len();
    file.seek(SeekFrom::Start(length.saturating_sub(TAIL_BYTES))).ok()?;
    let mut bytes = Vec::new();
    file.take(TAIL_BYTES).read_to_end(&mut bytes).ok()?;
    Some(String::from_utf8_lossy(&bytes).into_owned())
}

/// A torn or foreign line is passed over: the one before it serves.
fn sample(line: &str) -> Option<(Utc, Beginning)> {
    let value: Value = serde_json::from_str(line).ok()?;
    let s = value.get("sample")?;
    let number = |name: &str| s.get(name)?.as_f64();
    let totals = Totals {
        inflow_m3: number("inflow_m3")?,
        released_m3: number("released_m3")?,
        spilled_m3: number("spilled_m3")?,
        pump_kwh: number("pump_kwh")?,
    };
    let (level_m, gate_percent) = (number("level_m")?, number("gate_percent")?);
    let at = Utc::from_micros(s.get("utc_us")?.as_i64()?);
    Some((at, Beginning { level_m, gate_percent, totals }))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_torn_last_line_is_passed_over() {
        let whole = r#"{"sample":{"utc_us":60000000,"level_m":5.1,"gate_percent":12.5,
            "inflow_m3":1.0,"released_m3":2.0,"spilled_m3":0.0,"pump_kwh":3.0}}"#
            .replace('\n', "");
        let text =
            format!("{whole}\n{{\"event\":{{\"kind\":\"ports_still\"}}}}\n{{\"sample\":{{\"ut");
        let (at, b) = text.lines().rev().find_map(sample).unwrap();
        assert_eq!((at, b.level_m, b.gate_percent), (Utc::from_micros(60_000_000), 5.1, 12.5));
        assert_eq!(b.totals.released_m3, 2.0);
    }
}
