//! The adapter process: the adapter protocol on one side, the plant's socket on the other. It holds
//! no lease and decides nothing: the device does the first, the daemon the second.

use std::cell::RefCell;
use std::fs::OpenOptions;
use std::io::Write;
use std::rc::Rc;

use sdk::protocol::{
    Anchor, Drive, Introduce, Introduced, LeaseHolder, Point, PointKind, Quality, Reading,
    RestAction, RestCause, RestSet, Severity, Trouble, feature,
};
use sdk::{Adapter, BootClock, Outbox};
use units::{Mono, Span};

use crate::SimulationError;
use crate::settings::Settings;
use crate::station::Station;
use crate::wire::{Driven, Read, RestWord, Value};

/// Real time between two sets of readings at least, however fast the clock runs.
const SENSE_REAL_MIN: Span = Span::millis(20);
/// Shortest lease that the device can keep, simulated: one second of its own timer.
const LEASE_SHORTEST_MS: u64 = 1_000;

/// Runs the adapter on standard input and output until the daemon says finish, or goes away.
///
/// After `finish` it tells the plant to end once all is still. When its input just ends, the daemon
/// may have died: then everything is brought to rest and the plant stays for the next adapter.
pub fn run_adapter() -> Result<(), SimulationError> {
    let desk = Rc::new(RefCell::new(Desk::default()));
    sdk::run(Bridge { desk: Rc::clone(&desk) }).map_err(SimulationError::Sdk)?;
    let mut desk = desk.borrow_mut();
    let finished = desk.last_rest == Some(RestCause::Stop);
    match desk.station.as_mut() {
        Some(station) if finished => station.finish().map_err(SimulationError::Link),
        _ => Ok(()),
    }
}

/// What the loop's adapter and the end of the run share.
#[derive(Default)]
struct Desk {
    station: Option<Station>,
    last_rest: Option<RestCause>,
    next_sense: Mono,
    sequence: u64,
    troubles: Vec<Trouble>,
}

struct Bridge {
    desk: Rc<RefCell<Desk>>,
}

impl Adapter for Bridge {
    fn introduce(&mut self, introduce: &Introduce, _: BootClock) -> Result<Introduced, String> {
        let chain = |e: SimulationError| {
            let lower = std::error::Error::source(&e).map(|s| format!(": {s}"));
            format!("{e}{}", lower.unwrap_or_default())
        };
        let settings = Settings::read(&introduce.settings).map_err(chain)?;
        let station = Station::open(settings).map_err(chain)?;
        let points = points(&station.driven, &station.read);
        self.desk.borrow_mut().station = Some(station);
        Ok(Introduced {
            name: "simulated-plant".to_owned(),
            version: env!("CARGO_PKG_VERSION").to_owned(),
            points,
            features: vec![feature::ANCHORS.to_owned()],
        })
    }
    fn drive(&mut self, d: &Drive) -> Result<(), String> {
        let mut desk = self.desk.borrow_mut();
        let station = desk.station.as_mut().ok_or("there is no plant")?;
        station.drive(&d.point, d.setpoint, d.command, d.expires_boottime_ns)
    }
    fn renew(&mut self, command: u64, expires_boottime_ns: u64) {
        let mut desk = self.desk.borrow_mut();
        let Some(station) = desk.station.as_mut() else { return };
        if let Err(why) = station.renew(command, expires_boottime_ns) {
            desk.trouble(None, format!("a renewal was refused: {why}"));
        }
    }
    fn rest(&mut self, point: &str, action: RestAction, cause: RestCause) {
        let mut desk = self.desk.borrow_mut();
        desk.last_rest = Some(cause);
        let Some(station) = desk.station.as_mut() else { return };
        if let Err(why) = station.rest(point, rest_word(action), cause_words(cause)) {
            desk.trouble(Some(point), format!("it could not be sent to rest: {why}"));
        }
    }
    fn sense(&mut self, points: &[String]) -> Vec<Reading> {
        let mut readings = self.desk.borrow_mut().readings();
        readings.retain(|r| points.contains(&r.point));
        readings
    }
    /// Into the plant's own folder, which the daemon never touches.
    fn anchored(&mut self, anchor: &Anchor) {
        let mut desk = self.desk.borrow_mut();
        let Some(station) = desk.station.as_ref() else { return };
        let file = station.settings().folder.join("anchors");
        let line = format!("{} {}\n", anchor.site, anchor.anchor);
        let kept = OpenOptions::new().create(true).append(true).open(&file);
        if let Err(e) = kept.and_then(|mut f| f.write_all(line.as_bytes())) {
            desk.trouble(None, format!("an anchor could not be kept in {}: {e}", file.display()));
        }
    }
    fn tick(&mut self, out: &mut Outbox) {
        let mut desk = self.desk.borrow_mut();
        if desk.is_due() {
            out.readings = desk.readings();
        }
        out.troubles.append(&mut desk.troubles);
    }
}

