//! What can be looked at. Looking changes nothing.

use units::{Mono, Utc};

use super::{Device, Plant};
use crate::{PlantConfig, Point, Record, Totals};

impl Plant {
    pub const fn config(&self) -> &PlantConfig {
        &self.config
    }
    pub const fn now(&self) -> Utc {
        self.now
    }
    pub const fn boot(&self) -> Mono {
        self.boot
    }
    pub const fn volume_m3(&self) -> f64 {
        self.volume_m3
    }
    pub fn level_m(&self) -> f64 {
        self.config.storage.level_m(self.volume_m3)
    }
    pub fn outer_m(&self) -> f64 {
        self.config.water.outer_m(self.now, self.config.truth.lag)
    }
    pub const fn gate_percent(&self) -> f64 {
        self.gate_share * 100.0
    }
    /// Nothing is driven, nothing is on its way to rest, and no pump runs.
    pub fn is_quiet(&self) -> bool {
        let at_rest = |d: &Device| d.lease.is_none() && !d.resting;
        self.devices.iter().all(at_rest) && !self.pumps_run.contains(&true)
    }
    pub const fn ports_m3_s(&self) -> f64 {
        self.ports_m3_s
    }
    pub const fn totals(&self) -> Totals {
        self.totals
    }
    /// Whether pump `asset` (1 and up) runs; `None` where there is no such pump.
    pub fn pump_runs(&self, asset: usize) -> Option<bool> {
        self.pumps_run.get(asset.checked_sub(1)?).copied()
    }
    pub fn is_local(&self, asset: usize) -> Option<bool> {
        self.devices.get(asset).map(|d| d.local)
    }
    pub(crate) fn frozen(&self) -> &[(Point, f64)] {
        &self.frozen
    }
    pub const fn record(&self) -> &Record {
        &self.record
    }
    /// Hands the record over and begins an empty one, so that a long run keeps no memory of it.
    pub fn take_record(&mut self) -> Record {
        core::mem::take(&mut self.record)
    }
}
