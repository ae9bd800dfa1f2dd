//! The runner: one queue of instants, one engine, one plant.

use std::sync::Arc;

use engine::{
    Act, Carried, ClockTrust, Config, Effects, Entry, Event, Job, JobKind, Outcome, PermitLife,
    Product, Stamp, State, step,
};
use model::{AdapterId, Reading, RestAction, Site, Term};
use plant::{Plant, PlantError, Point, RestDo};
use units::{Mono, Span, Utc, Window};

/// What to run.
pub struct Setup {
    pub site: Arc<Site>,
    pub plant: Plant,
    /// Which point of the plant each signal reads, in the order of `Site::signals`.
    pub points: Vec<Point>,
    pub span: Window,
    pub sense_every: Span,
    /// People's acts, in order of time.
    pub acts: Vec<(Utc, Act)>,
    pub faults: Vec<Fault>,
    /// What a new term takes over from all that was written: the journal's fold.
    pub carry: fn(&Site, &[(Stamp, Entry)]) -> Carried,
}

/// Faults outside the plant; the plant's own are in its configuration.
#[derive(Clone, Copy, PartialEq, Debug)]
pub enum Fault {
    AdapterKilled { at: Utc, back_after: Span },
    DaemonKilled { at: Utc, back_after: Span },
}

impl Fault {
    const fn at(&self) -> Utc {
        match self {
            Self::AdapterKilled { at, .. } | Self::DaemonKilled { at, .. } => *at,
        }
    }
}

/// What came of it.
#[derive(Debug)]
pub struct Run {
    pub entries: Vec<(Stamp, Entry)>,
    pub record: plant::Record,
    pub steps: u64,
    pub notices: Vec<(Utc, String)>,
    /// Answers to the acts, in their order.
    pub answers: Vec<Result<String, String>>,
}

/// A job's product is there this long after it was asked for.
const JOB_TAKES: Span = Span::seconds(2);

pub struct World {
    setup: Setup,
    state: State,
    effects: Effects,
    now: Utc,
    boot: Mono,
    seq: u64,
    term: u64,
    daemon_back: Option<Utc>,
    killed_at: Option<Utc>,
    adapter_back: Option<Utc>,
    next_sense: Utc,
    next_act: usize,
    next_fault: usize,
    products: Vec<(Utc, model::JobId, Product)>,
    run: Run,
}

impl World {
    pub fn new(mut setup: Setup) -> Self {
        setup.faults.sort_by_key(Fault::at);
        setup.acts.sort_by_key(|a| a.0);
        let now = setup.span.start();
        let boot = setup.plant.boot();
        let state = fresh(&setup.site);
        let run = Run {
            entries: Vec::new(),
            record: plant::Record::default(),
            steps: 0,
            notices: Vec::new(),
            answers: Vec::new(),
        };
        Self {
            state,
            effects: Effects::default(),
            now,
            boot,
            seq: 0,
            term: 0,
            daemon_back: Some(now),
            killed_at: None,
            adapter_back: Some(now + Span::seconds(1)),
            next_sense: now + Span::seconds(2),
            next_act: 0,
            next_fault: 0,
            products: Vec::new(),
            run,
            setup,
        }
    }

    /// Runs to the end of the span. The error is the plant's: a configuration it cannot follow.
    pub fn run(mut self) -> Result<Run, PlantError> {
        while self.advance()? {}
        self.run.record = self.setup.plant.take_record();
        Ok(self.run)
    }

    /// The engine's state as it stands, with a stamp of now, for those who want to ask it.
    pub fn state(&self) -> (&State, Stamp) {
        (&self.state, self.stamp())
    }

    pub fn now(&self) -> Utc {
        self.now
    }

    /// Takes the next instant; `false` when the span is over.
    pub fn advance(&mut self) -> Result<bool, PlantError> {
        let t = self.next_instant();
        if t >= self.setup.span.end() {
            return Ok(false);
        }
        self.boot = self.boot + (t - self.now);
        self.now = t;
        self.setup.plant.advance(t, self.boot)?;
        self.faults();
        self.restarts()?;
        if self.daemon_back.is_some() {
            return Ok(true);
        }
        self.products()?;
        self.acts()?;
        if self.now >= self.next_sense {
            self.next_sense = self.now + self.setup.sense_every;
            if self.adapter_back.is_none() {
                self.feed(Event::Frame(self.frame()))?;
            }
        }
        if self.effects.wake_at.is_some_and(|w| w <= self.boot) {
            self.feed(Event::Wake)?;
        }
        Ok(true)
    }

    fn next_instant(&self) -> Utc {
        let fault = self.setup.faults.get(self.next_fault).map(Fault::at);
        // An adapter that comes back while the daemon is down is seen when the daemon is.
        let adapter_back = self.adapter_back.filter(|_| self.daemon_back.is_none());
        let back = self.daemon_back.into_iter().chain(adapter_back);
        let mut next = back.chain(fault).fold(self.next_sense, Utc::min);
        if self.daemon_back.is_none() {
            let act = self.setup.acts.get(self.next_act).map(|a| a.0);
            let product = self.products.iter().map(|p| p.0);
            let wake = self.effects.wake_at.map(|w| self.now + w.since(self.boot));
            next = act.into_iter().chain(product).chain(wake).fold(next, Utc::min);
        } else if next == self.next_sense {
            return self.next_sense.max(self.now) + self.setup.sense_every;
        }
        // Never twice at one microsecond, so that time always goes on.
        next.max(self.now + Span::micros(1))
    }

