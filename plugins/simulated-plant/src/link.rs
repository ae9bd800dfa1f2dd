//! The adapter's end of the line to the plant.

use std::io::{BufRead, BufReader, Read, Write};
use std::os::unix::net::UnixStream;
use std::path::Path;
use std::time::Duration;

use crate::SimulationError;
use crate::wire::{Answer, Ask, LINE_MAX};

/// A plant answers at once; one that does not is as good as dead.
const ANSWER_MAX: Duration = Duration::from_secs(10);

pub(crate) struct Link {
    input: BufReader<UnixStream>,
    out: UnixStream,
}

impl Link {
    pub fn connect(socket: &Path) -> Result<Self, SimulationError> {
        let bad = |e| SimulationError::file("connecting to", socket, e);
        let out = UnixStream::connect(socket).map_err(bad)?;
        out.set_read_timeout(Some(ANSWER_MAX)).map_err(bad)?;
        out.set_write_timeout(Some(ANSWER_MAX)).map_err(bad)?;
        let input = BufReader::new(out.try_clone().map_err(bad)?);
        Ok(Self { input, out })
    }
    /// One ask, one answer.
    pub fn ask(&mut self, ask: &Ask) -> Result<Answer, SimulationError> {
        let bad = |e: &dyn std::fmt::Display| SimulationError::Link(e.to_string());
        let mut text = serde_json::to_vec(ask).map_err(|e| bad(&e))?;
        text.push(b'\n');
        self.out.write_all(&text).map_err(|e| bad(&e))?;
        let mut line = Vec::new();
        self.input.by_ref().take(LINE_MAX).read_until(b'\n', &mut line).map_err(|e| bad(&e))?;
        if line.is_empty() {
            return Err(SimulationError::Link("the plant has gone".to_owned()));
        }
        serde_json::from_slice(&line).map_err(|e| bad(&e))
    }
}
