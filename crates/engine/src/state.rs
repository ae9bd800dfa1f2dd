//! The state of one site between events. Everything in it follows from the events alone.

use std::sync::Arc;

use interlock::{Action, GateRules, Kind, PermitLife, PumpRules, Rules};
use licence::Tallies;
use model::{
    About, Asset, AssetId, AssetKind, Cause, Forecast, JobId, Lawful, Outlet, Plan, PlanId, Site,
    Term, TideNumber,
};
use signals::Validator;
use units::{CubicMetres, Digest, Mono, Percent, Span, Utc, Window};

use crate::{ClockTrust, Mode, StandingAuthorisation};

/// What the daemon knows of itself.
#[derive(Clone, PartialEq, Debug)]
pub struct Config {
    /// Digest or version of the binary: a standing authorisation dies with it.
    pub build: String,
    pub permit_life: PermitLife,
}

/// One site, as far as its events have told.
#[derive(Clone, Debug)]
pub struct State {
    pub(crate) site: Arc<Site>,
    pub(crate) config: Config,
    pub(crate) rules: Vec<Rules>,
    pub(crate) term: Term,
    pub(crate) mode: Mode,
    pub(crate) trust: ClockTrust,
    pub(crate) journal_lost: Option<(Mono, String)>,
    pub(crate) safe_latch: Option<String>,
    pub(crate) authorisation: Option<StandingAuthorisation>,
    /// A standing authorisation that will set automatic once the site is armed.
    pub(crate) resume: Option<StandingAuthorisation>,
    pub(crate) armed: Option<bool>,
    /// What each reason is about, and its words.
    pub(crate) armed_reasons: Vec<(About, String)>,
    pub(crate) self_test: Result<(), &'static str>,
    pub(crate) adapters_up: Vec<bool>,
    pub(crate) validator: Validator,
    pub(crate) raw: Vec<Option<RawSlot>>,
    pub(crate) assets: Vec<AssetState>,
    pub(crate) forecast: Option<Arc<Forecast>>,
    /// For each outlet, by its gate.
    pub(crate) lawful: Vec<Option<Lawful>>,
    pub(crate) plans: Vec<Option<Plan>>,
    pub(crate) jobs: Jobs,
    pub(crate) tallies: Tallies,
    pub(crate) meters: Vec<Meter>,
    pub(crate) next_command: u64,
    pub(crate) next_plan: u64,
    pub(crate) next_job: u64,
}

/// Jobs in flight: one of a kind, results of others are dropped.
#[derive(Clone, PartialEq, Debug, Default)]
pub(crate) struct Jobs {
    pub forecast: Option<JobId>,
    /// (outlet, job)
    pub plan: Option<(usize, JobId)>,
    /// For each outlet: the grid instant of its last request, and whether it is to be asked anew.
    pub planned_at: Vec<Option<Utc>>,
    pub plan_wanted: Vec<bool>,
}

/// The last reading of a signal as it came, by the boot clock.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct RawSlot {
    pub value: f64,
    pub at: Utc,
    /// When it was true, carried over to the boot clock at its arrival.
    pub boot: Mono,
    pub changed: Mono,
}

#[derive(Clone, PartialEq, Debug, Default)]
pub(crate) struct AssetState {
    pub locked_by: Option<String>,
    pub hold_until: Option<Utc>,
    pub hand: Option<(Percent, Utc)>,
    pub tripped: Option<String>,
    pub confirmed_tide: Option<TideNumber>,
    pub command: Option<Command>,
    /// The flow that the gate's last order was for, m3/s.
    pub flow_target: f64,
    pub last_move: Option<Mono>,
    pub last_stop: Option<Mono>,
    pub starts: Vec<Utc>,
    pub assisted_since: Option<Mono>,
    /// What was decided last, so that a change is written once.
    pub decided: Option<(bool, Vec<(model::By, model::About)>)>,
    /// What an earlier term, or an adapter that went away, left it doing: adopted at the next order
    /// where its position shows it.
    pub carried: Option<Action>,
    /// Until here it may still pass water that nobody sees: its adapter is gone.
    pub unseen_until: Option<Mono>,
}

/// A command that has left and holds a lease.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct Command {
    pub id: u64,
    pub action: Action,
    pub sent: Mono,
    pub lease_end: Mono,
    pub from: Percent,
    pub phase: Phase,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Phase {
    Sent,
    Accepted,
    /// Seen done by feedback.
    Confirmed,
    /// Unknown to us: read back, never sent again.
    Unknown,
}

