//! The loop: one event at a time to the engine, its effects carried out.

use std::collections::VecDeque;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, SyncSender};
use std::time::Duration;

use anyhow::Result;
use engine::{Carried, ClockTrust, Effects, Event, Job, Severity, Stamp, State, step};
use host::{Host, HostEvent, RestPoint};
use journal::{Batch, Handle, Reply, ViewThread};
use model::{AssetId, RestAction, Site, Term};
use protocol::RestCause;
use record::{Intent, Note, Row};
use units::{Mono, Span};

use super::input::Input;
use super::keeping::{self, Keeping};
use super::so_far::SoFar;
use super::{asked, plant_events, speak, view};
use crate::cli::Exit;
use crate::clock::{Clock, Watch};
use crate::control::Response;

pub struct Parts {
    pub site: Arc<Site>,
    pub site_arg: String,
    pub rows: bool,
    pub clock: Clock,
    pub watch: Watch,
    pub term: Term,
    pub state: State,
    pub journal: Handle,
    pub view: ViewThread,
    pub host: Host,
    pub jobs: Sender<Job>,
    pub heartbeat: PathBuf,
    pub inbox: Receiver<Input>,
    pub tokens: Receiver<()>,
}

pub struct Shell {
    pub(super) parts: Parts,
    carried: Option<Carried>,
    effects: Effects,
    seq: u64,
    trust: ClockTrust,
    wake_at: Option<Mono>,
    /// For each batch that is not acknowledged yet: who waits for it.
    waiting: VecDeque<Option<(SyncSender<Response>, Response)>>,
    welcomed: bool,
    beat_at: Mono,
    pub(super) keeping: Keeping,
    so_far: SoFar,
}

/// The longest that the loop sleeps, in real time: the heartbeat and the clock's watch.
const TURN: Duration = Duration::from_secs(1);
/// Real time between two heartbeats; and, as an outage is counted from the last one in the clock's own
/// time, no more than so much of a fast clock's.
const BEAT: Span = Span::seconds(5);
const BEAT_SIMULATED_MOST: Span = Span::minutes(1);
/// Real time for assets to come to rest, and then for adapters to end, at a clean stop.
const STOP_WITHIN: Duration = Duration::from_secs(20);

impl Shell {
    pub fn new(parts: Parts, carried: Carried, keeping: Keeping, so_far: SoFar) -> Self {
        Self {
            parts,
            carried: Some(carried),
            effects: Effects::default(),
            seq: 0,
            trust: ClockTrust::Distrusted,
            wake_at: None,
            waiting: VecDeque::new(),
            welcomed: false,
            beat_at: Mono::ZERO,
            keeping,
            so_far,
        }
    }

