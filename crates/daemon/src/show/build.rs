//! Views made from the engine's state.

use engine::{Decision, Goal, Mode, Stamp, State, say};
use interlock::Action;
use model::{AssetId, FlowLimit, Plan, Setpoint, Site, SlotReason};
use units::{Span, Utc};

use super::views::{
    AdapterView, AssetPlanView, AssetView, CauseView, NextView, NowView, PlanView, ReleaseView,
    ShortfallView, SignalView, SlotView, StorageView, WhyView,
};

pub fn now_view(state: &State, stamp: &Stamp) -> NowView {
    let site = state.site();
    let (armed, reasons) = state.armed();
    let auth = state.authorisation();
    NowView {
        site: site.name.clone(),
        title: site.title.clone(),
        zone: site.zone.name().to_owned(),
        utc: stamp.utc.to_string(),
        term: stamp.term.0,
        mode: state.mode().words().to_owned(),
        armed,
        not_armed_because: reasons,
        safe_latch: state.safe_latch().map(str::to_owned),
        clock_trusted: stamp.trust == engine::ClockTrust::Trusted,
        simulated: site.all_simulated(),
        authorisation: auth.map(|a| format!("by {} until {}: {}", a.by, a.until, a.reason)),
        wrong: wrong(state, stamp),
        storages: storages(state, stamp.utc),
        assets: site.assets.iter().map(|a| asset_view(state, stamp, a.id)).collect(),
        signals: signals(state, stamp.utc),
        adapters: adapters(state),
        next: next(state, stamp.utc),
        type_next: type_next(state),
    }
}

fn adapters(state: &State) -> Vec<AdapterView> {
    let view =
        |a: &model::Adapter| AdapterView { name: a.name.clone(), up: state.adapter_up(a.id) };
    state.site().adapters.iter().map(view).collect()
}

/// What needs a person: nothing here means nothing is wrong.
fn wrong(state: &State, stamp: &Stamp) -> Vec<String> {
    let site = state.site();
    let mut wrong: Vec<String> = Vec::new();
    wrong.extend(state.safe_latch().map(|l| format!("the safe latch is set: {l}")));
    wrong.extend(state.armed().1);
    for asset in &site.assets {
        wrong.extend(state.asset_state(asset.id).map(|s| format!("{}: {s}", asset.name)));
    }
    for (spec, v) in site.signals.iter().zip(state.readings(stamp.utc)) {
        if v.quality != model::Quality::Good {
            wrong.push(format!("{} is {}", spec.name, v.quality.words()));
        }
    }
    for plan in (0..site.outlets.len()).filter_map(|o| state.plan(o)) {
        for s in &plan.shortfalls {
            let (from, m3) = (s.spill.start(), s.volume.get());
            wrong.push(format!("a spill of {m3:.0} m3 from {from} cannot be avoided lawfully"));
        }
    }
    wrong
}

fn storages(state: &State, now: Utc) -> Vec<StorageView> {
    let readings = state.readings(now);
    let view = |s: &model::Storage| StorageView {
        name: s.name.clone(),
        level_m: s.level_signals.iter().find_map(|id| readings[id.index()].now()),
        high_alarm_m: s.level_high_alarm.get(),
        spill_m: s.level_spill.get(),
    };
    state.site().storages.iter().map(view).collect()
}

fn signals(state: &State, now: Utc) -> Vec<SignalView> {
    let specs = state.site().signals.iter();
    specs
        .zip(state.readings(now))
        .map(|(s, v)| SignalView {
            name: s.name.clone(),
            value: v.good.map(|g| g.value),
            unit: s.unit.clone(),
            quality: v.quality.words().to_owned(),
            age_s: v.good.map(|g| g.age.as_seconds()),
        })
        .collect()
}

fn asset_view(state: &State, stamp: &Stamp, asset: AssetId) -> AssetView {
    let site = state.site();
    let spec = site.asset(asset);
    let decision = engine::decide(state, stamp, asset);
    let position = state.readings(stamp.utc)[spec.position.index()].now();
    AssetView {
        name: spec.name.clone(),
        position_percent: position,
        commanded: state.commanded(asset).map_or("nothing".to_owned(), action_words),
        intent_open: state.intent_open(asset),
        held_by: state.asset_state(asset),
        why: decision.causes.iter().map(|c| say::cause(site, c)).collect(),
    }
}