/// What leaves an outlet, summed into 5-minute buckets.
#[derive(Clone, PartialEq, Debug, Default)]
pub(crate) struct Meter {
    pub last: Option<Utc>,
    /// The flow at `last`, m3/s.
    pub last_flow: f64,
    pub bucket: Option<Window>,
    pub volume: f64,
    pub estimated: bool,
    /// (until, mean flow over the piece), for the averaging clause; oldest first.
    pub recent: Vec<(Window, f64)>,
    /// The lawful window under way and how long nothing left in it, with the first cause.
    pub unused: Option<Unused>,
}

#[derive(Clone, PartialEq, Debug)]
pub(crate) struct Unused {
    pub window: Window,
    pub tide: TideNumber,
    pub idle: Span,
    pub cause: Option<Cause>,
}

/// A pump may run once its gate stands open this far.
const WAY_OPEN_MIN: Percent = Percent::of(10.0);

impl State {
    pub fn new(site: Arc<Site>, config: Config) -> Self {
        let rules = site.assets.iter().map(|a| rules_of(&site, &config, a)).collect();
        let validator = Validator::new(&site);
        let outlets = site.outlets.len();
        Self {
            rules,
            term: Term(0),
            mode: Mode::Observe,
            trust: ClockTrust::Distrusted,
            journal_lost: None,
            safe_latch: None,
            authorisation: None,
            resume: None,
            armed: None,
            armed_reasons: Vec::new(),
            self_test: interlock::self_test(),
            adapters_up: vec![false; site.adapters.len()],
            validator,
            raw: vec![None; site.signals.len()],
            assets: vec![AssetState::default(); site.assets.len()],
            forecast: None,
            lawful: vec![None; outlets],
            plans: vec![None; outlets],
            jobs: Jobs {
                planned_at: vec![None; outlets],
                plan_wanted: vec![true; outlets],
                ..Jobs::default()
            },
            tallies: Tallies::default(),
            meters: vec![Meter::default(); outlets],
            next_command: 1,
            next_plan: 1,
            next_job: 1,
            site,
            config,
        }
    }

    pub fn site(&self) -> &Site {
        &self.site
    }
    pub fn mode(&self) -> Mode {
        self.mode
    }
    pub fn term(&self) -> Term {
        self.term
    }
    pub fn trust(&self) -> ClockTrust {
        self.trust
    }
    /// Whether the site is armed, and if not, all the reasons.
    pub fn armed(&self) -> (bool, Vec<String>) {
        (self.armed == Some(true), self.armed_words())
    }
    pub(crate) fn armed_words(&self) -> Vec<String> {
        self.armed_reasons.iter().map(|(_, words)| words.clone()).collect()
    }
    pub fn safe_latch(&self) -> Option<&str> {
        self.safe_latch.as_deref()
    }
    pub fn authorisation(&self) -> Option<&StandingAuthorisation> {
        self.authorisation.as_ref()
    }
    pub fn forecast(&self) -> Option<&Forecast> {
        self.forecast.as_deref()
    }
    pub fn lawful(&self, outlet: usize) -> Option<&Lawful> {
        self.lawful[outlet].as_ref()
    }
    pub fn plan(&self, outlet: usize) -> Option<&Plan> {
        self.plans[outlet].as_ref()
    }
    pub fn tallies(&self) -> &Tallies {
        &self.tallies
    }
    pub fn readings(&self, now: Utc) -> Vec<model::Validated> {
        self.validator.all(now)
    }
    pub fn adapter_up(&self, adapter: model::AdapterId) -> bool {
        self.adapters_up[adapter.index()]
    }
    /// Who keeps the asset from the program, in words; `None` when it is the program's.
    pub fn asset_state(&self, asset: AssetId) -> Option<String> {
        let a = &self.assets[asset.index()];
        let locked = a.locked_by.as_ref().map(|who| format!("out of service, locked by {who}"));
        let tripped = || a.tripped.as_ref().map(|why| format!("tripped: {why}"));
        let hand = || a.hand.map(|(p, until)| format!("in hand at {p:.0} until {until}"));
        let hold = || a.hold_until.map(|until| format!("held at rest until {until}"));
        locked.or_else(tripped).or_else(hand).or_else(hold)
    }
    /// What the asset is commanded to do now.
    pub fn commanded(&self, asset: AssetId) -> Option<Action> {
        self.assets[asset.index()].command.map(|c| c.action)
    }
    /// Whether a command of the asset is under way or active: an intent is open.
    pub fn intent_open(&self, asset: AssetId) -> bool {
        self.assets[asset.index()].command.is_some()
    }

