//! The adapter's process and the threads that read from it.

use std::io::{BufRead, BufReader, Read, Write};
use std::os::unix::process::CommandExt;
use std::process::{Child, ChildStdin, Command, Stdio};
use std::sync::mpsc::SyncSender;
use std::thread;

use protocol::LINE_MAX;
use rustix::process::{Pid, Signal, kill_process_group};

use crate::host_::{AdapterSpec, Events, HostEvent};
use crate::supervisor::Work;

/// A running adapter; dropping it kills its whole process group.
pub(crate) struct Running {
    child: Child,
    stdin: ChildStdin,
}

/// Longest line of an adapter's log that is passed on.
const LOG_LINE_MAX: u64 = 1024;

impl Running {
    /// Starts the program with an environment of its own, in a group of its own. `life` marks what
    /// it says, so that nothing of a dead one is taken for a word of its successor.
    pub(crate) fn start(
        spec: &AdapterSpec,
        life: u64,
        work: &SyncSender<Work>,
        events: &Events,
    ) -> std::io::Result<Self> {
        let mut child = Command::new(&spec.program)
            .args(&spec.args)
            .env_clear()
            .env("PATH", "/usr/local/bin:/usr/bin:/bin")
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .process_group(0)
            .spawn()?;
        let missing = || std::io::Error::other("a pipe to the adapter is missing");
        let stdin = child.stdin.take().ok_or_else(missing)?;
        let stdout = child.stdout.take().ok_or_else(missing)?;
        let stderr = child.stderr.take().ok_or_else(missing)?;
        let running = Self { child, stdin };
        let lines = work.clone();
        thread::Builder::new()
            .name(format!("{}-out", spec.name))
            .spawn(move || read_lines(stdout, life, &lines))?;
        let (events, adapter) = (events.clone(), spec.id);
        thread::Builder::new()
            .name(format!("{}-err", spec.name))
            .spawn(move || read_log(stderr, adapter, &events))?;
        Ok(running)
    }
    pub(crate) fn write(&mut self, line: &str) -> std::io::Result<()> {
        self.stdin.write_all(line.as_bytes())?;
        self.stdin.flush()
    }
    /// Whether it has ended by itself.
    pub(crate) fn ended(&mut self) -> Option<String> {
        match self.child.try_wait() {
            Ok(Some(status)) => Some(format!("it ended: {status}")),
            Ok(None) => None,
            Err(e) => Some(format!("its state cannot be read: {e}")),
        }
    }
}

impl Drop for Running {
    fn drop(&mut self) {
        if let Ok(raw) = i32::try_from(self.child.id())
            && let Some(group) = Pid::from_raw(raw)
        {
            // It may be gone already; then there is nothing to kill.
            let _ = kill_process_group(group, Signal::KILL);
        }
        let _ = self.child.wait();
    }
}

/// Lines of standard output, at most one protocol line each; the end is told too.
fn read_lines(out: impl Read, life: u64, to: &SyncSender<Work>) {
    let mut reader = BufReader::new(out);
    loop {
        let mut line = Vec::new();
        let limit = LINE_MAX as u64 + 1;
        let read = reader.by_ref().take(limit).read_until(b'\n', &mut line);
        let item = match read {
            Ok(n) if n > 0 && line.ends_with(b"\n") => Work::Said { life, line },
            Ok(n) if n > LINE_MAX => {
                let why = format!("a line of more than {LINE_MAX} bytes");
                let _ = to.send(Work::Gone { life, why });
                return;
            }
            _ => {
                let why = "the end of its output".to_owned();
                let _ = to.send(Work::Gone { life, why });
                return;
            }
        };
        if to.send(item).is_err() {
            return;
        }
    }
}

/// Its log: read always, so that it never blocks; long lines are cut.
fn read_log(err: impl Read, adapter: u16, events: &Events) {
    let mut reader = BufReader::new(err);
    loop {
        let mut line = Vec::new();
        match reader.by_ref().take(LOG_LINE_MAX).read_until(b'\n', &mut line) {
            Ok(0) | Err(_) => return,
            Ok(_) => {}
        }
        let text = String::from_utf8_lossy(&line).trim_end().to_owned();
        events(HostEvent::Log { adapter, text });
    }
}
