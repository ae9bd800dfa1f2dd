//! The plant itself: commands in, time forward, state out.

use structures::{Outfall, Stroke};
use units::{Mono, Span, Utc};

use crate::device::{Device, Lease};
use crate::flows::{Flows, Standing, flows};
use crate::passage::Passage;
use crate::{
    Event, EventKind, FaultKind, PlantConfig, PlantError, Point, Record, RestDo, Sample, Totals,
    Water,
};

/// Longest step while anything moves or flows, and while nothing does.
const STEP_ACTIVE: Span = Span::seconds(5);
const STEP_IDLE: Span = Span::seconds(60);
/// A pump is stopped by the plant's own protection below this opening of the gate.
const WAY_OPEN_SHARE: f64 = 0.05;

/// The simulated works. See the crate's own words for what it is and is not.
#[derive(Clone, PartialEq, Debug)]
pub struct Plant {
    config: PlantConfig,
    outfall: Outfall,
    stroke: Stroke,
    now: Utc,
    boot: Mono,
    volume_m3: f64,
    gate_share: f64,
    /// The gate's, then the pumps'.
    devices: Vec<Device>,
    pumps_run: Vec<bool>,
    ports_m3_s: f64,
    /// Greatest flow at the ports since they were last still.
    release_peak_m3_s: f64,
    spilling: bool,
    totals: Totals,
    fault_on: Vec<bool>,
    frozen: Vec<(Point, f64)>,
    record: Record,
}

impl Plant {
    pub fn new(config: PlantConfig) -> Result<Self, PlantError> {
        config.check()?;
        let gate_share = config.beginning.gate_percent / 100.0;
        let gate = Device::at(gate_share, config.gate.rest);
        let pumps = config.pumps.iter().map(|p| Device::at(0.0, p.rest));
        let mut plant = Self {
            outfall: config.true_outfall()?,
            stroke: config.stroke()?,
            now: config.start,
            boot: config.boot,
            volume_m3: config.storage.volume_m3(config.beginning.level_m),
            gate_share,
            devices: core::iter::once(gate).chain(pumps).collect(),
            pumps_run: vec![false; config.pumps.len()],
            ports_m3_s: 0.0,
            release_peak_m3_s: 0.0,
            spilling: false,
            totals: config.beginning.totals,
            fault_on: vec![false; config.faults.len()],
            frozen: Vec::new(),
            record: Record::default(),
            config,
        };
        plant.turn_faults();
        plant.sample();
        Ok(plant)
    }

