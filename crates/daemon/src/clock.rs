//! The one file of the daemon that reads a clock.
//!
//! Real time, or a simulated clock that runs faster: then everything on the host shares one
//! mapping of the boot clock, so that leases, tides and physics stay in step. The boot clock counts
//! suspend and never steps; UTC is watched against it, and a step makes the clock distrusted.

use std::fs;
use std::path::{Path, PathBuf};

use anyhow::{Context, Result, bail};
use engine::ClockTrust;
use serde::{Deserialize, Serialize};
use units::{Mono, Span, Utc};

/// simulated = origin + (real boot clock - real origin) x speed, for UTC and for the boot clock.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize, Deserialize)]
pub struct Mapping {
    pub real_boot_origin_ns: u64,
    pub sim_boot_origin_ns: u64,
    pub sim_utc_origin_us: i64,
    pub speed: u32,
}

#[derive(Clone, Copy, Debug)]
pub struct Clock {
    mapping: Option<Mapping>,
}

fn real_boot_ns() -> u64 {
    let t = rustix::time::clock_gettime(rustix::time::ClockId::Boottime);
    (t.tv_sec as u64) * 1_000_000_000 + t.tv_nsec as u64
}

fn real_utc_us() -> i64 {
    let t = rustix::time::clock_gettime(rustix::time::ClockId::Realtime);
    t.tv_sec * 1_000_000 + t.tv_nsec / 1_000
}

impl Clock {
    pub const fn real() -> Self {
        Self { mapping: None }
    }

    /// A clock `speed` times as fast that starts at `start` (now, if absent); taken up again from
    /// `file` when an earlier life left it there, so that a restart sees the time that has passed.
    pub fn simulated(file: &Path, speed: u32, start: Option<Utc>) -> Result<Self> {
        if let Some(mapping) = kept(file)? {
            if mapping.speed != speed {
                bail!(
                    "{} says that this simulation runs at speed {}, not {speed}; \
                     give the same --speed, or begin anew with an empty --state folder",
                    file.display(),
                    mapping.speed
                );
            }
            return Ok(Self { mapping: Some(mapping) });
        }
        let real = real_boot_ns();
        let mapping = Mapping {
            real_boot_origin_ns: real,
            sim_boot_origin_ns: real,
            sim_utc_origin_us: start.map_or_else(real_utc_us, Utc::as_micros),
            speed,
        };
        let text = serde_json::to_string(&mapping).context("a clock mapping as JSON")?;
        fs::write(file, text).with_context(|| format!("writing {}", file.display()))?;
        Ok(Self { mapping: Some(mapping) })
    }

    pub const fn mapping(&self) -> Option<Mapping> {
        self.mapping
    }
    pub fn speed(&self) -> u32 {
        self.mapping.map_or(1, |m| m.speed)
    }
    pub fn boot(&self) -> Mono {
        let real = real_boot_ns();
        Mono::from_nanos(self.mapping.map_or(real, |m| m.sim_boot_origin_ns + elapsed(&m, real)))
    }
    pub fn utc(&self) -> Utc {
        match self.mapping {
            None => Utc::from_micros(real_utc_us()),
            Some(m) => {
                let us = elapsed(&m, real_boot_ns()) / 1_000;
                Utc::from_micros(m.sim_utc_origin_us + us as i64)
            }
        }
    }
    /// How long in real time until the boot clock shows `t`.
    pub fn real_until(&self, t: Mono) -> std::time::Duration {
        let span = t.since(self.boot()).as_micros().unsigned_abs();
        std::time::Duration::from_micros(span / u64::from(self.speed()))
    }
}

fn elapsed(m: &Mapping, real: u64) -> u64 {
    real.saturating_sub(m.real_boot_origin_ns).saturating_mul(u64::from(m.speed))
}

fn kept(file: &Path) -> Result<Option<Mapping>> {
    let text = match fs::read_to_string(file) {
        Ok(text) => text,
        Err(e) if e.kind() == std::io::ErrorKind::NotFound => return Ok(None),
        Err(e) => return Err(e).with_context(|| format!("reading {}", file.display())),
    };
    let mapping: Mapping = serde_json::from_str(&text).with_context(|| {
        format!("{} is no clock mapping; remove it to begin a new simulation", file.display())
    })?;
    // After a reboot the boot clock starts again: the old mapping means nothing.
    Ok((mapping.real_boot_origin_ns <= real_boot_ns()).then_some(mapping))
}

/// Watches UTC against the boot clock. A step of more than 2 s distrusts the clock until a person
/// vouches for it. Real synchronisation state is read from a marker file where the site has one
/// (a time service that keeps such a file; common practice).
#[derive(Debug)]
pub struct Watch {
    last: Option<(Utc, Mono)>,
    stepped: bool,
    marker: Option<PathBuf>,
}

const STEP_MAX: Span = Span::seconds(2);

impl Watch {
    pub const fn new(marker: Option<PathBuf>) -> Self {
        Self { last: None, stepped: false, marker }
    }
    pub fn vouch(&mut self) {
        self.stepped = false;
        self.last = None;
    }
    /// The trust at this reading, and what happened if it was a step.
    pub fn look(&mut self, utc: Utc, boot: Mono) -> (ClockTrust, Option<String>) {
        let mut news = None;
        if let Some((u, b)) = self.last {
            let drift = (utc - u) - boot.since(b);
            if drift.abs() > STEP_MAX {
                self.stepped = true;
                news = Some(format!("UTC stepped by {drift} against the boot clock"));
            }
        }
        self.last = Some((utc, boot));
        let marked = self.marker.as_ref().is_none_or(|m| m.exists());
        let trusted = marked && !self.stepped;
        (if trusted { ClockTrust::Trusted } else { ClockTrust::Distrusted }, news)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_step_distrusts_the_clock_until_a_person_vouches_for_it() {
        let mut watch = Watch::new(None);
        let (t, b) = (Utc::EPOCH, Mono::from_nanos(5));
        assert_eq!(watch.look(t, b).0, ClockTrust::Trusted);
        let second = Span::seconds(1);
        assert_eq!(watch.look(t + second, b + second).0, ClockTrust::Trusted);
        let (trust, news) = watch.look(t + Span::hours(1), b + second * 2);
        assert_eq!(trust, ClockTrust::Distrusted);
        assert!(news.is_some_and(|n| n.contains("stepped")));
        assert_eq!(
            watch.look(t + Span::hours(1) + second, b + second * 3).0,
            ClockTrust::Distrusted
        );
        watch.vouch();
        assert_eq!(watch.look(t + Span::hours(2), b + second * 4).0, ClockTrust::Trusted);
    }

    #[test]
    fn a_simulated_clock_is_taken_up_again_and_refuses_another_speed() {
        let dir = tempfile::tempdir().unwrap();
        let file = dir.path().join("clock.json");
        let start = Utc::from_civil(2027, 5, 1, 0, 0, 0).unwrap();
        let first = Clock::simulated(&file, 600, Some(start)).unwrap();
        let again = Clock::simulated(&file, 600, Some(start)).unwrap();
        assert_eq!(first.mapping(), again.mapping());
        assert!(first.utc() >= start);
        assert!(Clock::simulated(&file, 60, Some(start)).is_err());
    }
}