impl Desk {
    /// Whether it is time for readings; if so, notes when the next are due.
    fn is_due(&mut self) -> bool {
        let Some(station) = &self.station else { return false };
        let settings = station.settings();
        let now = settings.clock.now().1;
        if now < self.next_sense {
            return false;
        }
        let least = SENSE_REAL_MIN * i64::from(settings.clock.speed);
        self.next_sense = now + settings.sense_every.max(least);
        true
    }
    fn readings(&mut self) -> Vec<Reading> {
        let Some(station) = &mut self.station else { return Vec::new() };
        match station.sense() {
            Ok((time_utc_us, list)) => {
                self.sequence += 1;
                let sequence = self.sequence;
                let reading = |v: Value| Reading {
                    point: v.point,
                    value: v.value,
                    quality: Quality::Good,
                    time_utc_us,
                    sequence,
                };
                list.into_iter().map(reading).collect()
            }
            Err(why) => {
                self.trouble(None, format!("the plant cannot be read: {why}"));
                Vec::new()
            }
        }
    }
    fn trouble(&mut self, point: Option<&str>, words: String) {
        let point = point.map(str::to_owned);
        self.troubles.push(Trouble { point, severity: Severity::Warning, words });
    }
}

/// Drivable points first, then those that can be read; a point that is both appears once.
fn points(driven: &[Driven], read: &[Read]) -> Vec<Point> {
    let drivable = driven.iter().map(|d| Point {
        id: d.point.clone(),
        kind: if d.gate { PointKind::Position } else { PointKind::Run },
        unit: "%".to_owned(),
        min: 0.0,
        max: 100.0,
        readable: read.iter().any(|r| r.point == d.point),
        drivable: true,
        lease_holder: Some(LeaseHolder::Device),
        lease_shortest_ms: Some(LEASE_SHORTEST_MS),
        rest: Some(RestSet {
            lease_out: rest_action(d.rest.lease_out),
            input_end: rest_action(d.rest.input_end),
            trip: rest_action(d.rest.trip),
            stop: rest_action(d.rest.stop),
        }),
    });
    let alone = read.iter().filter(|r| driven.iter().all(|d| d.point != r.point));
    let readable = alone.map(|r| Point {
        id: r.point.clone(),
        kind: kind_of(&r.unit),
        unit: r.unit.clone(),
        min: r.min,
        max: r.max,
        readable: true,
        drivable: false,
        lease_holder: None,
        lease_shortest_ms: None,
        rest: None,
    });
    drivable.chain(readable).collect()
}

fn kind_of(unit: &str) -> PointKind {
    match unit {
        "m" => PointKind::Level,
        "m3/s" => PointKind::Flow,
        "%" => PointKind::Position,
        "flag" => PointKind::Flag,
        _ => PointKind::Value,
    }
}

const fn rest_word(action: RestAction) -> RestWord {
    match action {
        RestAction::Close => RestWord::Close,
        RestAction::Open => RestWord::Open,
        RestAction::Stop => RestWord::Stop,
        RestAction::Hold => RestWord::Hold,
        RestAction::HandToLocal => RestWord::HandToLocal,
    }
}

const fn rest_action(word: RestWord) -> RestAction {
    match word {
        RestWord::Close => RestAction::Close,
        RestWord::Open => RestAction::Open,
        RestWord::Stop => RestAction::Stop,
        RestWord::Hold => RestAction::Hold,
        RestWord::HandToLocal => RestAction::HandToLocal,
    }
}

const fn cause_words(cause: RestCause) -> &'static str {
    match cause {
        RestCause::LeaseOut => "lease out",
        RestCause::InputEnd => "end of the adapter's input",
        RestCause::Trip => "trip",
        RestCause::Stop => "stop",
    }
}
