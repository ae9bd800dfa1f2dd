//! What the sensors say: the truth with noise, or a fault of a sensor.

use units::Utc;

use crate::{FaultKind, Plant};

/// Something that can be read.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Debug)]
pub enum Point {
    /// Storage level, m, by sensor 0 or 1.
    Level(u8),
    /// Flow at the ports by the meter, m3/s.
    Outflow,
    /// Percent.
    GatePosition,
    /// Level outside, m.
    Outer,
    /// Level at the reference port, m.
    Port,
    /// 100 while pump n (an asset number, 1 and up) runs, else 0.
    PumpRuns(u8),
    /// 1 while the local panel has asset n, else 0.
    Local(u8),
    /// Entry n of the configuration's constants.
    Constant(u16),
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Sensed {
    pub point: Point,
    pub value: f64,
}

/// Everything that could be read at one instant; a missing signal is absent.
#[derive(Clone, PartialEq, Debug)]
pub struct PlantReadings {
    pub at: Utc,
    pub list: Vec<Sensed>,
}

impl PlantReadings {
    pub fn get(&self, point: Point) -> Option<f64> {
        self.list.iter().find(|s| s.point == point).map(|s| s.value)
    }
}

/// Noise of the outfall meter as a share of the flow, and of the outer gauge (waves) in m.
const METER_NOISE: f64 = 0.002;
const OUTER_NOISE_M: f64 = 0.01;

impl Plant {
    /// Reads everything now. Reading changes nothing: noise is a function of seed and instant.
    pub fn sense(&self) -> PlantReadings {
        let values = self.points().into_iter().filter_map(|point| {
            let value = self.sensed(point)?;
            Some(Sensed { point, value })
        });
        PlantReadings { at: self.now(), list: values.collect() }
    }
    /// Every point that this plant has.
    pub fn points(&self) -> Vec<Point> {
        let config = self.config();
        let mut all = vec![Point::Level(0), Point::Level(1), Point::Outflow, Point::GatePosition];
        all.push(Point::Outer);
        all.extend(config.water.port.as_ref().map(|_| Point::Port));
        all.extend((1..=config.pumps.len()).map(|n| Point::PumpRuns(n as u8)));
        all.extend((0..=config.pumps.len()).map(|n| Point::Local(n as u8)));
        all.extend((0..config.constants.len()).map(|n| Point::Constant(n as u16)));
        all
    }
    fn sensed(&self, point: Point) -> Option<f64> {
        let t = self.now();
        let mut active = self.config().faults.iter().filter(|f| f.window.contains(t));
        if active.any(|f| f.kind == FaultKind::SignalMissing(point)) {
            return None;
        }
        let frozen = self.frozen().iter().find(|f| f.0 == point);
        frozen.map_or_else(|| self.fresh(point), |f| Some(f.1))
    }
    /// What a healthy sensor says now.
    pub(crate) fn fresh(&self, point: Point) -> Option<f64> {
        let (t, truth) = (self.now(), &self.config().truth);
        Some(match point {
            Point::Level(n) => {
                let offset = truth.level_offset_m.get(usize::from(n))?;
                self.level_m() + offset + truth.level_noise_m * truth.noise(u64::from(n), t)
            }
            Point::Outflow => {
                let noise = if truth.level_noise_m > 0.0 { METER_NOISE } else { 0.0 };
                self.ports_m3_s() * truth.meter_factor * (1.0 + noise * truth.noise(8, t))
            }
            Point::GatePosition => self.gate_percent(),
            Point::Outer => {
                let noise = if truth.level_noise_m > 0.0 { OUTER_NOISE_M } else { 0.0 };
                self.outer_m() + noise * truth.noise(9, t)
            }
            Point::Port => self.config().water.port_m(t)?,
            Point::PumpRuns(n) => f64::from(self.pump_runs(usize::from(n))?) * 100.0,
            Point::Local(n) => f64::from(self.is_local(usize::from(n))?),
            Point::Constant(n) => *self.config().constants.get(usize::from(n))?,
        })
    }
}
