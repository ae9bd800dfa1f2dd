//! One adapter's supervisor: a thread that owns its process and drains one queue.
//!
//! ```text
//!            start ok           introduced
//!   waiting ─────────► greeting ──────────► up ──(a call unanswered, a bad line, the end)──┐
//!      ▲                   │                                                               │
//!      └──── back-off ◄────┴──────────────────── killed ◄──────────────────────────────────┘
//! ```

use std::sync::mpsc::{Receiver, RecvTimeoutError, SyncSender};
use std::time::Duration;

use interlock::Renewal;
use journal::Committed;
use protocol::{
    Anchor, Drive, Introduce, Introduced, Message, Renew, RenewOne, Rest, RestCause, RestOne,
    Sensed, VERSION, feature, method, notification, parse, request,
};
use serde_json::Value;

use crate::backoff::Backoff;
use crate::child::Running;
use crate::host_::{AdapterSpec, Events, HostEvent, Now, Outcome, RestPoint};
use crate::pending::{Call, Pending};

/// What a supervisor is told, by the host or by the threads that read.
pub(crate) enum Work {
    Drive {
        point: String,
        committed: Box<Committed>,
    },
    Renew(Renewal),
    Rest {
        points: Vec<RestPoint>,
        cause: RestCause,
        words: String,
    },
    Anchor {
        anchor: String,
    },
    Finish {
        within: Duration,
    },
    /// A line of its output.
    Said {
        life: u64,
        line: Vec<u8>,
    },
    Gone {
        life: u64,
        why: String,
    },
}

pub(crate) struct Supervisor {
    spec: AdapterSpec,
    work: SyncSender<Work>,
    events: Events,
    now: Now,
    running: Option<Running>,
    introduced: bool,
    /// What the adapter said it knows of.
    features: Vec<String>,
    life: u64,
    sequence: u64,
    pending: Pending,
    backoff: Backoff,
    /// Real boot clock at which to start again.
    start_at: Duration,
    up_since: Duration,
}

/// Up for this long, and earlier deaths are forgotten.
const WELL: Duration = Duration::from_secs(60);
/// The longest that the queue is waited on.
const TURN: Duration = Duration::from_millis(500);

/// Real time, for back-off and answers; leases and permits are on the daemon's own boot clock.
fn real() -> Duration {
    let t = rustix::time::clock_gettime(rustix::time::ClockId::Boottime);
    Duration::new(t.tv_sec.unsigned_abs(), t.tv_nsec as u32)
}

impl Supervisor {
    pub(crate) fn new(spec: AdapterSpec, work: SyncSender<Work>, events: Events, now: Now) -> Self {
        Self {
            spec,
            work,
            events,
            now,
            running: None,
            introduced: false,
            features: Vec::new(),
            life: 0,
            sequence: 0,
            pending: Pending::default(),
            backoff: Backoff::default(),
            start_at: Duration::ZERO,
            up_since: Duration::ZERO,
        }
    }

