//! The judgement: total, in a fixed order, without allocation.

use units::{Digest, Mono, Percent, Span};

use crate::permit::{Action, Permit, Renewal};
use crate::rules::{INNER_DISAGREE_M, LEASE_MAX};
use crate::{ClockTrust, Findings, GateRules, Id, Kind, PumpRules, Raw, Rules, Scene, Subject};

/// What is wanted of the asset.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Wish {
    pub action: Action,
    /// The start rests on a time (a window), not on a level.
    pub anchored_on_time: bool,
    /// Number of the command, if it is given.
    pub command: u64,
    pub term: u64,
    pub state_seq: u64,
}

#[derive(PartialEq, Debug)]
pub enum Verdict {
    Permit(Permit),
    /// It does not move; what moves already may go on.
    Deny(Findings),
    /// It is active and must go to rest.
    Force(Findings),
}

/// May the asset do what is wished, at the boot-clock instant `now`?
///
/// Going to rest (`Shut`, `Stop`) is barred by a lock-out and the local selector only, since then
/// nothing is commanded at all; no other finding may delay protection.
pub fn judge(rules: &Rules, scene: &Scene, wish: &Wish, now: Mono) -> Verdict {
    let findings = if wish.action.is_active() {
        against_activity(rules, scene, Some(wish))
    } else {
        against_command(scene)
    };
    if findings.is_empty() {
        return Verdict::Permit(permit(rules, scene, wish, now));
    }
    if scene.state.active && findings.any_must_stay() {
        Verdict::Force(findings)
    } else {
        Verdict::Deny(findings)
    }
}

/// The answer to a renewal.
#[expect(clippy::large_enum_variant, reason = "findings stay on the stack: no allocation here")]
#[derive(PartialEq, Debug)]
pub enum Renewed {
    Renewal(Renewal),
    Force(Findings),
}

/// May the command that is under way go on? Every renewal passes here.
pub fn renew(rules: &Rules, scene: &Scene, command: u64, now: Mono) -> Renewed {
    let findings = against_activity(rules, scene, None);
    if findings.any_must_stay() {
        return Renewed::Force(findings);
    }
    Renewed::Renewal(Renewal {
        asset: rules.asset,
        command,
        not_after: now + rules.permit_life.span(),
        lease_end: now + rules.lease,
    })
}

fn permit(rules: &Rules, scene: &Scene, wish: &Wish, now: Mono) -> Permit {
    Permit {
        site: rules.site,
        asset: rules.asset,
        action: wish.action,
        command: wish.command,
        term: wish.term,
        state_seq: wish.state_seq,
        readings: digest(scene),
        not_after: now + rules.permit_life.span(),
        lease_end: now + rules.lease,
    }
}

fn digest(scene: &Scene) -> u64 {
    let mut d = Digest::new();
    let levels = scene.inner.iter().flatten().chain(scene.outer.iter());
    let others = [&scene.position, &scene.way].into_iter();
    for raw in others.chain(scene.selector.iter()).chain(levels) {
        match raw {
            Some(r) => d.f64(r.value).i64(r.age.as_micros()),
            None => d.u64(u64::MAX),
        };
    }
    d.get()
}

/// What bars any command at all.
fn against_command(scene: &Scene) -> Findings {
    let mut f = Findings::default();
    if scene.state.locked_out {
        f.add(Id::LockedOut, Subject::Asset, 1.0, 0.0);
    }
    match scene.selector {
        None => {}
        Some(raw) => match raw.map(|r| (r, r.checked())) {
            Some((_, Ok(v))) if v < 0.5 => {}
            Some((_, Ok(v))) => f.add(Id::Local, Subject::Selector, v, 0.0),
            // A selector that cannot be read is taken as local: a person may be at the panel.
            Some((r, Err(fault))) => {
                f.add_with(Id::Local, Subject::Selector, r.value, 0.0, fault.words());
            }
            None => f.add_with(Id::Local, Subject::Selector, f64::NAN, 0.0, "never read"),
        },
    }
    f
}

/// What stands against passing water or using power. Without a wish, what stands against going on.
fn against_activity(rules: &Rules, scene: &Scene, wish: Option<&Wish>) -> Findings {
    let mut f = against_command(scene);
    let starting = wish.is_some() && !scene.state.active;
    if scene.state.latched {
        f.add(Id::Latched, Subject::Asset, 1.0, 0.0);
    }
    reading(&mut f, scene.position, Subject::Position);
    let inner = inner_level(&mut f, scene);
    if rules.lease <= Span::ZERO || rules.lease > LEASE_MAX {
        f.add(Id::BadLease, Subject::Asset, rules.lease.as_seconds(), LEASE_MAX.as_seconds());
    }
    if let Some(wish) = wish {
        setting(&mut f, rules, wish);
    }
    if starting {
        against_start(&mut f, rules, scene, wish);
    }
    match &rules.kind {
        Kind::Gate(gate) => backflow(&mut f, gate, scene, inner),
        Kind::Pump(pump) => pumping(&mut f, pump, scene, inner, starting),
    }
    f
}