    /// Tells an asset (0 the gate, 1 and up the pumps) where to be, until `lease_end`.
    /// Refused, with nothing moved: an unknown asset, a setting outside 0 to 100, a lease that is
    /// over, an asset in local control, a pump with the gate shut.
    pub fn drive(
        &mut self,
        asset: usize,
        setting_percent: f64,
        lease_end: Mono,
    ) -> Result<(), PlantError> {
        self.drive_as(0, asset, setting_percent, lease_end)
    }
    /// The same, with the command's id for the record.
    pub fn drive_as(
        &mut self,
        command: u64,
        asset: usize,
        setting_percent: f64,
        lease_end: Mono,
    ) -> Result<(), PlantError> {
        if let Err(e) = self.may_drive(asset, setting_percent, lease_end) {
            self.event(EventKind::DriveRefused { asset, command, why: e.to_string() });
            return Err(e);
        }
        self.event(EventKind::DriveReceived { asset, command, setting_percent, lease_end });
        let lease = Lease { command, end: lease_end };
        self.devices[asset].drive(setting_percent / 100.0, lease);
        self.follow_pumps();
        Ok(())
    }
    fn may_drive(&self, asset: usize, percent: f64, lease_end: Mono) -> Result<(), PlantError> {
        let device = self.devices.get(asset).ok_or(PlantError::NoSuchAsset { asset })?;
        if !(0.0..=100.0).contains(&percent) {
            return Err(PlantError::SettingOutOfRange { asset, setting_percent: percent });
        }
        if lease_end <= self.boot {
            return Err(PlantError::LeasePast { asset });
        }
        if device.local {
            return Err(PlantError::InLocal { asset });
        }
        if asset > 0 && percent >= 50.0 && self.gate_share < WAY_OPEN_SHARE {
            return Err(PlantError::WayShut { asset });
        }
        Ok(())
    }
    /// Prolongs (or shortens) the lease of an asset that is driven.
    pub fn renew(&mut self, asset: usize, lease_end: Mono) -> Result<(), PlantError> {
        let command = self.driven_by(asset)?;
        self.renew_as(command, asset, lease_end)
    }
    /// The same, refused unless it is this command that drives the asset.
    pub fn renew_as(
        &mut self,
        command: u64,
        asset: usize,
        lease_end: Mono,
    ) -> Result<(), PlantError> {
        if self.driven_by(asset)? != command {
            return Err(PlantError::NothingToRenew { asset });
        }
        if lease_end <= self.boot {
            return Err(PlantError::LeasePast { asset });
        }
        self.devices[asset].lease = Some(Lease { command, end: lease_end });
        self.event(EventKind::Renewed { asset, command, lease_end });
        Ok(())
    }
    /// The command that drives an asset now.
    fn driven_by(&self, asset: usize) -> Result<u64, PlantError> {
        let device = self.devices.get(asset).ok_or(PlantError::NoSuchAsset { asset })?;
        device.lease.map(|l| l.command).ok_or(PlantError::NothingToRenew { asset })
    }
    /// Sends an asset to the rest that its controller is set to.
    pub fn rest(&mut self, asset: usize, why: &str) -> Result<(), PlantError> {
        let device = self.devices.get(asset).ok_or(PlantError::NoSuchAsset { asset })?;
        self.rest_as(asset, device.rest, why)
    }
    /// Sends an asset to rest by this action. An asset in local control stays as it is.
    pub fn rest_as(&mut self, asset: usize, action: RestDo, why: &str) -> Result<(), PlantError> {
        let device = self.devices.get(asset).ok_or(PlantError::NoSuchAsset { asset })?;
        if device.local {
            return Err(PlantError::InLocal { asset });
        }
        self.event(EventKind::RestTold { asset, why: why.to_owned() });
        self.begin_rest(asset, action);
        Ok(())
    }
    /// A person turns the panel switch of an asset.
    pub fn set_local(&mut self, asset: usize, local: bool) -> Result<(), PlantError> {
        let position = self.position(asset);
        let device = self.devices.get_mut(asset).ok_or(PlantError::NoSuchAsset { asset })?;
        if device.local == local {
            return Ok(());
        }
        if local {
            device.stand(position);
            device.local = true;
            self.event(EventKind::LocalTaken { asset });
        } else {
            device.local = false;
            self.event(EventKind::LocalGiven { asset });
        }
        Ok(())
    }
    /// Puts later series in place of the present ones, which must cover the present instant too.
    pub fn replace_water(&mut self, water: Water) {
        self.config.water = water;
    }
    /// The last instant to which it can be advanced with the water it has.
    pub fn water_until(&self) -> Utc {
        self.config.water.until(self.config.truth.lag)
    }

    /// Moves time on to `to`, and the boot clock to `boot`. Leases that run out on the way do so
    /// at their own instant. Time never runs back: an earlier `to` only moves the boot clock on.
    pub fn advance(&mut self, to: Utc, boot: Mono) -> Result<(), PlantError> {
        if to > self.water_until() {
            return Err(PlantError::NoWater { until: self.water_until(), wanted: to });
        }
        let to = to.max(self.now);
        let passage = Passage { utc: (self.now, to), boot: (self.boot, boot.max(self.boot)) };
        while self.now < to {
            self.lapse_leases(&passage);
            let end = self.step_end(to, &passage);
            self.step(end);
            self.boot = passage.boot_at(end);
            self.arrive();
            self.turn_faults();
            if end == end.floor_to(self.config.record_every) {
                self.sample();
            }
        }
        self.boot = passage.boot.1;
        self.lapse_leases(&passage);
        Ok(())
    }

