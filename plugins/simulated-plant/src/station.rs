//! The adapter's own view of the plant: its points, and each ask as a plain call. A plant that has
//! gone is found or started again, and the ask repeated once: each ask may be done twice.

use std::collections::BTreeMap;

use units::{Mono, Span};

use crate::SimulationError;
use crate::link::Link;
use crate::settings::Settings;
use crate::start::find_or_start;
use crate::wire::{Answer, Ask, Driven, Read, RestWord, Value};

/// Real time between two attempts to find or start a plant that has gone.
const RETRY_REAL: Span = Span::seconds(1);

pub(crate) struct Station {
    settings: Settings,
    link: Link,
    pub driven: Vec<Driven>,
    pub read: Vec<Read>,
    /// Not before this is a lost plant looked for again.
    retry_at: Mono,
    /// The latest command of each drivable point, so that a renewal by command finds its point.
    commands: BTreeMap<String, u64>,
}

/// What the device said to an order: done, or why not.
pub(crate) type Told = Result<(), String>;

impl Station {
    /// Finds or starts the plant and asks for its points.
    pub fn open(settings: Settings) -> Result<Self, SimulationError> {
        let mut link = find_or_start(&settings)?;
        match link.ask(&Ask::Points)? {
            Answer::Points { driven, read } => {
                let (retry_at, commands) = (Mono::ZERO, BTreeMap::new());
                Ok(Self { settings, link, driven, read, retry_at, commands })
            }
            other => Err(unexpected(&other)),
        }
    }
    pub const fn settings(&self) -> &Settings {
        &self.settings
    }
    pub fn drive(&mut self, point: &str, setting_percent: f64, command: u64, end_ns: u64) -> Told {
        let point = point.to_owned();
        let ask =
            Ask::Drive { point: point.clone(), setting_percent, command, lease_end_ns: end_ns };
        self.order(&ask)?;
        self.commands.insert(point, command);
        Ok(())
    }
    /// Refused unless this command is the one that drives its point, by us and by the device.
    pub fn renew(&mut self, command: u64, lease_end_ns: u64) -> Told {
        let found = self.commands.iter().find(|(_, c)| **c == command);
        let point = found.map(|(p, _)| p.clone());
        let point = point.ok_or_else(|| format!("command {command} drives nothing"))?;
        self.order(&Ask::Renew { point, command, lease_end_ns })
    }
    pub fn rest(&mut self, point: &str, action: RestWord, why: &str) -> Told {
        self.commands.remove(point);
        let action = Some(action);
        self.order(&Ask::Rest { point: point.to_owned(), action, why: why.to_owned() })
    }
    /// Everything that can be read now, stamped with simulated UTC in microseconds.
    pub fn sense(&mut self) -> Result<(i64, Vec<Value>), String> {
        match self.ask(&Ask::Sense).map_err(|e| e.to_string())? {
            Answer::Readings { at_us, list } => Ok((at_us, list)),
            other => Err(unexpected(&other).to_string()),
        }
    }
    /// Rests everything; the plant ends by itself once all is still.
    pub fn finish(&mut self) -> Told {
        self.order(&Ask::Finish)
    }
    fn order(&mut self, ask: &Ask) -> Told {
        match self.ask(ask).map_err(|e| e.to_string())? {
            Answer::Done => Ok(()),
            Answer::Refused { why } => Err(why),
            other => Err(unexpected(&other).to_string()),
        }
    }
    fn ask(&mut self, ask: &Ask) -> Result<Answer, SimulationError> {
        match self.link.ask(ask) {
            Err(SimulationError::Link(why)) => {
                let clock = &self.settings.clock;
                let now = clock.now().1;
                if now < self.retry_at {
                    return Err(SimulationError::Link(why));
                }
                self.retry_at = now + RETRY_REAL * i64::from(clock.speed);
                self.link = find_or_start(&self.settings)?;
                self.link.ask(ask)
            }
            other => other,
        }
    }
}

fn unexpected(answer: &Answer) -> SimulationError {
    SimulationError::Link(format!("an answer that fits no ask: {answer:?}"))
}
