//! The plant process: one folder, one socket, one record.

use std::fs::{self, File};
use std::io::Write;
use std::os::unix::net::UnixListener;
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, RecvTimeoutError};
use std::time::Duration;

use rustix::fs::{FlockOperation, flock};
use units::Span;

use crate::keeper::Keeper;
use crate::socket::{Arrival, listen};
use crate::{ClockMap, SimulationError};

/// The socket's name in the plant's folder.
pub const SOCKET: &str = "plant.socket";
const LOCK: &str = "plant.lock";

/// Real time between two turns of a plant that nobody asks anything.
const TURN: Duration = Duration::from_millis(50);
/// What the plant says on standard output once its socket is open.
pub(crate) const READY: &str = "the simulated plant is ready";
/// Real time that a connection has to read its last answer in.
const SEE_OFF: Duration = Duration::from_secs(1);
/// Real time without any connection after which it ends, once all is still.
const ALONE_MAX: Duration = Duration::from_secs(120);
/// Real time without any connection after which it ends even if something is stuck.
const STUCK_MAX: Duration = Duration::from_secs(3_600);
/// Simulated time that a finish may take: nothing that is free to move strokes for longer.
const FINISH_MAX: Span = Span::hours(1);

#[derive(Clone, PartialEq, Eq, Debug)]
pub struct PlantArgs {
    /// The site file or its folder.
    pub site: PathBuf,
    /// Where socket and record live; made if it is not there.
    pub folder: PathBuf,
    pub clock: ClockMap,
}

/// Runs the plant until it is told to finish, or until nobody has been connected for two minutes
/// of real time and everything is at rest. A second plant in the same folder is refused.
pub fn run_plant(args: &PlantArgs) -> Result<(), SimulationError> {
    let folder = &args.folder;
    // A session of its own, so that what ends the adapter's group does not end the plant. Refused
    // where this process leads one already, and then there is nothing to leave.
    let _ = rustix::process::setsid();
    fs::create_dir_all(folder).map_err(|e| SimulationError::file("making", folder, e))?;
    let lock = File::create(folder.join(LOCK));
    let lock = lock.map_err(|e| SimulationError::file("opening the lock in", folder, e))?;
    flock(&lock, FlockOperation::NonBlockingLockExclusive)
        .map_err(|_| SimulationError::AlreadyRunning(folder.clone()))?;
    let site = site::load(&args.site).map_err(|r| SimulationError::Site(Box::new(r)))?;
    let mut keeper = Keeper::new(site, folder, args.clock)?;
    let arrivals = open(folder)?;
    say_ready(folder)?;
    let ended = turn(&mut keeper, &arrivals, args);
    see_off(&arrivals);
    // Best effort: a socket left behind is taken over by the next plant anyway.
    let _ = fs::remove_file(folder.join(SOCKET));
    ended
}

/// One line for whoever started the plant and waits for its socket. Nothing else is ever written
/// there, so that it may close its end.
fn say_ready(folder: &Path) -> Result<(), SimulationError> {
    let mut out = std::io::stdout();
    match writeln!(out, "{READY}").and_then(|()| out.flush()) {
        // The starter is gone already; the plant is there for the next one.
        Err(e) if e.kind() == std::io::ErrorKind::BrokenPipe => Ok(()),
        other => other.map_err(|e| SimulationError::file("reporting from", folder, e)),
    }
}

/// Lets the last answers be read: until every connection has gone, for a second at most.
fn see_off(arrivals: &Receiver<Arrival>) {
    while let Ok(arrival) = arrivals.recv_timeout(SEE_OFF) {
        if matches!(arrival, Arrival::Left) {
            return;
        }
    }
}

/// The lock is ours, so a socket that lies there is a dead plant's.
fn open(folder: &Path) -> Result<Receiver<Arrival>, SimulationError> {
    let path = folder.join(SOCKET);
    let bad = |e| SimulationError::file("listening at", &path, e);
    match fs::remove_file(&path) {
        Err(e) if e.kind() != std::io::ErrorKind::NotFound => return Err(bad(e)),
        _ => {}
    }
    let listener = UnixListener::bind(&path).map_err(bad)?;
    listen(listener).map_err(bad)
}

fn turn(
    keeper: &mut Keeper,
    arrivals: &Receiver<Arrival>,
    args: &PlantArgs,
) -> Result<(), SimulationError> {
    let real = ClockMap::real();
    let (mut connected, mut alone_since) = (0_usize, real.now().1);
    let mut finish_by = None;
    loop {
        let arrival = arrivals.recv_timeout(TURN);
        keeper.catch_up(&args.folder)?;
        match arrival {
            Ok(Arrival::Joined) => {
                connected += 1;
                keeper.stay();
            }
            Ok(Arrival::Left) => {
                connected -= 1;
                alone_since = real.now().1;
            }
            Ok(Arrival::Asked { ask, reply }) => {
                let answer = keeper.answer(&ask);
                // The record holds what was asked before the asker knows that it was heard.
                keeper.catch_up(&args.folder)?;
                let _ = reply.send(answer);
            }
            Err(RecvTimeoutError::Timeout) => {}
            Err(RecvTimeoutError::Disconnected) => return Ok(()),
        }
        let boot = args.clock.now().1;
        finish_by = keeper.finishing().then(|| finish_by.unwrap_or(boot + FINISH_MAX));
        if finish_by.is_some_and(|by| keeper.is_quiet() || boot >= by) {
            return Ok(());
        }
        let alone = if connected == 0 { real.now().1.since(alone_since) } else { Span::ZERO };
        let alone = Duration::from_micros(alone.as_micros().unsigned_abs());
        if alone > STUCK_MAX || (alone > ALONE_MAX && keeper.is_quiet()) {
            return Ok(());
        }
    }
}