    /// Where the next step must end: at most its length, and at each instant where a rule changes.
    fn step_end(&self, to: Utc, passage: &Passage) -> Utc {
        let gate = &self.devices[0];
        let moving = gate.target != self.gate_share && !self.jammed();
        let active = moving
            || self.gate_share > 0.0
            || self.ports_m3_s > 0.0
            || self.spilling
            || self.pumps_run.contains(&true);
        let length = if active { STEP_ACTIVE } else { STEP_IDLE };
        let mut end = to.min(self.now + length);
        let mut cut = |at: Utc| {
            if at > self.now {
                end = end.min(at);
            }
        };
        cut((self.now + Span::micros(1)).ceil_to(self.config.record_every));
        for fault in &self.config.faults {
            cut(fault.window.start());
            cut(fault.window.end());
        }
        for lease in self.devices.iter().filter_map(|d| d.lease) {
            passage.utc_at(lease.end).into_iter().for_each(&mut cut);
        }
        if moving {
            let left_s = self.stroke.time_s(self.gate_share, gate.target);
            // One microsecond on, so that rounding cannot leave it a hair short of its target.
            cut(self.now + Span::from_seconds_f64(left_s) + Span::micros(1));
        }
        end
    }

    /// One explicit step with the flows as they are at its start.
    fn step(&mut self, end: Utc) {
        let dt_s = (end - self.now).as_seconds();
        let flows = self.flows();
        self.settle_ports(flows.gate, dt_s);
        // What is stored above the floor, and what comes in, is all that can leave in a step.
        let floor_m3 = self.config.storage.points()[0].1;
        let room_m3_s = (self.volume_m3 - floor_m3).max(0.0) / dt_s + flows.inflow;
        let ports = self.ports_m3_s.min(room_m3_s);
        self.ports_m3_s = ports;
        let spill = flows.spill.min((room_m3_s - ports).max(0.0));
        let (inflow_m3, released_m3) = (flows.inflow * dt_s, ports * dt_s);
        let spilled_m3 = spill * dt_s;
        self.volume_m3 += inflow_m3 - released_m3 - spilled_m3;
        self.totals.inflow_m3 += inflow_m3;
        self.totals.released_m3 += released_m3;
        self.totals.spilled_m3 += spilled_m3;
        self.totals.pump_kwh += flows.pump_kw * dt_s / 3_600.0;
        if (spill > 0.0) != self.spilling {
            self.spilling = spill > 0.0;
            let begun = self.spilling;
            self.event(if begun { EventKind::SpillBegun } else { EventKind::SpillEnded });
        }
        if !self.jammed() {
            self.gate_share = self.stroke.moved(self.gate_share, self.devices[0].target, dt_s);
        }
        self.now = end;
    }
    fn flows(&self) -> Flows {
        let standing = Standing {
            level_m: self.level_m(),
            outer_m: self.outer_m(),
            gate_share: self.gate_share,
            pumps_run: &self.pumps_run,
        };
        flows(&self.config, &self.outfall, self.now, &standing)
    }
    /// Flow at the ports follows the gate at once when it grows, and dies away no faster than
    /// drain-down allows when it falls.
    fn settle_ports(&mut self, gate_m3_s: f64, dt_s: f64) {
        let before = self.ports_m3_s;
        let drain_s = self.config.drain_down.as_seconds();
        let fall = if drain_s > 0.0 { self.release_peak_m3_s / drain_s * dt_s } else { before };
        self.ports_m3_s = gate_m3_s.max(before - fall).max(0.0);
        // Half a litre a second cannot be told from still water; the tail ends there.
        if gate_m3_s == 0.0 && self.ports_m3_s < 0.0005 {
            self.ports_m3_s = 0.0;
        }
        self.release_peak_m3_s = self.release_peak_m3_s.max(self.ports_m3_s);
        if (before > 0.0) != (self.ports_m3_s > 0.0) {
            let kind =
                if self.ports_m3_s > 0.0 { EventKind::PortsFlow } else { EventKind::PortsStill };
            self.event(kind);
            self.release_peak_m3_s = self.ports_m3_s;
        }
    }

