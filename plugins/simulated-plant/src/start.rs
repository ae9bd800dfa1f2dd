//! Finds the plant, or starts it.

use std::fs::OpenOptions;
use std::io::{BufRead, BufReader};
use std::process::{Command, Stdio};
use std::thread;

use crate::SimulationError;
use crate::link::Link;
use crate::process::{READY, SOCKET};
use crate::settings::Settings;

/// What the plant has to say goes here, next to its record.
const LOG: &str = "plant.log";

/// A link to the plant; it is started if nobody answers at its socket.
pub(crate) fn find_or_start(settings: &Settings) -> Result<Link, SimulationError> {
    let socket = settings.folder.join(SOCKET);
    if let Ok(link) = Link::connect(&socket) {
        return Ok(link);
    }
    start(settings)?;
    Link::connect(&socket)
}

/// Starts the plant and waits until it says that its socket is open. It leads a session of its own
/// (see `process`), so it lives on when the adapter goes.
fn start(settings: &Settings) -> Result<(), SimulationError> {
    let folder = &settings.folder;
    std::fs::create_dir_all(folder).map_err(|e| SimulationError::file("making", folder, e))?;
    let log = OpenOptions::new().create(true).append(true).open(folder.join(LOG));
    let log = log.map_err(|e| SimulationError::file("opening the plant's log in", folder, e))?;
    let program = &settings.program;
    let mut child = Command::new(program)
        .args(&settings.args)
        .stdin(Stdio::null())
        .stdout(Stdio::piped())
        .stderr(log)
        .spawn()
        .map_err(|e| SimulationError::file("starting", program, e))?;
    let out = child.stdout.take().expect("its standard output is a pipe");
    let mut line = String::new();
    let said = BufReader::new(out).read_line(&mut line);
    // Somebody must take its exit status, or it stays in the process table until the adapter ends.
    thread::spawn(move || child.wait());
    if said.is_err() || line.trim_end() != READY {
        // It ended at once. If another adapter's plant was quicker, connecting finds that one; if
        // not, connecting fails and this line says where to look.
        eprintln!("the plant did not start; see {}", folder.join(LOG).display());
    }
    Ok(())
}