    /// Runs until it is told to stop.
    pub fn run(mut self) -> Result<Exit> {
        let carried = self.carried.take().unwrap_or_default();
        let (utc, boot) = (self.parts.clock.utc(), self.parts.clock.boot());
        self.trust = self.parts.watch.look(utc, boot).0;
        self.feed(Event::Started(Box::new(carried)))?;
        loop {
            match self.parts.inbox.recv_timeout(self.sleep()) {
                Ok(Input::Stop) => return self.stop(),
                Ok(input) => self.take(input)?,
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) => return self.stop(),
            }
            self.look_at_clock();
            if self.wake_at.is_some_and(|t| t <= self.parts.clock.boot()) {
                self.feed(Event::Wake)?;
            }
            self.beat();
            keeping::turn(&mut self)?;
        }
    }

    fn sleep(&self) -> Duration {
        self.wake_at.map_or(TURN, |t| self.parts.clock.real_until(t).min(TURN))
    }

    pub(super) fn stamp(&self) -> Stamp {
        Stamp {
            seq: self.seq,
            term: self.parts.term,
            utc: self.parts.clock.utc(),
            boot: self.parts.clock.boot(),
            trust: self.trust,
        }
    }

    fn look_at_clock(&mut self) {
        let (utc, boot) = (self.parts.clock.utc(), self.parts.clock.boot());
        let before = self.trust;
        let (trust, news) = self.parts.watch.look(utc, boot);
        self.trust = trust;
        let changed = || format!("the clock's synchronisation says {trust:?}");
        if let Some(why) = news.or_else(|| (trust != before).then(changed)) {
            tracing::warn!(%why, "clock");
            if let Err(e) = self.feed(Event::ClockChanged { why }) {
                tracing::error!(error = %e, "the clock's change could not be taken in");
            }
        }
    }

    /// Touches the heartbeat file, for telemetry that watches its age (rule 17).
    fn beat(&mut self) {
        let now = self.parts.clock.boot();
        let file = &self.parts.heartbeat;
        if now < self.beat_at {
            return;
        }
        self.beat_at = now + (BEAT * i64::from(self.parts.clock.speed())).min(BEAT_SIMULATED_MOST);
        if let Err(e) = std::fs::write(file, format!("{}\n", self.parts.clock.utc())) {
            tracing::warn!(error = %e, file = %file.display(), "no heartbeat");
        }
    }

    fn take(&mut self, input: Input) -> Result<()> {
        match input {
            Input::Host(event) => {
                // Gives the token back that this event took.
                let _ = self.parts.tokens.try_recv();
                self.host_event(event)
            }
            Input::Journal(reply) => self.journal_reply(reply),
            Input::View(what) => {
                view::says(self, what);
                Ok(())
            }
            Input::Asked(asked) => asked::answer(self, asked),
            Input::Done(done) => {
                self.feed(Event::JobDone { job: done.job, product: done.product })?;
                self.welcome();
                Ok(())
            }
            Input::Stop => Ok(()),
        }
    }

    fn welcome(&mut self) {
        if !self.welcomed && self.parts.state.plan(0).is_some() {
            self.welcomed = true;
            let p = &self.parts;
            speak::welcome(&p.site, &p.state, p.clock.utc(), &p.site_arg);
        }
    }

    fn host_event(&mut self, event: HostEvent) -> Result<()> {
        match plant_events::event_of(&self.parts.site, event) {
            Some(event) => self.feed(event),
            None => Ok(()),
        }
    }

    fn journal_reply(&mut self, reply: Reply) -> Result<()> {
        self.parts.view.take(view::rows_of(&reply));
        match reply {
            Reply::Acked(acked) => {
                for row in &acked.rows {
                    speak::row(row, self.parts.rows);
                    self.took(row);
                }
                if let Some(Some((to, response))) = self.waiting.pop_front() {
                    let _ = to.send(response);
                }
                for committed in acked.committed {
                    let asset = AssetId(committed.permit().asset());
                    let spec = self.parts.site.asset(asset);
                    let (adapter, command) = (spec.adapter.0, committed.permit().command());
                    if let Err(e) = self.parts.host.drive(adapter, &spec.point, committed) {
                        let outcome = engine::Outcome::Refused(e.to_string());
                        self.feed(Event::Outcome { command, outcome })?;
                    }
                }
                Ok(())
            }
            Reply::Lost { why } => keeping::lost(self, why),
            Reply::Back { rows_kept } => keeping::back(self, rows_kept),
            Reply::Done(done) => keeping::done(self, done),
        }
    }

    /// One event through the engine; its effects are carried out before the next.
    pub(super) fn feed(&mut self, event: Event) -> Result<()> {
        self.feed_for(event, None)
    }

    /// The same for a person, who is answered once it is on the record.
    pub(super) fn feed_for(
        &mut self,
        event: Event,
        person: Option<SyncSender<Response>>,
    ) -> Result<()> {
        self.seq += 1;
        let stamp = self.stamp();
        self.keeping.event(&stamp, &event, &self.parts.site, self.parts.clock.speed());
        step(&mut self.parts.state, &stamp, event, &mut self.effects);
        self.rests();
        self.renewals();
        self.keeping.minute(&self.parts.state, stamp.utc);
        self.wake_at = self.effects.wake_at.or(self.wake_at);
        for notice in self.effects.notices.drain(..) {
            match notice.severity {
                Severity::Info => tracing::info!("{}", notice.text),
                Severity::Warning => tracing::warn!("{}", notice.text),
                Severity::Alarm => tracing::error!("ALARM {}", notice.text),
            }
        }
        let answer = self.effects.answer.take();
        let waits = person.map(|to| (to, response_of(answer)));
        self.submit(&stamp, waits)?;
        for job in self.effects.jobs.drain(..) {
            self.parts.jobs.send(job)?;
        }
        Ok(())
    }

    fn rests(&mut self) {
        for rest in self.effects.rests.drain(..) {
            let spec = self.parts.site.asset(rest.asset);
            let point = RestPoint { point: spec.point.clone(), action: rest_action(rest.action) };
            let sent =
                self.parts.host.rest(spec.adapter.0, vec![point], RestCause::Trip, &rest.cause);
            if let Err(e) = sent {
                tracing::error!(asset = %spec.name, error = %e, "rest not sent; its lease will");
            }
        }
    }

    fn renewals(&mut self) {
        for renewal in self.effects.renewals.drain(..) {
            let adapter = self.parts.site.asset(AssetId(renewal.asset())).adapter;
            if let Err(e) = self.parts.host.renew(adapter.0, renewal) {
                tracing::warn!(error = %e, "a renewal was not sent");
            }
        }
    }

    fn submit(
        &mut self,
        stamp: &Stamp,
        waits: Option<(SyncSender<Response>, Response)>,
    ) -> Result<()> {
        if self.effects.records.is_empty() {
            if let Some((to, response)) = waits {
                let _ = to.send(response);
            }
            return Ok(());
        }
        let site = &self.parts.site;
        let drafts = self.effects.records.drain(..).map(|e| record::encode(&e, site)).collect();
        let intents = self.effects.orders.drain(..).map(|o| Intent::new(o.permit, site)).collect();
        let (utc, boot) = (stamp.utc, stamp.boot);
        let (term, seen) = (stamp.term.0, self.keeping.take_seen());
        self.parts.journal.submit(Batch { term, utc, boot, drafts, intents, seen })?;
        self.waiting.push_back(waits);
        Ok(())
    }

    /// Notes of the shell's own, and what was seen until now.
    pub(super) fn submit_alone(&mut self, notes: Vec<Note>) -> Result<()> {
        let Stamp { term, utc, boot, .. } = self.stamp();
        let drafts = notes.iter().map(record::encode_note).collect();
        let (intents, seen) = (Vec::new(), self.keeping.take_seen());
        let batch = Batch { term: term.0, utc, boot, drafts, intents, seen };
        self.parts.journal.submit(batch)?;
        self.waiting.push_back(None);
        Ok(())
    }

    /// A committed row, for the next start.
    pub(super) fn took(&mut self, row: &Row) {
        self.so_far.push(row);
    }

    /// What the rows so far add up to, written down if it is time for it.
    pub(super) fn snapshot(&mut self, daily: bool) -> Result<()> {
        let now = self.parts.clock.utc();
        self.so_far.due(now, daily).map_or(Ok(()), |note| self.submit_alone(vec![note]))
    }

    /// Assets to rest, adapters ended, journal closed.
    fn stop(mut self) -> Result<Exit> {
        tracing::info!("stopping: everything goes to rest");
        self.feed(Event::Stopping { why: "told to stop".to_owned() })?;
        let until = self.parts.clock.boot()
            + Span::seconds(STOP_WITHIN.as_secs() as i64 * i64::from(self.parts.clock.speed()));
        while self.moving() && self.parts.clock.boot() < until {
            if let Ok(input) = self.parts.inbox.recv_timeout(Duration::from_millis(50)) {
                match input {
                    Input::Host(HostEvent::Readings { .. })
                    | Input::Journal(_)
                    | Input::View(_) => {
                        self.take(input)?;
                    }
                    _ => {}
                }
            }
        }
        for asset in &self.parts.site.assets {
            if !self.parts.state.at_rest(asset.id, self.parts.clock.boot()) {
                tracing::warn!(asset = %asset.name, "not seen at rest yet; its rest action goes on");
            }
        }
        self.parts.host.finish(Duration::from_secs(5));
        // What is still to be acknowledged is committed by the close itself.
        self.parts.journal.close()?;
        // Its last rows are for the view too.
        for input in self.parts.inbox.try_iter() {
            if let Input::Journal(reply) = input {
                self.parts.view.take(view::rows_of(&reply));
            }
        }
        self.parts.view.stop();
        say!("stopped: assets sent to rest, journal closed");
        Ok(Exit::Done)
    }

    fn moving(&self) -> bool {
        let boot = self.parts.clock.boot();
        self.parts.site.assets.iter().any(|a| !self.parts.state.at_rest(a.id, boot))
    }
}

fn response_of(answer: Option<Result<String, String>>) -> Response {
    match answer {
        Some(Ok(text)) => Response::Ok(serde_json::Value::String(text)),
        Some(Err(why)) => Response::Refused(why),
        None => Response::Refused("the engine gave no answer".to_owned()),
    }
}

const fn rest_action(action: RestAction) -> protocol::RestAction {
    match action {
        RestAction::Close => protocol::RestAction::Close,
        RestAction::Open => protocol::RestAction::Open,
        RestAction::Stop => protocol::RestAction::Stop,
        RestAction::Hold => protocol::RestAction::Hold,
        RestAction::HandToLocal => protocol::RestAction::HandToLocal,
    }
}