    fn faults(&mut self) {
        while let Some(fault) = self.setup.faults.get(self.next_fault).copied() {
            if fault.at() > self.now {
                return;
            }
            self.next_fault += 1;
            match fault {
                Fault::DaemonKilled { back_after, .. } => {
                    self.daemon_back = Some(self.now + back_after);
                    self.killed_at = Some(self.now);
                    self.products.clear();
                }
                Fault::AdapterKilled { back_after, .. } => {
                    self.adapter_back = Some(self.now + back_after);
                    if self.daemon_back.is_none() {
                        let why = "killed".to_owned();
                        let down = Event::AdapterDown { adapter: AdapterId(0), why };
                        // Nothing that a dead adapter would have to carry out can come of it.
                        let _ = self.feed(down);
                    }
                }
            }
        }
    }

    fn restarts(&mut self) -> Result<(), PlantError> {
        if self.daemon_back.is_some_and(|t| t <= self.now) {
            self.daemon_back = None;
            self.term += 1;
            self.state = fresh(&self.setup.site);
            let mut carried = (self.setup.carry)(&self.setup.site, &self.run.entries);
            // What the daemon's heartbeat file would say.
            carried.last_seen = self.killed_at.or(carried.last_seen);
            self.feed(Event::Started(Box::new(carried)))?;
            if self.adapter_back.is_none() {
                self.adapter_back = Some(self.now + Span::seconds(2));
            }
        }
        if self.daemon_back.is_none() && self.adapter_back.is_some_and(|t| t <= self.now) {
            self.adapter_back = None;
            for adapter in 0..self.setup.site.adapters.len() {
                self.feed(Event::AdapterUp(AdapterId(adapter as u16)))?;
            }
        }
        Ok(())
    }

    fn products(&mut self) -> Result<(), PlantError> {
        while let Some(i) = self.products.iter().position(|p| p.0 <= self.now) {
            let (_, job, product) = self.products.remove(i);
            self.feed(Event::JobDone { job, product })?;
        }
        Ok(())
    }

    fn acts(&mut self) -> Result<(), PlantError> {
        while let Some((at, act)) = self.setup.acts.get(self.next_act) {
            if *at > self.now {
                break;
            }
            let act = act.clone();
            self.next_act += 1;
            self.feed(Event::Act(act))?;
            self.run.answers.extend(self.effects.answer.take());
        }
        Ok(())
    }

    /// What the plant's sensors say now, as a frame.
    pub fn frame(&self) -> Vec<Reading> {
        let sensed = self.setup.plant.sense();
        let signals = self.setup.site.signals.iter().zip(&self.setup.points);
        let read = |(s, p): (&model::Signal, &Point)| {
            let value = sensed.get(*p)?;
            Some(Reading { signal: s.id, value, source_good: true, at: sensed.at })
        };
        signals.filter_map(read).collect()
    }

    fn stamp(&self) -> Stamp {
        Stamp {
            seq: self.seq,
            term: Term(self.term),
            utc: self.now,
            boot: self.boot,
            trust: ClockTrust::Trusted,
        }
    }

    fn feed(&mut self, event: Event) -> Result<(), PlantError> {
        self.seq += 1;
        self.run.steps += 1;
        let stamp = self.stamp();
        step(&mut self.state, &stamp, event, &mut self.effects);
        let mut accepted = Vec::new();
        let entries = self.effects.records.drain(..);
        self.run.entries.extend(entries.map(|e| (stamp, e)));
        let notices = self.effects.notices.drain(..);
        self.run.notices.extend(notices.map(|n| (stamp.utc, n.text)));
        let up = self.adapter_back.is_none();
        let plant = &mut self.setup.plant;
        for rest in self.effects.rests.drain(..).filter(|_| up) {
            plant.rest_as(rest.asset.index(), rest_do(rest.action), &rest.cause)?;
        }
        for renewal in self.effects.renewals.drain(..).filter(|_| up) {
            // A renewal that comes too late is refused: the asset has gone to rest by itself.
            let asset = usize::from(renewal.asset());
            let _ = plant.renew_as(renewal.command(), asset, renewal.lease_end());
        }
        for order in self.effects.orders.drain(..).filter(|_| up) {
            let p = order.permit;
            let setting = p.action().setting().get();
            let outcome =
                match plant.drive_as(p.command(), order.asset.index(), setting, p.lease_end()) {
                    Ok(()) => Outcome::Accepted,
                    Err(e) => Outcome::Refused(e.to_string()),
                };
            accepted.push((p.command(), outcome));
        }
        let due = self.now + JOB_TAKES;
        for job in self.effects.jobs.drain(..) {
            self.products.push((due, job.id, work(&self.setup.site, &job)));
        }
        for (command, outcome) in accepted {
            self.feed(Event::Outcome { command, outcome })?;
        }
        Ok(())
    }
}

fn fresh(site: &Arc<Site>) -> State {
    let config = Config { build: "simulated".to_owned(), permit_life: PermitLife::REAL };
    State::new(site.clone(), config)
}

const fn rest_do(action: RestAction) -> RestDo {
    match action {
        RestAction::Close => RestDo::Close,
        RestAction::Open => RestDo::Open,
        RestAction::Stop => RestDo::Stop,
        RestAction::Hold | RestAction::HandToLocal => RestDo::Hold,
    }
}

/// Does one job; what the daemon's worker does.
fn work(site: &Site, job: &Job) -> Product {
    match &job.kind {
        JobKind::Forecast(r) => match nowcast::forecast(site, r.as_of, r.span) {
            Ok(f) => Product::Forecast(Box::new(f)),
            Err(e) => Product::Failed(e.to_string()),
        },
        JobKind::Plan(r) => match planner::plan(site, r) {
            Ok(p) => Product::Plan(Box::new(p)),
            Err(e) => Product::Failed(e.to_string()),
        },
    }
}
