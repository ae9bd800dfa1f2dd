//! Keeps the plant in step with simulated time, answers asks, and writes the record.

use std::path::Path;

use model::Site;
use plant::{Plant, PlantError, Point};
use units::{Mono, Utc};

use crate::ahead::{MARGIN, water_from};
use crate::lines::Lines;
use crate::resume::last_state;
use crate::wire::{Answer, Ask, Driven, Read, RestWord, Rests, Value};
use crate::works::{Names, plant_config};
use crate::{ClockMap, SimulationError};

/// The plant, its names and its record.
pub(crate) struct Keeper {
    site: Site,
    names: Names,
    plant: Plant,
    clock: ClockMap,
    lines: Lines,
    finishing: bool,
}

impl Keeper {
    /// Takes up the folder's record where it ends, or begins as the site file says.
    pub fn new(site: Site, folder: &Path, clock: ClockMap) -> Result<Self, SimulationError> {
        let names = Names::of(&site)?;
        for name in &names.without_source {
            eprintln!("signal {name} has no source in the simulated plant: it is never read");
        }
        let (now, _) = clock.now();
        let last = last_state(folder, now);
        let start = last.map_or(now, |l| l.0);
        let water = water_from(&site, start)?;
        let times = (start, clock.boot_at(start));
        let config = plant_config(&site, &names, times, last.map(|l| l.1), water)?;
        let file = |e| SimulationError::file("writing the plant's record in", folder, e);
        let mut lines = Lines::append(folder).map_err(file)?;
        lines.begin(&config.truth, last.is_some()).map_err(file)?;
        let plant = Plant::new(config)?;
        let mut keeper = Self { site, names, plant, clock, lines, finishing: false };
        // Power is back: whatever was left open has no lease any more.
        for asset in 0..keeper.names.assets.len() {
            keeper.plant.rest(asset, "the plant has started")?;
        }
        keeper.catch_up(folder)?;
        Ok(keeper)
    }
    /// Moves the plant on to the clock's now, and writes down what happened on the way.
    pub fn catch_up(&mut self, folder: &Path) -> Result<(), SimulationError> {
        let (to, boot) = self.clock.now();
        while self.plant.now() < to {
            if self.plant.water_until() < to + MARGIN {
                let later = water_from(&self.site, self.plant.now())?;
                self.plant.replace_water(later);
                if self.plant.water_until() <= self.plant.now() {
                    let until = self.plant.water_until();
                    return Err(SimulationError::Water(format!("it ends at {until}")));
                }
            }
            let part = to.min(self.plant.water_until());
            let boot_then = if part == to { boot } else { self.clock.boot_at(part) };
            self.plant.advance(part, boot_then)?;
        }
        let record = self.plant.take_record();
        let written = self.lines.write(&record, &self.names);
        written.map_err(|e| SimulationError::file("writing the plant's record in", folder, e))
    }
    /// Somebody new needs the plant: it does not end yet.
    pub const fn stay(&mut self) {
        self.finishing = false;
    }
    pub const fn finishing(&self) -> bool {
        self.finishing
    }
    pub fn is_quiet(&self) -> bool {
        self.plant.is_quiet()
    }
    /// Answers at the plant's present, which the caller has brought up to the clock.
    pub fn answer(&mut self, ask: &Ask) -> Answer {
        let told = match ask {
            Ask::Points => return self.points(),
            Ask::Sense => return self.readings(),
            Ask::Drive { point, setting_percent, command, lease_end_ns } => {
                self.finishing = false;
                let end = Mono::from_nanos(*lease_end_ns);
                self.told(point, |p, n| p.drive_as(*command, n, *setting_percent, end))
            }
            Ask::Renew { point, command, lease_end_ns } => {
                let end = Mono::from_nanos(*lease_end_ns);
                self.told(point, |p, n| p.renew_as(*command, n, end))
            }
            Ask::Rest { point, action, why } => self.told(point, |p, n| match action {
                None => p.rest(n, why),
                Some(word) => p.rest_as(n, word.into_do(), why),
            }),
            Ask::Local { point, local } => self.told(point, |p, n| p.set_local(n, *local)),
            Ask::Finish => self.finish(),
        };
        told.map_or_else(|why| Answer::Refused { why }, |()| Answer::Done)
    }
    fn told(
        &mut self,
        point: &str,
        act: impl FnOnce(&mut Plant, usize) -> Result<(), PlantError>,
    ) -> Result<(), String> {
        let asset = self.names.asset(point);
        let asset = asset.ok_or_else(|| format!("the plant has no drivable point {point:?}"))?;
        act(&mut self.plant, asset).map_err(|e| e.to_string())
    }
    /// An asset in local control stays with its person; that does not stop the finish.
    fn finish(&mut self) -> Result<(), String> {
        self.finishing = true;
        for asset in 0..self.names.assets.len() {
            match self.plant.rest(asset, "finish") {
                Ok(()) | Err(PlantError::InLocal { .. }) => {}
                Err(e) => return Err(e.to_string()),
            }
        }
        Ok(())
    }
    fn points(&self) -> Answer {
        let driven = self.names.assets.iter().map(|a| Driven {
            point: a.point.clone(),
            gate: a.gate,
            rest: Rests {
                lease_out: RestWord::of(a.rest.lease_out),
                input_end: RestWord::of(a.rest.input_end),
                trip: RestWord::of(a.rest.trip),
                stop: RestWord::of(a.rest.stop),
            },
        });
        let read = self.names.signals.iter().map(|s| Read {
            point: s.point.clone(),
            unit: s.unit.clone(),
            min: s.value_min,
            max: s.value_max,
        });
        Answer::Points { driven: driven.collect(), read: read.collect() }
    }
    fn readings(&self) -> Answer {
        let now: plant::PlantReadings = self.plant.sense();
        let list = self.names.signals.iter().filter_map(|s| {
            let value = now.get(s.reads)?;
            Some(Value { point: s.point.clone(), value: printed(s.reads, value) })
        });
        Answer::Readings { at_us: Utc::as_micros(now.at), list: list.collect() }
    }
}

/// As a transmitter gives it: four decimals; what the site file fixed stays as it stands there.
fn printed(point: Point, value: f64) -> f64 {
    if matches!(point, Point::Constant(_)) { value } else { (value * 1e4).round() / 1e4 }
}