    /// Whether feedback shows the asset at rest (shut or stopped).
    pub fn at_rest(&self, asset: AssetId, boot: Mono) -> bool {
        crate::decide::at_rest(self, asset, boot)
    }

    pub(crate) fn outlet_no(&self, asset: AssetId) -> Option<usize> {
        self.site.outlets.iter().position(|o| o.gate == asset || o.pumps.contains(&asset))
    }
    pub(crate) fn active(&self, asset: AssetId) -> bool {
        self.assets[asset.index()].command.is_some_and(|c| c.action.is_active())
    }
    pub(crate) fn want_plan(&mut self) {
        self.jobs.plan_wanted.fill(true);
    }
    pub(crate) fn new_command(&mut self) -> u64 {
        let id = self.term.0 << 32 | self.next_command;
        self.next_command += 1;
        id
    }
    pub(crate) fn new_job(&mut self) -> JobId {
        let id = JobId(self.term.0 << 32 | self.next_job);
        self.next_job += 1;
        id
    }
    pub(crate) fn new_plan_id(&mut self) -> PlanId {
        let id = PlanId(self.next_plan);
        self.next_plan += 1;
        id
    }
    /// The first good level of the outlet's storage.
    pub(crate) fn storage_level(&self, outlet: &Outlet, now: Utc) -> Option<f64> {
        let signals = &self.site.storage(outlet.storage).level_signals;
        signals.iter().find_map(|s| self.validator.state(*s, now).now())
    }
    /// Metered flow at the ports, if the meter is good.
    pub(crate) fn metered_flow(&self, outlet: &Outlet, now: Utc) -> Option<f64> {
        self.validator.state(outlet.flow_signal?, now).now()
    }
    /// The asset's own position feedback, percent, as the interlock would read it.
    pub(crate) fn position(&self, asset: AssetId, boot: Mono) -> Option<f64> {
        self.raw_of(self.site.asset(asset).position, boot)?.checked().ok()
    }
    /// What an outlet's gate passes that this term did not order: the metered flow of a gate that
    /// was left open.
    pub(crate) fn left_open_flow(&self, outlet: &Outlet, now: Utc) -> f64 {
        let carried = self.assets[outlet.gate.index()].carried;
        let open = carried.is_some_and(|a| a.is_active());
        if open { self.metered_flow(outlet, now).unwrap_or(0.0).max(0.0) } else { 0.0 }
    }
    pub(crate) fn released_this_tide(&self, tide: TideNumber) -> CubicMetres {
        self.tallies.in_tide(tide)
    }
}

fn rules_of(site: &Site, config: &Config, asset: &Asset) -> Rules {
    let kind = match (&asset.kind, site.outlet_of(asset.id)) {
        (AssetKind::Gate(gate), Some(outlet)) => {
            let slowest = outlet.pumps.iter().filter_map(|p| match &site.asset(*p).kind {
                AssetKind::Pump(pump) => Some(pump.start_timeout),
                AssetKind::Gate(_) => None,
            });
            Kind::Gate(GateRules {
                port_centre_m: outlet.pipe.port_centre.get(),
                density_excess: outlet.pipe.density_excess,
                assist_grace: gate.stroke.scaled(0.25)
                    + slowest.max().unwrap_or(Span::ZERO)
                    + Span::seconds(60),
            })
        }
        (AssetKind::Gate(_), None) => Kind::Gate(GateRules {
            port_centre_m: f64::MIN,
            density_excess: 0.0,
            assist_grace: Span::ZERO,
        }),
        (AssetKind::Pump(pump), outlet) => Kind::Pump(PumpRules {
            starts_per_hour_max: pump.starts_per_hour_max,
            rest_min: pump.rest_min,
            inner_m_min: outlet
                .map_or(f64::MIN, |o| site.storage(o.storage).level_lowest_working.get()),
            way_open_min: WAY_OPEN_MIN,
        }),
    };
    Rules {
        site: Digest::new().bytes(site.name.as_bytes()).get(),
        asset: asset.id.0,
        kind,
        lease: asset.lease,
        permit_life: config.permit_life,
        move_rest: asset.move_rest,
    }
}
