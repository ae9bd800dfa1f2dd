//! The author's loop.

use std::io::{BufRead, BufReader, Read, Write};
use std::sync::mpsc::{Receiver, RecvTimeoutError, SyncSender, sync_channel};
use std::thread;
use std::time::Duration;

use protocol::{
    Anchor, Code, Drive, Introduce, Introduced, LINE_MAX, Message, Reading, Renew, Rest,
    RestAction, RestCause, RpcError, Sense, Sensed, Trouble, VERSION, answer, failure, method,
    notification, parse,
};
use serde_json::Value;

use crate::clock::BootClock;
use crate::rules::Rules;

/// What an author writes. Every call is from one thread, in order.
pub trait Adapter {
    /// The equipment's points, by the settings of the site file. An error ends the adapter.
    fn introduce(&mut self, introduce: &Introduce, clock: BootClock) -> Result<Introduced, String>;
    /// Point known, drivable, setpoint in range, lease ahead: carry it out, or say why not.
    fn drive(&mut self, drive: &Drive) -> Result<(), String>;
    /// The lease of a command goes on; an adapter that holds leases itself need do nothing.
    fn renew(&mut self, command: u64, expires_boottime_ns: u64);
    /// To rest, now.
    fn rest(&mut self, point: &str, action: RestAction, cause: RestCause);
    fn sense(&mut self, points: &[String]) -> Vec<Reading>;
    /// Where the record's chain ended, if `introduce` named the feature: keep it elsewhere.
    fn anchored(&mut self, _anchor: &Anchor) {}
    /// Called at least every [`Adapter::tick_every`]; put unasked readings and troubles in the box.
    fn tick(&mut self, out: &mut Outbox);
    fn tick_every(&self) -> Duration {
        Duration::from_millis(20)
    }
}

/// Unasked messages on their way out.
#[derive(Debug, Default)]
pub struct Outbox {
    pub readings: Vec<Reading>,
    pub troubles: Vec<Trouble>,
}

/// Why the loop ended badly.
#[derive(Debug)]
pub enum SdkError {
    Output(std::io::Error),
    Encode(serde_json::Error),
    /// The author's `introduce` failed.
    Introduce(String),
}

impl core::fmt::Display for SdkError {
    fn fmt(&self, f: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        match self {
            Self::Output(e) => write!(f, "standard output cannot be written: {e}"),
            Self::Encode(e) => write!(f, "a message cannot be written as JSON: {e}"),
            Self::Introduce(why) => write!(f, "the adapter could not start: {why}"),
        }
    }
}
impl std::error::Error for SdkError {}

impl From<std::io::Error> for SdkError {
    fn from(e: std::io::Error) -> Self {
        Self::Output(e)
    }
}
impl From<serde_json::Error> for SdkError {
    fn from(e: serde_json::Error) -> Self {
        Self::Encode(e)
    }
}

/// Runs the adapter on standard input and output until `finish` or the end of input.
pub fn run(adapter: impl Adapter) -> Result<(), SdkError> {
    run_on(adapter, std::io::stdin(), std::io::stdout())
}

/// The same on any pair of streams.
pub fn run_on(
    adapter: impl Adapter,
    input: impl Read + Send + 'static,
    output: impl Write,
) -> Result<(), SdkError> {
    let (lines, queue) = sync_channel(256);
    thread::spawn(move || read_lines(input, &lines));
    let clock = BootClock::real();
    Session { adapter, output, rules: Rules::default(), clock }.serve(&queue)
}

/// A line, or one that was too long and is gone.
enum Line {
    Text(Vec<u8>),
    TooLong,
}

/// Hands lines on, never holding more than one line's limit; returns at the end of input.
fn read_lines(input: impl Read, to: &SyncSender<Line>) {
    let mut reader = BufReader::new(input);
    loop {
        let mut line = Vec::new();
        let limit = LINE_MAX as u64 + 1;
        match reader.by_ref().take(limit).read_until(b'\n', &mut line) {
            Ok(0) | Err(_) => return,
            Ok(_) => {}
        }
        let whole = line.ends_with(b"\n");
        let item = if whole { Line::Text(line) } else { Line::TooLong };
        if !whole && !skip_line(&mut reader) {
            let _ = to.send(Line::TooLong);
            return;
        }
        if to.send(item).is_err() {
            return;
        }
    }
}

/// Throws the rest of a line away; `false` at the end of input.
fn skip_line(reader: &mut impl BufRead) -> bool {
    loop {
        let Ok(buffer) = reader.fill_buf() else { return false };
        if buffer.is_empty() {
            return false;
        }
        match buffer.iter().position(|b| *b == b'\n') {
            Some(end) => {
                reader.consume(end + 1);
                return true;
            }
            None => {
                let n = buffer.len();
                reader.consume(n);
            }
        }
    }
}

struct Session<A, W> {
    adapter: A,
    output: W,
    rules: Rules,
    clock: BootClock,
}