fn setting(f: &mut Findings, rules: &Rules, wish: &Wish) {
    let fits = match (rules.kind, wish.action) {
        (Kind::Gate(_), Action::Open(p)) => p > Percent::ZERO && p <= Percent::FULL,
        (Kind::Gate(_), Action::Shut) | (Kind::Pump(_), Action::Run | Action::Stop) => true,
        (Kind::Gate(_), Action::Run | Action::Stop)
        | (Kind::Pump(_), Action::Open(_) | Action::Shut) => false,
    };
    if !fits {
        f.add(Id::BadSetting, Subject::Asset, wish.action.setting().get(), 100.0);
    }
}

fn against_start(f: &mut Findings, rules: &Rules, scene: &Scene, wish: Option<&Wish>) {
    if scene.clock == ClockTrust::Distrusted && wish.is_some_and(|w| w.anchored_on_time) {
        f.add(Id::ClockDistrusted, Subject::Clock, 0.0, 1.0);
    }
    if let Some(since) = scene.state.since_move
        && since < rules.move_rest
    {
        let (is, least) = (since.as_seconds(), rules.move_rest.as_seconds());
        f.add(Id::MinimumRest, Subject::Asset, is, least);
    }
}

/// Adds a finding unless the reading is there and good.
fn reading(f: &mut Findings, raw: Option<Raw>, subject: Subject) -> Option<f64> {
    match raw {
        None => {
            f.add_with(Id::SignalBad, subject, f64::NAN, f64::NAN, "never read");
            None
        }
        Some(r) => match r.checked() {
            Ok(v) => Some(v),
            Err(fault) => {
                let limit = r.bounds.age_max.as_seconds();
                f.add_with(Id::SignalBad, subject, r.value, limit, fault.words());
                None
            }
        },
    }
}

/// The storage's level: the lower of two that agree; one alone if the other is bad; none, with a
/// finding, if both are bad or they disagree. Like is compared with like only.
fn inner_level(f: &mut Findings, scene: &Scene) -> Option<f64> {
    let good = |slot: Option<Option<Raw>>| slot.flatten().and_then(|r| r.checked().ok());
    match (good(scene.inner[0]), good(scene.inner[1])) {
        (Some(a), Some(b)) if (a - b).abs() > INNER_DISAGREE_M => {
            f.add(Id::SignalsDisagree, Subject::Inner(0), (a - b).abs(), INNER_DISAGREE_M);
            None
        }
        (Some(a), Some(b)) => Some(a.min(b)),
        (Some(v), None) | (None, Some(v)) => Some(v),
        (None, None) => {
            for (slot, n) in scene.inner.iter().zip(0_u8..) {
                if let Some(raw) = slot {
                    reading(f, *raw, Subject::Inner(n));
                }
            }
            if scene.inner.iter().all(Option::is_none) {
                let words = "no level of the storage";
                f.add_with(Id::SignalBad, Subject::Inner(0), f64::NAN, f64::NAN, words);
            }
            None
        }
    }
}

fn backflow(f: &mut Findings, gate: &GateRules, scene: &Scene, inner: Option<f64>) {
    let Some(outer) = scene.outer else { return };
    let Some(outer_m) = reading(f, outer, Subject::Outer) else { return };
    let Some(inner_m) = inner else { return };
    let covered_m = (outer_m - gate.port_centre_m).max(0.0);
    let net_m = inner_m - outer_m.max(gate.port_centre_m) - gate.density_excess * covered_m;
    let starting_pumps = scene.state.assisted_for.is_some_and(|s| s <= gate.assist_grace);
    if net_m <= 0.0 && !scene.state.pump_runs && !starting_pumps {
        f.add(Id::Backflow, Subject::Outer, net_m, 0.0);
    }
}

fn pumping(f: &mut Findings, pump: &PumpRules, scene: &Scene, inner: Option<f64>, starting: bool) {
    if let Some(open) = reading(f, scene.way, Subject::Way)
        && open < pump.way_open_min.get()
    {
        f.add(Id::NoOpenWay, Subject::Way, open, pump.way_open_min.get());
    }
    if let Some(level) = inner
        && level <= pump.inner_m_min
    {
        f.add(Id::DryRun, Subject::Inner(0), level, pump.inner_m_min);
    }
    if !starting {
        return;
    }
    if scene.state.starts_last_hour >= pump.starts_per_hour_max {
        let (is, most) = (scene.state.starts_last_hour, pump.starts_per_hour_max);
        f.add(Id::TooManyStarts, Subject::Asset, f64::from(is), f64::from(most));
    }
    if let Some(since) = scene.state.since_stop
        && since < pump.rest_min
    {
        let (is, least) = (since.as_seconds(), pump.rest_min.as_seconds());
        f.add(Id::MinimumRest, Subject::Asset, is, least);
    }
}

#[cfg(test)]
mod tests;