pub fn action_words(action: Action) -> String {
    match action {
        Action::Open(p) => format!("open to {p:.1}"),
        Action::Shut => "shut".to_owned(),
        Action::Run => "run".to_owned(),
        Action::Stop => "stop".to_owned(),
    }
}

/// The next few things: waters at the port, lawful windows, planned releases.
fn next(state: &State, now: Utc) -> Vec<NextView> {
    let site = state.site();
    let mut list: Vec<(Utc, String, Option<Utc>)> = Vec::new();
    if let Some(forecast) = state.forecast() {
        let ahead = forecast.port_turns.iter().filter(|t| t.at > now).take(2);
        for t in ahead {
            let kind = match t.kind {
                model::TurnKind::High => "high water",
                model::TurnKind::Low => "low water",
            };
            list.push((t.at, format!("{kind} at {}, {:.2}", site.port.name, t.level), None));
        }
    }
    for (no, outlet) in site.outlets.iter().enumerate() {
        let ends_later = |w: &&model::LawfulWindow| w.window.end() > now;
        let windows = state.lawful(no).map_or(&[][..], |l| &l.windows[..]);
        if let Some(w) = windows.iter().find(ends_later) {
            let text = format!("lawful window of {} (tide {})", outlet.name, w.tide);
            list.push((w.window.start(), text, Some(w.window.end())));
        }
        let releases = state.plan(no).map_or(&[][..], |p| &p.releases[..]);
        if let Some(r) = releases.iter().find(|r| r.window.end() > now) {
            let text = format!("planned release of {:.0} from {}", r.volume, outlet.name);
            list.push((r.window.start(), text, Some(r.window.end())));
        }
    }
    list.sort_by_key(|(t, ..)| *t);
    list.into_iter()
        .map(|(from, what, to)| NextView {
            what,
            from: from.to_string(),
            to: to.map(|t| t.to_string()),
            from_site_time: site.zone.show(from),
        })
        .collect()
}

fn type_next(state: &State) -> Vec<String> {
    let order = |what: &str| format!("tidereeve order SITE {what} --by NAME --reason TEXT");
    match state.mode() {
        Mode::Observe => {
            vec!["tidereeve plan SITE".to_owned(), order("mode automatic"), order("mode advise")]
        }
        Mode::Advise => vec![order("confirm ASSET"), order("mode observe")],
        Mode::Automatic => vec!["tidereeve why SITE ASSET".to_owned(), order("mode observe")],
    }
}

pub fn plan_view(site: &Site, plan: &Plan) -> PlanView {
    PlanView {
        plan: plan.id.0,
        parent: plan.parent.map(|p| p.0),
        as_of: plan.as_of.to_string(),
        from: plan.span.start().to_string(),
        to: plan.span.end().to_string(),
        request_digest: format!("{:016x}", plan.request_digest),
        released_m3: plan.volume_released.get(),
        energy_kwh: plan.energy_kwh,
        cost: plan.cost,
        releases: plan.releases.iter().map(release_view).collect(),
        shortfalls: plan.shortfalls.iter().map(|s| shortfall_view(site, s)).collect(),
        assets: plan.assets.iter().map(|a| asset_plan_view(site, a)).collect(),
        level_m: levels(plan),
    }
}

fn release_view(r: &model::PlannedRelease) -> ReleaseView {
    ReleaseView {
        tide: r.tide,
        from: r.window.start().to_string(),
        to: r.window.end().to_string(),
        volume_m3: r.volume.get(),
    }
}

fn shortfall_view(site: &Site, s: &model::Shortfall) -> ShortfallView {
    ShortfallView {
        from: s.spill.start().to_string(),
        to: s.spill.end().to_string(),
        volume_m3: s.volume.get(),
        clauses: s.clauses.iter().map(|c| site.licence.clause(*c).number.clone()).collect(),
    }
}

fn asset_plan_view(site: &Site, a: &model::AssetPlan) -> AssetPlanView {
    let slot = |s: &model::Slot| SlotView {
        from: s.window.start().to_string(),
        to: s.window.end().to_string(),
        setpoint: setpoint_words(&s.setpoint),
        why: reason_words(site, &s.why),
    };
    AssetPlanView {
        asset: site.asset(a.asset).name.clone(),
        slots: a.slots.iter().map(slot).collect(),
    }
}

