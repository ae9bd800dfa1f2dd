//! The control socket: one JSON line in, one out. Mode 0660; the peer's identity is recorded.

use std::fs;
use std::io::{BufRead, BufReader, Read, Write};
use std::os::unix::fs::PermissionsExt;
use std::os::unix::net::{UnixListener, UnixStream};
use std::path::Path;
use std::sync::mpsc::{Sender, SyncSender, sync_channel};
use std::thread;
use std::time::Duration;

use anyhow::{Context, Result, anyhow, bail};
use serde::{Deserialize, Serialize};
use serde_json::Value;

/// Longest line, as in the adapter protocol.
const LINE_MAX: u64 = 64 * 1024;
/// Longest wait for the daemon's loop, or for a peer to finish its line.
const WAIT: Duration = Duration::from_secs(10);
/// The same for what the journal does in its own time: a large backup, say.
const WAIT_KEEP: Duration = Duration::from_secs(900);

#[derive(Serialize, Deserialize, Clone, Debug)]
#[serde(tag = "ask", rename_all = "kebab-case", deny_unknown_fields)]
pub enum Request {
    Now,
    Plan,
    Why {
        asset: String,
        at: Option<String>,
    },
    Rows {
        from: u64,
        limit: u64,
    },
    /// How far the view is, and the evidence.
    View,
    Act {
        by: String,
        reason: String,
        act: ActRequest,
    },
    Keep(KeepRequest),
}

impl Request {
    const fn wait(&self) -> Duration {
        match self {
            Self::Keep(_) => WAIT_KEEP,
            _ => WAIT,
        }
    }
}

/// What a person may ask of the journal. Days count from 1970-01-01, UTC.
#[derive(Serialize, Deserialize, Clone, Debug)]
#[serde(tag = "keep", rename_all = "kebab-case", deny_unknown_fields)]
pub enum KeepRequest {
    Seal,
    Anchor,
    Backup,
    Verify,
    Hold { from_day: i32, to_day: i32, by: String, reason: String },
    Lift { from_day: i32, to_day: i32, by: String, reason: String },
}

#[derive(Serialize, Deserialize, Clone, Debug)]
#[serde(tag = "do", rename_all = "kebab-case", deny_unknown_fields)]
pub enum ActRequest {
    Mode { mode: String },
    Authorise { until: String },
    Confirm { asset: String },
    Hold { asset: String, until: String },
    Hand { asset: String, setting_percent: f64, until: String },
    Auto { asset: String },
    OutOfService { asset: String, clear: bool },
    Reset { asset: Option<String> },
    Rest { asset: Option<String> },
    TrustClock,
}

#[derive(Serialize, Deserialize, Clone, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum Response {
    Ok(Value),
    Refused(String),
}

/// A request on its way to the daemon's loop, with where the answer goes.
#[derive(Debug)]
pub struct Asked {
    pub request: Request,
    pub peer: String,
    pub reply: SyncSender<Response>,
}

/// Listens for as long as the process lives; each connection is one question.
pub fn listen<T: From<Asked> + Send + 'static>(path: &Path, to: Sender<T>) -> Result<()> {
    if UnixStream::connect(path).is_ok() {
        bail!("{} is answered by another daemon: only one may run a site", path.display());
    }
    match fs::remove_file(path) {
        Err(e) if e.kind() != std::io::ErrorKind::NotFound => {
            return Err(e).with_context(|| format!("removing the old socket {}", path.display()));
        }
        _ => {}
    }
    let listener =
        UnixListener::bind(path).with_context(|| format!("listening on {}", path.display()))?;
    fs::set_permissions(path, fs::Permissions::from_mode(0o660))
        .with_context(|| format!("setting the mode of {}", path.display()))?;
    thread::Builder::new().name("control".to_owned()).spawn(move || {
        for stream in listener.incoming().flatten() {
            let to = to.clone();
            let spawned = thread::Builder::new()
                .name("control-peer".to_owned())
                .spawn(move || serve(stream, &to));
            if let Err(e) = spawned {
                tracing::warn!(error = %e, "a control connection could not be served");
            }
        }
    })?;
    Ok(())
}

fn serve<T: From<Asked>>(stream: UnixStream, to: &Sender<T>) {
    let response = asked(&stream, to).unwrap_or_else(|e| Response::Refused(format!("{e:#}")));
    let line = serde_json::to_string(&response).unwrap_or_default() + "\n";
    // A peer that has gone away needs no answer.
    let _ = (&stream).write_all(line.as_bytes());
}

fn asked<T: From<Asked>>(stream: &UnixStream, to: &Sender<T>) -> Result<Response> {
    stream.set_read_timeout(Some(WAIT))?;
    stream.set_write_timeout(Some(WAIT))?;
    let cred = rustix::net::sockopt::socket_peercred(stream)?;
    let peer = format!("uid {} pid {}", cred.uid.as_raw(), cred.pid.as_raw_nonzero());
    let mut line = String::new();
    BufReader::new(stream.take(LINE_MAX)).read_line(&mut line)?;
    let request: Request = serde_json::from_str(&line).context("this is no request")?;
    let wait = request.wait();
    let (reply, answer) = sync_channel(1);
    to.send(T::from(Asked { request, peer, reply })).map_err(|_| anyhow!("stopping"))?;
    answer.recv_timeout(wait).context("the daemon did not answer in time")
}

/// Asks the daemon that listens at `path`. `None` if none does.
pub fn ask(path: &Path, request: &Request) -> Result<Option<Response>> {
    let Ok(mut stream) = UnixStream::connect(path) else { return Ok(None) };
    stream.set_read_timeout(Some(request.wait() * 2))?;
    stream.write_all((serde_json::to_string(request)? + "\n").as_bytes())?;
    let mut line = String::new();
    BufReader::new(stream).read_line(&mut line)?;
    let response = serde_json::from_str(&line).context("the daemon's answer is no JSON")?;
    Ok(Some(response))
}