    fn lapse_leases(&mut self, passage: &Passage) {
        for asset in 0..self.devices.len() {
            let device = &self.devices[asset];
            let Some(lease) = device.lease else { continue };
            if passage.utc_at(lease.end).is_none_or(|at| at > self.now) {
                continue;
            }
            let action = device.rest;
            let Lease { command, end } = lease;
            self.event(EventKind::LeaseOut { asset, command, lease_end: end });
            self.begin_rest(asset, action);
        }
    }
    fn begin_rest(&mut self, asset: usize, action: RestDo) {
        let position = self.position(asset);
        self.devices[asset].begin_rest(action, position);
        self.event(EventKind::RestBegun { asset, action });
        self.follow_pumps();
        self.arrive();
    }
    /// Notes the rests that are done, and lets protection look at the pumps.
    fn arrive(&mut self) {
        for asset in 1..self.devices.len() {
            if self.pumps_run[asset - 1] && self.gate_share < WAY_OPEN_SHARE {
                self.devices[asset].stand(0.0);
                self.event(EventKind::ProtectionStopped { asset, why: "the gate is shut" });
            }
        }
        self.follow_pumps();
        for asset in 0..self.devices.len() {
            if self.devices[asset].resting && self.position(asset) == self.devices[asset].target {
                self.devices[asset].resting = false;
                self.event(EventKind::RestDone { asset });
            }
        }
    }
    /// A pump starts and stops as it is told, at once.
    fn follow_pumps(&mut self) {
        for (run, device) in self.pumps_run.iter_mut().zip(&self.devices[1..]) {
            *run = device.target >= 0.5;
        }
    }
    /// Notes faults that begin or end now; a frozen signal keeps the value it has at that moment.
    fn turn_faults(&mut self) {
        for i in 0..self.config.faults.len() {
            let fault = self.config.faults[i];
            let on = fault.window.contains(self.now);
            if on == self.fault_on[i] {
                continue;
            }
            self.fault_on[i] = on;
            if let FaultKind::SignalFrozen(point) = fault.kind {
                self.frozen.retain(|f| f.0 != point);
                if on {
                    self.frozen.extend(self.fresh(point).map(|value| (point, value)));
                }
            }
            let kind = fault.kind;
            self.event(if on {
                EventKind::FaultBegun { kind }
            } else {
                EventKind::FaultEnded { kind }
            });
        }
    }
    fn jammed(&self) -> bool {
        let mut faults = self.config.faults.iter().zip(&self.fault_on);
        faults.any(|(f, on)| *on && f.kind == FaultKind::GateJam)
    }
    fn event(&mut self, kind: EventKind) {
        self.record.events.push(Event { utc: self.now, boot: self.boot, kind });
    }
    fn sample(&mut self) {
        let flows = self.flows();
        self.record.samples.push(Sample {
            utc: self.now,
            boot: self.boot,
            level_m: self.level_m(),
            volume_m3: self.volume_m3,
            outer_m: self.outer_m(),
            gate_percent: self.gate_percent(),
            pumps_run: self.pumps_run.clone(),
            ports_m3_s: self.ports_m3_s,
            spill_m3_s: flows.spill,
            inflow_m3_s: flows.inflow,
            totals: self.totals,
            current_m_s: self.config.water.current_m_s(self.now, self.config.truth.lag),
        });
    }
    /// Share of the stroke for the gate, 0 or 1 for a pump; 0 for an asset that is not there.
    fn position(&self, asset: usize) -> f64 {
        match asset {
            0 => self.gate_share,
            _ => self.pumps_run.get(asset - 1).map_or(0.0, |on| f64::from(*on)),
        }
    }
}

mod view;

#[cfg(test)]
mod tests;