fn levels(plan: &Plan) -> Vec<(String, f64)> {
    let every = Span::minutes(30);
    let mut list = Vec::new();
    let mut t = plan.level.start();
    while let Some(level) = plan.level.at(t) {
        list.push((t.to_string(), (level * 1000.0).round() / 1000.0));
        t = t + every;
    }
    list
}

fn setpoint_words(s: &Setpoint) -> String {
    match s {
        Setpoint::Shut => "shut".to_owned(),
        Setpoint::Stopped => "stopped".to_owned(),
        Setpoint::Running => "running".to_owned(),
        Setpoint::Release { target, openings } => {
            format!("{target:.2} at {:.0}", openings[4])
        }
    }
}

fn reason_words(site: &Site, why: &SlotReason) -> String {
    let number = |c: &model::ClauseId| site.licence.clause(*c).number.clone();
    let words = engine::slot_words(why);
    match why {
        SlotReason::OutsideWindow { clause: Some(c) }
        | SlotReason::EdgeMargin { clause: Some(c) }
        | SlotReason::CapReached { clause: c } => format!("{words} (clause {})", number(c)),
        SlotReason::Releasing { limited_by } => match limited_by {
            FlowLimit::Clause(c) => format!("{words}, limited by clause {}", number(c)),
            FlowLimit::Head => format!("{words}, limited by the head"),
            FlowLimit::Pump => format!("{words}, at the pumps' flow"),
            FlowLimit::Ramp => format!("{words}, along the ramp"),
        },
        _ => words.to_owned(),
    }
}

pub fn why_view(state: &State, stamp: &Stamp, asset: AssetId) -> WhyView {
    let site = state.site();
    let decision = engine::decide(state, stamp, asset);
    WhyView {
        asset: site.asset(asset).name.clone(),
        at: stamp.utc.to_string(),
        active: decision.active(),
        asked_for: asked_for(&decision),
        causes: decision
            .causes
            .iter()
            .map(|c| CauseView {
                by: say::by(site, c.by),
                about: say::about(site, c.fact.about),
                is: say::is(&c.fact.is),
                must_be: say::must_be(&c.fact.must_be),
            })
            .collect(),
        in_words: in_words(site, &decision),
    }
}

fn asked_for(decision: &Decision) -> String {
    match decision.goal {
        None => "rest".to_owned(),
        Some(Goal { setpoint, hand, .. }) => {
            format!(
                "{} by the {}",
                setpoint_words(&setpoint),
                if hand { "operator" } else { "plan" }
            )
        }
    }
}

fn in_words(site: &Site, decision: &Decision) -> String {
    let name = &site.asset(decision.asset).name;
    if decision.active() {
        return format!(
            "{name} moves water: {}, and nothing stands against it",
            asked_for(decision)
        );
    }
    let causes: Vec<String> = decision.causes.iter().map(|c| say::cause(site, c)).collect();
    let all = if causes.len() > 1 {
        "all of these would have to change"
    } else {
        "this would have to change"
    };
    format!("{name} is at rest; {all}: {}", causes.join(" | "))
}

/// Why the plan has the asset as it will be at a later instant.
pub fn why_planned(state: &State, asset: AssetId, at: Utc) -> Option<WhyView> {
    let site = state.site();
    let no = site.outlets.iter().position(|o| o.gate == asset || o.pumps.contains(&asset))?;
    let slot = state.plan(no)?.slot_at(asset, at)?;
    let name = site.asset(asset).name.clone();
    let setpoint = setpoint_words(&slot.setpoint);
    let why = reason_words(site, &slot.why);
    Some(WhyView {
        in_words: format!(
            "{name} will be {setpoint}: {why} (plan; guard and interlock still rule)"
        ),
        asset: name,
        at: at.to_string(),
        active: slot.setpoint.is_active(),
        asked_for: setpoint,
        causes: Vec::new(),
    })
}

/// A row of the record for programs.
pub fn row_json(row: &record::Row) -> serde_json::Value {
    let hash: String = row.hash.iter().map(|b| format!("{b:02x}")).collect();
    serde_json::json!({
        "seq": row.seq, "term": row.term, "utc": row.utc.to_string(),
        "kind": record::kind::name(row.kind), "subject": row.subject, "cause": row.cause,
        "words": record::describe(row), "hash": hash,
    })
}