impl<A: Adapter, W: Write> Session<A, W> {
    fn serve(mut self, queue: &Receiver<Line>) -> Result<(), SdkError> {
        loop {
            match queue.recv_timeout(self.adapter.tick_every()) {
                Ok(Line::Text(line)) => {
                    if !self.take(&line)? {
                        self.all_to_rest(RestCause::Stop);
                        return Ok(());
                    }
                }
                Ok(Line::TooLong) => {
                    let text = format!("a line may have {LINE_MAX} bytes");
                    let error = RpcError::new(Code::InvalidRequest, text);
                    self.write(&failure(None, &error))?;
                }
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) => {
                    self.all_to_rest(RestCause::InputEnd);
                    return Ok(());
                }
            }
            self.leases();
            if self.rules.is_introduced() {
                self.tick()?;
            }
        }
    }

    fn leases(&mut self) {
        for point in self.rules.run_out(self.clock.boot_ns()) {
            self.rest_point(&point, RestCause::LeaseOut);
        }
    }

    fn all_to_rest(&mut self, cause: RestCause) {
        let points: Vec<String> = self.rules.drivable().map(|p| p.id.clone()).collect();
        points.iter().for_each(|p| self.rest_point(p, cause));
    }

    fn rest_point(&mut self, point: &str, cause: RestCause) {
        let Some(rest) = self.rules.point(point).and_then(|p| p.rest) else { return };
        let action = match cause {
            RestCause::LeaseOut => rest.lease_out,
            RestCause::InputEnd => rest.input_end,
            RestCause::Trip => rest.trip,
            RestCause::Stop => rest.stop,
        };
        self.adapter.rest(point, action, cause);
    }

    fn tick(&mut self) -> Result<(), SdkError> {
        let mut out = Outbox::default();
        self.adapter.tick(&mut out);
        if !out.readings.is_empty() {
            let sensed = Sensed { readings: out.readings };
            self.write(&notification(method::READING, &sensed)?)?;
        }
        for trouble in &out.troubles {
            self.write(&notification(method::TROUBLE, trouble)?)?;
        }
        Ok(())
    }

    fn write(&mut self, line: &str) -> Result<(), SdkError> {
        self.output.write_all(line.as_bytes())?;
        Ok(self.output.flush()?)
    }

    /// One line; `false` after `finish`.
    fn take(&mut self, line: &[u8]) -> Result<bool, SdkError> {
        let (id, name, params) = match parse(line) {
            Ok(Message::Request { id, method, params }) => (id, method, params),
            Ok(Message::Notification { method, params }) if method == method::ANCHOR => {
                if let Ok(anchor) = serde_json::from_value(params)
                    && self.rules.is_introduced()
                {
                    self.adapter.anchored(&anchor);
                }
                return Ok(true);
            }
            // Nothing else that the daemon sends unasked or answers concerns an adapter.
            Ok(_) => return Ok(true),
            Err(bad) => {
                let error = RpcError::new(Code::ParseError, bad.to_string());
                self.write(&failure(None, &error))?;
                return Ok(true);
            }
        };
        if name == method::INTRODUCE {
            return self.introduce(id, params).map(|()| true);
        }
        let result = if self.rules.is_introduced() {
            self.request(&name, params)
        } else {
            Err(RpcError::new(Code::NotIntroduced, "introduce comes first"))
        };
        let line = match &result {
            Ok(value) => answer(id, value)?,
            Err(error) => failure(Some(id), error),
        };
        self.write(&line)?;
        Ok(!(name == method::FINISH && result.is_ok()))
    }

    fn introduce(&mut self, id: u64, params: Value) -> Result<(), SdkError> {
        let wrong = |text: String| failure(Some(id), &RpcError::new(Code::InvalidParams, text));
        let introduce: Introduce = match serde_json::from_value(params) {
            Ok(i) => i,
            Err(e) => return self.write(&wrong(e.to_string())),
        };
        if introduce.version != VERSION {
            let text = format!("this adapter speaks version {VERSION}");
            let error = RpcError::new(Code::WrongVersion, text);
            return self.write(&failure(Some(id), &error));
        }
        let clock = match BootClock::from_settings(&introduce.settings) {
            Ok(clock) => clock,
            Err(e) => return self.write(&wrong(e)),
        };
        match self.adapter.introduce(&introduce, clock) {
            Ok(introduced) => {
                self.clock = clock;
                self.rules.introduced(&introduced.points, introduce.term);
                self.write(&answer(id, &introduced)?)
            }
            Err(why) => {
                let error = RpcError::new(Code::InternalError, why.clone());
                self.write(&failure(Some(id), &error))?;
                Err(SdkError::Introduce(why))
            }
        }
    }

    fn request(&mut self, name: &str, params: Value) -> Result<Value, RpcError> {
        let bad = |e: serde_json::Error| RpcError::new(Code::InvalidParams, e.to_string());
        match name {
            method::DRIVE => {
                let drive: Drive = serde_json::from_value(params).map_err(bad)?;
                self.drive(&drive).map(|()| Value::Null)
            }
            method::RENEW => {
                let renew: Renew = serde_json::from_value(params).map_err(bad)?;
                for one in renew.commands {
                    self.rules.renewed(one.command, one.expires_boottime_ns);
                    self.adapter.renew(one.command, one.expires_boottime_ns);
                }
                Ok(Value::Null)
            }
            method::REST => {
                let rest: Rest = serde_json::from_value(params).map_err(bad)?;
                for one in &rest.points {
                    self.rules.rested(&one.point);
                    self.adapter.rest(&one.point, one.action, rest.cause);
                }
                Ok(Value::Null)
            }
            method::SENSE => {
                let sense: Sense = serde_json::from_value(params).map_err(bad)?;
                let readings = self.adapter.sense(&sense.points);
                serde_json::to_value(Sensed { readings }).map_err(bad)
            }
            method::FINISH => Ok(Value::Null),
            other => {
                Err(RpcError::new(Code::MethodNotFound, format!("there is no method {other:?}")))
            }
        }
    }

    fn drive(&mut self, drive: &Drive) -> Result<(), RpcError> {
        if let Some(answer) = self.rules.before(drive.command) {
            return answer;
        }
        let answer = self.rules.may_drive(drive, self.clock.boot_ns()).and_then(|()| {
            self.adapter.drive(drive).map_err(|why| RpcError::new(Code::Equipment, why))
        });
        if answer.is_ok() {
            self.rules.driven(drive);
        }
        self.rules.remember(drive.command, &answer);
        answer
    }
}

#[cfg(test)]
mod tests;
