//! From rows to what one term hands to the next.
//!
//! The rules, one a field of [`Carried`]:
//!
//! * `mode`: the mode at the end: of the last start, change of mode or reset of the safe latch
//!   (which brings back observe).
//! * `authorisation`: the last accepted act that gave one, with the digests of the run in which it
//!   was given; gone when it has ended by the last row, or by an accepted act `mode observe` since.
//! * `latches`: set by `Latched`, the last cause an asset; cleared by `Reset` of the same asset (or
//!   of the site).
//! * `locks`: set and cleared by accepted acts, with who holds them.
//! * `holds`: by accepted acts `hold`, and `rest` for the hour that follows it, less those given
//!   back by `auto` or ended by the last row.
//! * `released`: the buckets that end within 62 days before the last row.
//! * `open_intents`: the last intent of each asset that passes water or uses power, until a `Rest`
//!   of it, a shut or stop that the plant confirmed, or `Stopping`. An intent that was refused never
//!   counted: what stood before it does.
//! * `starts`: intents to run in the 24 h before the last row.
//! * `last_plan`: the greatest number of a plan.
//! * `term`, `last_seen`: of the last row. `build` and digests: of the last start.
//!
//! Whatever cannot be understood is carried as the safe latch, so that a person looks before
//! anything moves: a row that does not read, or a latch, lock or open intent on an asset that the
//! site file no longer has. A reset of the safe latch also clears what had been strange before it.
//!
//! What the fold keeps on the way stays small: at each change of the day it drops what has ended
//! (buckets and starts past their time, holds that are over). A clock that jumped ahead by mistake
//! must not make it drop what still counts once the clock is right again: so, after a jump of more
//! than a day, nothing younger than the jump ends until the clock has gone on from there for 62 days,
//! or has gone back. All this is part of the state, so that a snapshot of it loses nothing.

use std::collections::{BTreeMap, BTreeSet};

use engine::{Act, ActKind, Carried, Entry, Mode, OpenIntent, Outcome, StandingAuthorisation};
use interlock::Action;
use model::{AssetId, PlanId, Site, Term};
use units::{Span, Utc};

use crate::carried::Released;
use crate::decode::read;
use crate::names::{Gathered, Named, Names};
use crate::note::NOTES;
use crate::{Row, kind};

/// How long a released bucket matters: two of the longest calendar months.
pub const RELEASED_KEPT: Span = Span::days(62);
const STARTS_KEPT: Span = Span::hours(24);
/// Between two rows: more than this is a jump of the clock, or a long outage. What has ended is kept
/// for as long again, as shorter jumps are not noticed.
const JUMP: Span = Span::days(1);
/// The hold that the engine puts on an asset that a person sends to rest.
const HELD_AFTER_REST: Span = Span::hours(1);

/// What the rows so far add up to. Feed it as the rows stream by; it keeps no row.
#[derive(Clone, Debug)]
pub struct Fold {
    /// The assets of the site file as it is now.
    site: Vec<(String, AssetId)>,
    /// What is below has the indices of these.
    pub(crate) names: Gathered,
    pub(crate) carried: Carried,
    pub(crate) latches: BTreeMap<Option<AssetId>, String>,
    pub(crate) locks: BTreeMap<AssetId, String>,
    pub(crate) holds: BTreeMap<AssetId, Utc>,
    /// A `rest all`: holds every asset that is not in `given_back` since.
    pub(crate) hold_all: Option<Utc>,
    pub(crate) given_back: BTreeSet<AssetId>,
    pub(crate) open: BTreeMap<AssetId, Vec<OpenIntent>>,
    /// (sequence of the row, why it cannot be read), the first one.
    pub(crate) unreadable: Option<(u64, String)>,
    /// Jumps of the clock that may yet turn out to be mistakes: (before, after).
    pub(crate) jumps: Vec<(Utc, Utc)>,
}

/// What the rows, in order, hand to the next term of `site`.
pub fn fold(rows: impl Iterator<Item = Row>, site: &Site) -> Carried {
    let mut fold = Fold::new(site);
    for row in rows {
        fold.push(&row);
    }
    fold.finish()
}

impl Fold {
    /// `site` is the site file as it is now; what is handed over is in its ids.
    pub fn new(site: &Site) -> Self {
        Self {
            site: site.assets.iter().map(|a| (a.name.clone(), a.id)).collect(),
            names: Gathered::default(),
            carried: Carried::default(),
            latches: BTreeMap::new(),
            locks: BTreeMap::new(),
            holds: BTreeMap::new(),
            hold_all: None,
            given_back: BTreeSet::new(),
            open: BTreeMap::new(),
            unreadable: None,
            jumps: Vec::new(),
        }
    }