    /// Runs until it is told to finish or nobody can tell it any more.
    pub(crate) fn run(mut self, queue: &Receiver<Work>) {
        loop {
            self.keep_up();
            let wait = self.wait();
            match queue.recv_timeout(wait) {
                Ok(Work::Finish { within }) => {
                    self.finish(queue, within);
                    return;
                }
                Ok(work) => self.take(work),
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) => return,
            }
        }
    }

    fn wait(&self) -> Duration {
        let due = match self.running {
            Some(_) => self.pending.next_due(),
            None => Some(self.start_at),
        };
        due.map_or(TURN, |t| t.saturating_sub(real()).min(TURN))
    }

    /// Starts it when its time has come; ends it when an answer is overdue or it has ended.
    fn keep_up(&mut self) {
        let now = real();
        match &mut self.running {
            None if now >= self.start_at => self.start(),
            None => {}
            Some(running) => {
                if let Some(why) = running.ended() {
                    self.down(&why);
                } else if self.pending.next_due().is_some_and(|due| due <= now) {
                    self.down("it did not answer in time");
                } else if self.introduced && now.saturating_sub(self.up_since) > WELL {
                    self.backoff.well();
                }
            }
        }
    }

    fn start(&mut self) {
        self.life += 1;
        match Running::start(&self.spec, self.life, &self.work, &self.events) {
            Ok(running) => {
                self.running = Some(running);
                let introduce = Introduce {
                    version: VERSION,
                    features: vec![feature::ANCHORS.to_owned()],
                    site: self.spec.site.clone(),
                    term: self.spec.term,
                    session: format!("{}-{}", self.spec.term, self.life),
                    line_max_bytes: protocol::LINE_MAX as u64,
                    settings: self.spec.settings.clone(),
                };
                self.call(Call::Introduce, method::INTRODUCE, &introduce);
            }
            Err(e) => {
                let program = self.spec.program.display().to_string();
                self.down(&format!("{program} could not be started: {e}"));
            }
        }
    }

    /// Kills what runs, tells what is unknown now, and sets the time of the next start.
    fn down(&mut self, why: &str) {
        self.running = None;
        self.introduced = false;
        for call in self.pending.all() {
            if let Call::Drive { command } = call {
                self.outcome(command, Outcome::Unknown(why.to_owned()));
            }
        }
        let wait = self.backoff.died(real());
        self.start_at = real() + wait.span;
        let (adapter, quarantined) = (self.spec.id, wait.quarantined);
        self.tell(HostEvent::Down { adapter, why: why.to_owned(), quarantined });
    }

    fn tell(&self, event: HostEvent) {
        (self.events)(event);
    }

    fn outcome(&self, command: u64, outcome: Outcome) {
        self.tell(HostEvent::Outcome { command, outcome });
    }

    fn call(&mut self, call: Call, name: &str, params: &impl serde::Serialize) {
        let id = self.pending.add(call, real() + self.spec.answer_within);
        let written = match (&mut self.running, request(id, name, params)) {
            (Some(running), Ok(line)) => running.write(&line).map_err(|e| e.to_string()),
            (None, _) => Err("it is not running".to_owned()),
            (_, Err(e)) => Err(format!("a message could not be written: {e}")),
        };
        if let Err(e) = written {
            self.down(&format!("its input is closed: {e}"));
        }
    }

    fn take(&mut self, work: Work) {
        match work {
            Work::Drive { point, committed } => self.drive(point, &committed),
            Work::Renew(renewal) => self.renew(&renewal),
            Work::Rest { points, cause, words } => self.rest(points, cause, words),
            Work::Anchor { anchor } => self.anchor(anchor),
            Work::Said { life, line } if life == self.life && self.running.is_some() => {
                self.said(&line);
            }
            Work::Gone { life, why } if life == self.life && self.running.is_some() => {
                self.down(&why);
            }
            // A word of one that is dead already, or a finish, which `run` takes.
            Work::Said { .. } | Work::Gone { .. } | Work::Finish { .. } => {}
        }
    }

    fn drive(&mut self, point: String, committed: &Committed) {
        let permit = committed.permit();
        let command = permit.command();
        if !self.introduced {
            return self.outcome(command, Outcome::Refused("the adapter is down".to_owned()));
        }
        if permit.not_after() < (self.now)() {
            let why = "its permit had expired before it could leave".to_owned();
            return self.outcome(command, Outcome::Refused(why));
        }
        self.sequence += 1;
        let drive = Drive {
            point,
            setpoint: permit.action().setting().get(),
            command,
            term: permit.term(),
            sequence: self.sequence,
            expires_boottime_ns: permit.lease_end().as_nanos(),
        };
        self.call(Call::Drive { command }, method::DRIVE, &drive);
    }

    fn renew(&mut self, renewal: &Renewal) {
        // Too late or nobody there: the lease runs out, and the asset rests by itself.
        if !self.introduced || renewal.not_after() < (self.now)() {
            return;
        }
        let one = RenewOne {
            command: renewal.command(),
            expires_boottime_ns: renewal.lease_end().as_nanos(),
        };
        self.call(Call::Other, method::RENEW, &Renew { commands: vec![one] });
    }

    fn rest(&mut self, points: Vec<RestPoint>, cause: RestCause, words: String) {
        if !self.introduced {
            return;
        }
        let one = |p: RestPoint| RestOne { point: p.point, action: p.action };
        let rest = Rest { points: points.into_iter().map(one).collect(), cause, words };
        self.call(Call::Other, method::REST, &rest);
    }

    /// Only for those that want it; that it is not kept elsewhere once is no fault of the adapter's.
    fn anchor(&mut self, anchor: String) {
        if !self.introduced || !self.features.iter().any(|f| f == feature::ANCHORS) {
            return;
        }
        let site = self.spec.site.clone();
        let line = notification(method::ANCHOR, &Anchor { site, anchor });
        if let (Some(running), Ok(line)) = (&mut self.running, line)
            && let Err(e) = running.write(&line)
        {
            self.down(&format!("its input is closed: {e}"));
        }
    }

    fn said(&mut self, line: &[u8]) {
        match parse(line) {
            Ok(Message::Answer { id, result }) => {
                if let Some(call) = self.pending.take(id) {
                    self.answered(call, result);
                }
            }
            Ok(Message::Failure { id, error }) => match id.and_then(|id| self.pending.take(id)) {
                Some(Call::Introduce) => self.down(&format!("it refused to start: {error}")),
                Some(Call::Drive { command }) => {
                    self.outcome(command, Outcome::Refused(error.to_string()));
                }
                Some(Call::Other) | None => {
                    let (adapter, text) = (self.spec.id, error.to_string());
                    self.tell(HostEvent::Log { adapter, text });
                }
            },
            Ok(Message::Notification { method, params }) => self.notified(&method, params),
            Ok(Message::Request { .. }) => self.down("it sent a request, which adapters never do"),
            Err(bad) => self.down(&format!("it printed {bad}")),
        }
    }

    fn answered(&mut self, call: Call, result: Value) {
        match call {
            Call::Introduce => match serde_json::from_value::<Introduced>(result) {
                Ok(introduced) => {
                    self.introduced = true;
                    self.features = introduced.features;
                    self.up_since = real();
                    let (adapter, points) = (self.spec.id, introduced.points);
                    self.tell(HostEvent::Up { adapter, points });
                }
                Err(e) => self.down(&format!("its answer to introduce is wrong: {e}")),
            },
            Call::Drive { command } => self.outcome(command, Outcome::Accepted),
            Call::Other => {}
        }
    }

    fn notified(&mut self, name: &str, params: Value) {
        if !self.introduced {
            return self.down("it spoke before it was introduced");
        }
        let adapter = self.spec.id;
        match name {
            method::READING => match serde_json::from_value::<Sensed>(params) {
                Ok(s) => self.tell(HostEvent::Readings { adapter, readings: s.readings }),
                Err(e) => self.down(&format!("its readings are wrong: {e}")),
            },
            method::TROUBLE => match serde_json::from_value(params) {
                Ok(trouble) => self.tell(HostEvent::Trouble { adapter, trouble }),
                Err(e) => self.down(&format!("its trouble message is wrong: {e}")),
            },
            // Of a later version, or a forecast that nothing here uses yet.
            _ => {}
        }
    }

    /// Asks it to finish, waits, and kills it (by dropping) if it does not.
    fn finish(mut self, queue: &Receiver<Work>, within: Duration) {
        if self.running.is_none() {
            return;
        }
        self.call(Call::Other, method::FINISH, &Value::Null);
        let until = real() + within;
        while real() < until {
            let Some(running) = &mut self.running else { return };
            if running.ended().is_some() {
                return;
            }
            match queue.recv_timeout(Duration::from_millis(10)) {
                Ok(Work::Gone { life, .. }) if life == self.life => {}
                Ok(_) | Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) => return,
            }
        }
    }
}
