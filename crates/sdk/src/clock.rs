//! The one file of the SDK that reads a clock: the boot clock that all processes of a host share,
//! through the mapping of a simulated clock where the settings hold one.

use std::collections::BTreeMap;

/// Boot clock and UTC as the daemon sees them.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct BootClock {
    map: Option<Map>,
}

#[derive(Clone, Copy, PartialEq, Debug)]
struct Map {
    real_origin_ns: u64,
    sim_origin_ns: u64,
    sim_utc_origin_us: i64,
    speed: u64,
}

impl BootClock {
    pub const fn real() -> Self {
        Self { map: None }
    }
    /// From the settings of `introduce`; the error names the setting that is wrong.
    pub fn from_settings(settings: &BTreeMap<String, String>) -> Result<Self, String> {
        if !settings.contains_key("clock_speed") {
            return Ok(Self::real());
        }
        fn number<T: std::str::FromStr>(
            settings: &BTreeMap<String, String>,
            key: &str,
        ) -> Result<T, String> {
            let text = settings.get(key).ok_or_else(|| format!("setting {key} is missing"))?;
            text.parse().map_err(|_| format!("setting {key} is {text:?}, which is no whole number"))
        }
        Ok(Self {
            map: Some(Map {
                real_origin_ns: number(settings, "clock_real_boot_origin_ns")?,
                sim_origin_ns: number(settings, "clock_sim_boot_origin_ns")?,
                sim_utc_origin_us: number(settings, "clock_sim_utc_origin_us")?,
                speed: number(settings, "clock_speed")?,
            }),
        })
    }
    pub fn boot_ns(&self) -> u64 {
        let real = ns(rustix::time::ClockId::Boottime);
        self.map.map_or(real, |m| m.sim_origin_ns + m.elapsed_ns(real))
    }
    pub fn utc_us(&self) -> i64 {
        match self.map {
            None => (ns(rustix::time::ClockId::Realtime) / 1_000) as i64,
            Some(m) => {
                let elapsed = m.elapsed_ns(ns(rustix::time::ClockId::Boottime));
                m.sim_utc_origin_us + (elapsed / 1_000) as i64
            }
        }
    }
}

impl Map {
    const fn elapsed_ns(&self, real: u64) -> u64 {
        real.saturating_sub(self.real_origin_ns).saturating_mul(self.speed)
    }
}

fn ns(clock: rustix::time::ClockId) -> u64 {
    let t = rustix::time::clock_gettime(clock);
    (t.tv_sec as u64) * 1_000_000_000 + t.tv_nsec as u64
}