    /// Rows come in order of their sequence.
    pub fn push(&mut self, row: &Row) {
        self.pass_time(row.utc);
        self.carried.term = Some(Term(row.term));
        self.carried.last_seen = Some(row.utc);
        // Most rows are decisions and confirmations of no consequence here, and notes of the record
        // itself; they are not read.
        if matches!(
            row.kind,
            kind::ARMED
                | kind::CLOCK
                | kind::DECISION
                | kind::DISCREPANCY
                | kind::WINDOW_MISSED
                | kind::SPILL_FORECAST
                | kind::ADAPTER_UP
                | kind::ADAPTER_DOWN
        ) || NOTES.contains(&row.kind)
        {
            return;
        }
        match read(row.kind, row.version, &row.body, &mut self.names) {
            Ok(entry) => self.take(entry, row.utc),
            Err(e) => {
                self.unreadable.get_or_insert((row.seq, e.to_string()));
            }
        }
    }

    fn pass_time(&mut self, now: Utc) {
        let Some(last) = self.carried.last_seen else { return };
        self.jumps.retain(|(_, after)| *after <= now && now - *after < RELEASED_KEPT);
        if now - last > JUMP {
            self.jumps.push((last, now));
        }
        let day = |t: Utc| t.as_micros().div_euclid(Span::days(1).as_micros());
        if day(now) != day(last) {
            let sure = self.jumps.iter().fold(now, |sure, (before, _)| sure.min(*before));
            self.drop_ended(sure - JUMP);
        }
    }

    fn drop_ended(&mut self, by: Utc) {
        self.carried.released.retain(|(bucket, ..)| bucket.end() > by - RELEASED_KEPT);
        self.carried.starts.retain(|(_, at)| *at > by - STARTS_KEPT);
        if self.hold_all.is_some_and(|until| until <= by) {
            self.hold_all = None;
            self.given_back.clear();
        }
        // An asset's own hold stands against a `rest all` even when it is over.
        if self.hold_all.is_none() {
            self.holds.retain(|_, until| *until > by);
        }
    }

    fn take(&mut self, entry: Entry, utc: Utc) {
        match entry {
            Entry::Started { build, site_digest, licence_digest, mode } => {
                let c = &mut self.carried;
                (c.build, c.site_digest, c.licence_digest) = (build, site_digest, licence_digest);
                c.mode = Some(mode);
            }
            Entry::Act { act, refused: None } => self.act(act, utc),
            Entry::ModeChanged { mode, .. } => self.carried.mode = Some(mode),
            Entry::PlanAdopted { plan: PlanId(n), .. } => {
                let last = self.carried.last_plan.map_or(n, |PlanId(l)| l.max(n));
                self.carried.last_plan = Some(PlanId(last));
            }
            Entry::Intent { asset, action, command, .. } => {
                self.intent(OpenIntent { asset, command, action, at: utc });
            }
            Entry::Outcome { asset, command, outcome: Outcome::Refused(_) } => {
                self.open.entry(asset).or_default().retain(|o| o.command != command);
            }
            Entry::Outcome { asset, command, outcome: Outcome::Accepted } => {
                self.supersede(asset, command);
            }
            Entry::Confirmed { asset, command, .. } => self.confirmed(asset, command),
            Entry::Rest { asset, .. } => {
                self.open.remove(&asset);
            }
            Entry::Latched { asset, cause } => {
                self.latches.insert(asset, cause);
            }
            Entry::Reset { asset } => {
                self.latches.remove(&asset);
                if asset.is_none() {
                    self.carried.mode = Some(Mode::Observe);
                    self.forget_strange();
                }
            }
            Entry::Released { tide, bucket, volume, .. } => {
                self.carried.released.push((bucket, volume, tide));
            }
            Entry::Stopping { .. } => self.open.clear(),
            _ => {}
        }
    }

    fn act(&mut self, act: Act, utc: Utc) {
        match act.kind {
            ActKind::Mode(Mode::Observe) => self.carried.authorisation = None,
            ActKind::Authorise { until } => {
                let c = &mut self.carried;
                c.authorisation = Some(StandingAuthorisation {
                    by: act.by,
                    reason: act.reason,
                    until,
                    build: c.build.clone(),
                    site_digest: c.site_digest.clone(),
                    licence_digest: c.licence_digest.clone(),
                });
            }
            ActKind::Hold { asset, until } => {
                self.holds.insert(asset, until);
            }
            ActKind::Auto { asset } => {
                self.holds.remove(&asset);
                self.given_back.insert(asset);
            }
            ActKind::Rest { asset: Some(asset) } => {
                self.holds.insert(asset, utc + HELD_AFTER_REST);
            }
            ActKind::Rest { asset: None } => {
                self.holds.clear();
                self.given_back.clear();
                self.hold_all = Some(utc + HELD_AFTER_REST);
            }
            ActKind::OutOfService { asset, locked: true } => {
                self.locks.insert(asset, act.by);
            }
            ActKind::OutOfService { asset, locked: false } => {
                self.locks.remove(&asset);
            }
            ActKind::Mode(_)
            | ActKind::Confirm { .. }
            | ActKind::Hand { .. }
            | ActKind::Reset { .. }
            | ActKind::TrustClock => {}
        }
    }

