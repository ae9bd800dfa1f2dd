//! What the daemon tells the adapter at `introduce`, as text by name.
//!
//! | setting | says |
//! |---|---|
//! | `plant_folder` | where the plant keeps socket and record |
//! | `plant_program`, `plant_args` | how to start the plant if it is not running; the arguments as a JSON list of texts |
//! | `sense_every_s` | simulated seconds between readings; 15 if absent |
//! | `clock_real_boot_origin_ns`, `clock_sim_boot_origin_ns`, `clock_sim_utc_origin_us`, `clock_speed` | the shared clock mapping; all four, or none for real time |

use std::collections::BTreeMap;
use std::path::PathBuf;
use std::str::FromStr;

use units::Span;

use crate::{ClockMap, SimulationError};

#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Settings {
    pub folder: PathBuf,
    pub program: PathBuf,
    pub args: Vec<String>,
    pub sense_every: Span,
    pub clock: ClockMap,
}

/// Readings come this often, in simulated time, unless the site says otherwise.
const SENSE_EVERY_S: f64 = 15.0;

impl Settings {
    pub fn read(all: &BTreeMap<String, String>) -> Result<Self, SimulationError> {
        let text = |name: &str| {
            all.get(name).ok_or_else(|| bad(name, "given by the daemon")).map(String::as_str)
        };
        let args = serde_json::from_str(text("plant_args")?);
        let sense_every_s = all.get("sense_every_s").map_or(Ok(SENSE_EVERY_S), |v| {
            let s = v.parse::<f64>().ok().filter(|s| (0.1..=3_600.0).contains(s));
            s.ok_or_else(|| bad("sense_every_s", "seconds from 0.1 to 3600"))
        })?;
        Ok(Self {
            folder: PathBuf::from(text("plant_folder")?),
            program: PathBuf::from(text("plant_program")?),
            args: args.map_err(|_| bad("plant_args", "a JSON list of texts"))?,
            sense_every: Span::from_seconds_f64(sense_every_s),
            clock: clock(all)?,
        })
    }
}

fn clock(all: &BTreeMap<String, String>) -> Result<ClockMap, SimulationError> {
    if !all.keys().any(|k| k.starts_with("clock_")) {
        return Ok(ClockMap::real());
    }
    let map = ClockMap {
        real_boot_origin_ns: number(all, "clock_real_boot_origin_ns")?,
        sim_boot_origin_ns: number(all, "clock_sim_boot_origin_ns")?,
        sim_utc_origin_us: number(all, "clock_sim_utc_origin_us")?,
        speed: number(all, "clock_speed")?,
    };
    if map.speed == 0 { Err(bad("clock_speed", "one or more")) } else { Ok(map) }
}

fn number<T: FromStr>(
    all: &BTreeMap<String, String>,
    name: &'static str,
) -> Result<T, SimulationError> {
    all.get(name).and_then(|v| v.parse().ok()).ok_or_else(|| bad(name, "a whole number"))
}

fn bad(name: &str, rule: &'static str) -> SimulationError {
    SimulationError::Setting { name: name.to_owned(), rule }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn good() -> BTreeMap<String, String> {
        let pairs = [
            ("plant_folder", "/state/plant"),
            ("plant_program", "/bin/tidereeve"),
            ("plant_args", r#"["simulated-plant", "--site", "a b"]"#),
            ("clock_real_boot_origin_ns", "5"),
            ("clock_sim_boot_origin_ns", "6"),
            ("clock_sim_utc_origin_us", "-7"),
            ("clock_speed", "600"),
        ];
        pairs.into_iter().map(|(k, v)| (k.to_owned(), v.to_owned())).collect()
    }

    #[test]
    fn settings_are_read_whole_or_refused_by_name() {
        let s = Settings::read(&good()).unwrap();
        assert_eq!(s.args, ["simulated-plant", "--site", "a b"]);
        assert_eq!((s.sense_every, s.clock.speed), (Span::seconds(15), 600));
        let cases = [
            ("plant_args", "not a list"),
            ("clock_speed", "0"),
            ("clock_sim_boot_origin_ns", "-1"),
            ("sense_every_s", "nan"),
        ];
        for (name, value) in cases {
            let mut all = good();
            all.insert(name.to_owned(), value.to_owned());
            let refused = Settings::read(&all).unwrap_err();
            assert!(refused.to_string().contains(name), "{refused}");
        }
        let mut all = good();
        all.remove("plant_folder");
        assert!(Settings::read(&all).unwrap_err().to_string().contains("plant_folder"));
    }
}