    fn intent(&mut self, intent: OpenIntent) {
        if intent.action == Action::Run {
            self.carried.starts.push((intent.asset, intent.at));
        }
        let open = self.open.entry(intent.asset).or_default();
        open.retain(|o| o.command != intent.command);
        open.push(intent);
    }

    /// From here on only this command and later ones of the asset count.
    fn supersede(&mut self, asset: AssetId, command: u64) {
        let open = self.open.entry(asset).or_default();
        if let Some(no) = open.iter().position(|o| o.command == command) {
            open.drain(..no);
        }
    }

    fn confirmed(&mut self, asset: AssetId, command: u64) {
        self.supersede(asset, command);
        let open = self.open.entry(asset).or_default();
        open.retain(|o| o.command != command || o.action.is_active());
    }

    /// A person has looked: what names an asset that is no more is done with.
    fn forget_strange(&mut self) {
        let mut all: BTreeSet<AssetId> = self.latches.keys().flatten().copied().collect();
        all.extend(self.locks.keys().chain(self.open.keys()));
        all.retain(|a| self.resolve(*a).is_none());
        for asset in all {
            self.latches.remove(&Some(asset));
            self.locks.remove(&asset);
            self.open.remove(&asset);
        }
        self.unreadable = None;
    }

    /// What is handed over.
    pub fn finish(mut self) -> Carried {
        let mut carried = core::mem::take(&mut self.carried);
        let mut strange: Vec<String> = Vec::new();
        if let Some((seq, why)) = self.unreadable.take() {
            strange.push(format!("row {seq} of the record cannot be read: {why}"));
        }
        for (asset, cause) in core::mem::take(&mut self.latches) {
            match asset.map(|a| (a, self.resolve(a))) {
                None => carried.latches.push((None, cause)),
                Some((_, Some(id))) => carried.latches.push((Some(id), cause)),
                Some((a, None)) => strange.push(self.gone("a trip", a)),
            }
        }
        for (asset, who) in core::mem::take(&mut self.locks) {
            match self.resolve(asset) {
                Some(id) => carried.locks.push((id, who)),
                None => strange.push(self.gone(&format!("a lock of {who}"), asset)),
            }
        }
        for (asset, open) in core::mem::take(&mut self.open) {
            let Some(intent) = last_active(&open) else { continue };
            match self.resolve(asset) {
                Some(id) => carried.open_intents.push(OpenIntent { asset: id, ..intent }),
                None => strange.push(self.gone("an open command", asset)),
            }
        }
        let last = carried.last_seen.unwrap_or(Utc::EPOCH);
        carried.holds = self.holds_at(last);
        carried.starts = self.starts_before(&carried.starts, last);
        carried.authorisation = carried.authorisation.take().filter(|a| a.until > last);
        carried.released = recent(carried.released, last);
        latch(&mut carried, strange);
        carried
    }

    fn resolve(&self, asset: AssetId) -> Option<AssetId> {
        let name = self.names.asset_name(asset);
        self.site.iter().find(|(n, _)| n == name).map(|(_, id)| *id)
    }

    fn gone(&self, what: &str, asset: AssetId) -> String {
        let name = self.names.asset_name(asset);
        format!("the record has {what} on {name}, which the site file does not have")
    }

    fn holds_at(&mut self, last: Utc) -> Vec<(AssetId, Utc)> {
        let mut holds = Vec::new();
        for (name, site_id) in &self.site {
            // Gathering a name that no row had gives it an index that no map holds.
            let Ok(id) = self.names.asset(name) else { continue };
            let all = self.hold_all.filter(|_| !self.given_back.contains(&id));
            let until = self.holds.get(&id).copied().or(all);
            holds.extend(until.filter(|u| *u > last).map(|u| (*site_id, u)));
        }
        holds
    }

    fn starts_before(&self, all: &[(AssetId, Utc)], last: Utc) -> Vec<(AssetId, Utc)> {
        let recent = all.iter().filter(|(_, at)| *at > last - STARTS_KEPT);
        recent.filter_map(|(a, at)| self.resolve(*a).map(|id| (id, *at))).collect()
    }
}

/// The last command of an asset that passes water or uses power and may still be under way. A shut
/// or stop that was not confirmed leaves what was before it open.
fn last_active(open: &[OpenIntent]) -> Option<OpenIntent> {
    open.iter().rev().find(|o| o.action.is_active()).copied()
}

fn recent(released: Released, last: Utc) -> Released {
    released.into_iter().filter(|(bucket, ..)| bucket.end() > last - RELEASED_KEPT).collect()
}

fn latch(carried: &mut Carried, strange: Vec<String>) {
    if strange.is_empty() {
        return;
    }
    let words = strange.join("; ");
    match carried.latches.iter_mut().find(|(asset, _)| asset.is_none()) {
        Some((_, cause)) => *cause = format!("{cause}; {words}"),
        None => carried.latches.insert(0, (None, words)),
    }
}
