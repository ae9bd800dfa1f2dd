//! One of everything that is ever written, in fixed values; the golden files hold their bytes. What
//! is here is never changed, only added to: what a version wrote, every later one must read.

use engine::{
    Act, ActKind, Carried, ClockTrust, Entry, Event, Mode, OpenIntent, Outcome, Product, Stamp,
    StandingAuthorisation,
};
use interlock::Action;
use model::*;
use record::{AnchorSignature, Note, Summary};
use units::*;

use crate::scenarios::tarrow::tarrow;

/// A site whose names stay as they are whatever becomes of the demonstration site.
pub fn site() -> Site {
    let mut site = tarrow();
    site.assets.truncate(2);
    site.signals.truncate(3);
    site.adapters.truncate(1);
    site.licence.clauses.truncate(2);
    ["penstock", "pump-1"].iter().zip(&mut site.assets).for_each(|(n, a)| a.name = (*n).into());
    let signals = ["lagoon-level", "ports-flow", "ammonia"];
    signals.iter().zip(&mut site.signals).for_each(|(n, s)| s.name = (*n).into());
    site.adapters[0].name = "plant-bus".into();
    ["2.4", "2.10"].iter().zip(&mut site.licence.clauses).for_each(|(n, c)| c.number = (*n).into());
    site
}

const GATE: AssetId = AssetId(0);
const PUMP: AssetId = AssetId(1);
const OPEN: Action = Action::Open(Percent::of(34.5));
const COMMAND: u64 = 3 << 32 | 7;

pub fn at() -> Utc {
    Utc::from_civil(2027, 5, 1, 3, 0, 0).unwrap()
}

fn window(minutes: i64) -> Window {
    Window::new(at(), at() + Span::minutes(minutes)).unwrap()
}

fn text(words: &str) -> String {
    words.to_owned()
}

pub fn entries() -> Vec<(&'static str, Entry)> {
    [site_wide(), acts(), water(), commands(), decisions()].concat()
}

fn site_wide() -> Vec<(&'static str, Entry)> {
    let mode = |mode| Entry::ModeChanged { mode, why: text("A. Reeve") };
    let armed = |armed, reasons: &[&str]| Entry::Armed {
        armed,
        reasons: reasons.iter().map(|r| text(r)).collect(),
    };
    let clock = |trust| Entry::Clock { trust, why: text("it stepped by 3 s") };
    let started = Entry::Started {
        build: text("b1"),
        site_digest: text("5e"),
        licence_digest: text("1c"),
        mode: Mode::Observe,
    };
    vec![
        ("started", started),
        ("mode-changed/observe", mode(Mode::Observe)),
        ("mode-changed/advise", mode(Mode::Advise)),
        ("mode-changed/automatic", mode(Mode::Automatic)),
        ("armed/yes", armed(true, &[])),
        ("armed/no", armed(false, &["adapter plant-bus is down", "no forecast: Gezeiten für 水"])),
        ("clock/trusted", clock(ClockTrust::Trusted)),
        ("clock/distrusted", clock(ClockTrust::Distrusted)),
        ("adapter-up", Entry::AdapterUp { adapter: text("plant-bus") }),
        ("adapter-down", Entry::AdapterDown { adapter: text("plant-bus"), why: text("killed") }),
        ("stopping", Entry::Stopping { why: text("asked to") }),
    ]
}

fn act(kind: ActKind) -> Act {
    Act { by: text("A. Reeve"), reason: text("spring tide"), peer: text("uid 1000"), kind }
}

fn acts() -> Vec<(&'static str, Entry)> {
    let until = at() + Span::hours(6);
    let done = |name, kind| (name, Entry::Act { act: act(kind), refused: None });
    let refused = Some(text("its cause is still there"));
    let setting = Percent::of(12.5);
    vec![
        done("act/mode", ActKind::Mode(Mode::Automatic)),
        done("act/authorise", ActKind::Authorise { until }),
        done("act/confirm", ActKind::Confirm { asset: GATE }),
        done("act/hold", ActKind::Hold { asset: GATE, until }),
        done("act/hand", ActKind::Hand { asset: GATE, setting, until }),
        done("act/auto", ActKind::Auto { asset: GATE }),
        done("act/lock", ActKind::OutOfService { asset: PUMP, locked: true }),
        done("act/unlock", ActKind::OutOfService { asset: PUMP, locked: false }),
        done("act/reset", ActKind::Reset { asset: Some(GATE) }),
        done("act/reset-site", ActKind::Reset { asset: None }),
        done("act/rest", ActKind::Rest { asset: Some(PUMP) }),
        done("act/rest-all", ActKind::Rest { asset: None }),
        done("act/trust-clock", ActKind::TrustClock),
        ("act/refused", Entry::Act { act: act(ActKind::Reset { asset: Some(GATE) }), refused }),
    ]
}

fn water() -> Vec<(&'static str, Entry)> {
    let plan = |n, parent| Entry::PlanAdopted {
        plan: PlanId(n),
        parent,
        request_digest: 0x0123_4567_89ab_cdef,
        forecast_digest: u64::MAX,
        released: CubicMetres::of(4_500.0),
        spill: CubicMetres::of(0.1),
    };
    let released = |estimated| Entry::Released {
        tide: 89_864,
        bucket: window(5),
        volume: CubicMetres::of(312.5),
        estimated,
    };
    let clauses = vec![ClauseId(0), ClauseId(1)];
    let spill = Entry::SpillForecast { window: window(90), volume: CubicMetres::of(80.0), clauses };
    let missed = Entry::WindowMissed { tide: -1, window: window(180), cause: text("latch") };
    vec![
        ("plan-adopted/first", plan(1, None)),
        ("plan-adopted/next", plan(2, Some(PlanId(1)))),
        ("released", released(false)),
        ("released/estimated", released(true)),
        ("window-missed", missed),
        ("spill-forecast", spill),
    ]
}

fn commands() -> Vec<(&'static str, Entry)> {
    let intent = |action| Entry::Intent {
        asset: GATE,
        action,
        command: 7,
        lease_end: Mono::from_nanos(9),
        state_seq: 11,
        readings: 13,
    };
    let outcome = |outcome| Entry::Outcome { asset: GATE, command: COMMAND, outcome };
    let rest = |action| Entry::Rest { asset: GATE, action, cause: text("lease out") };
    let wanted = 40.0;
    let off = |found| Entry::Discrepancy { asset: GATE, command: COMMAND, wanted, found };
    let latched = |asset| Entry::Latched { asset, cause: text("it stuck at 12 %") };
    vec![
        ("intent", intent(OPEN)),
        ("intent/shut", intent(Action::Shut)),
        ("intent/run", intent(Action::Run)),
        ("intent/stop", intent(Action::Stop)),
        ("outcome/accepted", outcome(Outcome::Accepted)),
        ("outcome/refused", outcome(Outcome::Refused(text("in local")))),
        ("outcome/unknown", outcome(Outcome::Unknown(text("no answer in 2 s")))),
        ("confirmed", Entry::Confirmed { asset: GATE, command: COMMAND, position: 34.25 }),
        ("rest/close", rest(RestAction::Close)),
        ("rest/open", rest(RestAction::Open)),
        ("rest/stop", rest(RestAction::Stop)),
        ("rest/hold", rest(RestAction::Hold)),
        ("rest/hand-to-local", rest(RestAction::HandToLocal)),
        ("discrepancy", off(Some(12.0))),
        ("discrepancy/not-seen", off(None)),
        ("latched", latched(Some(GATE))),
        ("latched/site", latched(None)),
        ("reset", Entry::Reset { asset: Some(GATE) }),
        ("reset/site", Entry::Reset { asset: None }),
    ]
}

/// Every `By`, `About`, `Is` and `MustBe`.
fn decisions() -> Vec<(&'static str, Entry)> {
    let by = [
        By::AssetState,
        By::Interlock("I4"),
        By::Latch,
        By::Clause(ClauseId(1)),
        By::Mode,
        By::Armed,
        By::Person,
        By::Plan,
    ];
    let about = [
        About::Signal(SignalId(2)),
        About::Now,
        About::Mode,
        About::Latch,
        About::ClockTrust,
        About::Journal,
        About::Forecast,
        About::Adapter(AdapterId(0)),
        About::Position(GATE),
        About::Lock(GATE),
        About::Selector(GATE),
        About::Hold(PUMP),
        About::Confirmation(GATE),
        About::LastMove(GATE),
        About::VolumeThisTide,
        About::VolumeRolling,
        About::VolumeMonth,
        About::MeanFlow,
        About::Plan,
    ];
    let is = [Is::Number(5.25), Is::Instant(at()), Is::Words(text("hold")), Is::Nothing];
    let must_be = [
        MustBe::AtLeast(1.0),
        MustBe::AtMost(-0.5),
        MustBe::Inside(window(60)),
        MustBe::After(at()),
        MustBe::Words("shut"),
    ];
    let cause = |n: usize| {
        let (is, must_be) = (is[n % is.len()].clone(), must_be[n % must_be.len()].clone());
        Cause { by: by[n % by.len()], fact: Fact { about: about[n], is, must_be } }
    };
    let decision = |action, plan, causes| Entry::Decision { asset: GATE, action, plan, causes };
    let all = (0..about.len()).map(cause).collect();
    vec![
        ("decision", decision(OPEN, Some(PlanId(2)), Vec::new())),
        ("decision/every-cause", decision(Action::Shut, None, all)),
    ]
}

pub fn notes() -> Vec<(&'static str, Note)> {
    let (day, digest, of_seq) = (20_939, [0xd1; 32], 1_234);
    let file = || text("2027-05-01.seg");
    let days = (day, day + 1);
    let anchor = |signature| Note::Anchored { of_seq, hash: digest, signature };
    let signature = AnchorSignature { key: [0xa1; 32], bytes: [0xb2; 64] };
    let (by, reason) = (text("A. Reeve"), text("inquiry 7"));
    let summary = Summary {
        day,
        rows: 1_900,
        openings: 52,
        released_m3: 8_765.25,
        windows_missed: 1,
        trips: 2,
        acts: 3,
        refusals: 4,
        rests: 5,
        discrepancies: 6,
    };
    let lost = Note::JournalBack { lost_at: at(), why: text("disk full"), rows_kept: 12 };
    let hold = Note::LegalHold {
        from_day: days.0,
        to_day: days.1,
        by: by.clone(),
        reason: reason.clone(),
    };
    vec![
        ("sealed", Note::Sealed { day, file: file(), digest, events: 1, minutes: 2, bytes: 3 }),
        (
            "segment-deleted",
            Note::SegmentDeleted { day: -1, file: file(), digest, why: text("past its time") },
        ),
        ("snapshot", Note::Snapshot { of_seq, bytes: vec![1, 2, 3] }),
        ("anchored", anchor(None)),
        ("anchored/signed", anchor(Some(signature))),
        ("backed-up", Note::BackedUp { file: file(), of_seq, hash: digest, bytes: 4_096 }),
        ("legal-hold", hold),
        ("hold-lifted", Note::HoldLifted { from_day: days.0, to_day: days.1, by, reason }),
        ("migrated", Note::Migrated { from: 1, to: 2 }),
        ("summary", Note::Summary(summary)),
        ("journal-back", lost),
    ]
}

pub fn stamp() -> Stamp {
    let boot = Mono::from_nanos(864_000_000_000_000);
    Stamp { seq: 300, term: Term(3), utc: at(), boot, trust: ClockTrust::Trusted }
}

pub fn events() -> Vec<(&'static str, Stamp, Event)> {
    let why = || text("asked to");
    let job = JobId(COMMAND);
    let accepted = Outcome::Accepted;
    let failed = Product::Failed(text("no constants"));
    let frame = Event::Frame(readings());
    let distrusted = Stamp { trust: ClockTrust::Distrusted, ..stamp() };
    let list = vec![
        ("started", Event::Started(Box::new(carried()))),
        ("started/first", Event::Started(Box::default())),
        ("frame", frame),
        ("adapter-up", Event::AdapterUp(AdapterId(0))),
        ("adapter-down", Event::AdapterDown { adapter: AdapterId(0), why: why() }),
        ("outcome", Event::Outcome { command: COMMAND, outcome: accepted }),
        ("act", Event::Act(act(ActKind::TrustClock))),
        ("job-done/forecast", Event::JobDone { job, product: Product::Forecast(forecast()) }),
        ("job-done/plan", Event::JobDone { job, product: Product::Plan(plan()) }),
        ("job-done/failed", Event::JobDone { job, product: failed }),
        ("journal-lost", Event::JournalLost { why: why() }),
        ("journal-back", Event::JournalBack),
        ("stopping", Event::Stopping { why: why() }),
        ("replan", Event::Replan),
        ("wake", Event::Wake),
    ];
    let mut list: Vec<_> = list.into_iter().map(|(name, e)| (name, stamp(), e)).collect();
    list.push(("clock-changed", distrusted, Event::ClockChanged { why: why() }));
    list
}

/// Each form of a value, of a time and of a signal's place.
fn readings() -> Vec<Reading> {
    let reading = |signal, value, source_good, ms| Reading {
        signal: SignalId(signal),
        value,
        source_good,
        at: at() + Span::millis(ms),
    };
    vec![
        reading(0, 2.417, true, -3),
        reading(1, 0.0, true, -3),
        reading(2, 100.0 / 3.0, false, -3),
        reading(1, -12.000_001, true, 0),
        reading(1, f64::MAX, true, -86_400_000),
        reading(0, -0.0, true, 0),
    ]
}

fn carried() -> Carried {
    Carried {
        term: Some(Term(2)),
        build: text("b1"),
        site_digest: text("5e"),
        licence_digest: text("1c"),
        mode: Some(Mode::Automatic),
        authorisation: Some(StandingAuthorisation {
            by: text("A. Reeve"),
            reason: text("spring tide"),
            until: at() + Span::days(2),
            build: text("b0"),
            site_digest: text("5d"),
            licence_digest: text("1b"),
        }),
        last_seen: Some(at()),
        latches: vec![(None, text("clock")), (Some(GATE), text("jam"))],
        locks: vec![(PUMP, text("A. Reeve"))],
        holds: vec![(GATE, at() + Span::hours(1))],
        released: released(),
        open_intents: vec![OpenIntent { asset: GATE, command: COMMAND, action: OPEN, at: at() }],
        starts: vec![(PUMP, at())],
        last_plan: Some(PlanId(2)),
    }
}

/// One of the usual kind after another, and one that is not.
fn released() -> Vec<(Window, CubicMetres, TideNumber)> {
    let after = Window::new(at() + Span::minutes(5), at() + Span::minutes(10)).unwrap();
    let odd = Window::new(at() + Span::hours(2), at() + Span::hours(3)).unwrap();
    let m3 = CubicMetres::of;
    vec![(window(5), m3(312.5), 89_864), (after, m3(100.0 / 3.0), 89_864), (odd, m3(0.5), 89_865)]
}

fn turn(kind: TurnKind) -> Turn {
    Turn {
        number: 89_864,
        kind,
        at: at(),
        level: Level::of(3.25),
        time_sd: Span::minutes(6),
        level_sd: Metres::of(0.1),
    }
}

fn series() -> Series {
    Series::new(at(), Span::minutes(5), vec![1.5, -2.5]).unwrap()
}

fn forecast() -> Box<Forecast> {
    let (high, low) = (turn(TurnKind::High), turn(TurnKind::Low));
    let current_turn =
        CurrentTurn { number: 89_864, to_seaward: true, at: at(), time_sd: Span::minutes(5) };
    let place = |n, current| PlaceForecast {
        place: PlaceId(n),
        method: Method::Differences,
        turns: vec![high],
        level: series(),
        current,
        current_turns: vec![current_turn],
    };
    let ebb_range = Metres::of(6.5);
    Box::new(Forecast {
        as_of: at(),
        span: window(600),
        digest: 0xfeed,
        port_turns: vec![high, low],
        tides: vec![Tide { number: 89_864, window: window(745), high, ebb_range }],
        port_level: series(),
        places: vec![place(0, None), place(1, Some(series()))],
    })
}

fn plan() -> Box<Plan> {
    let clause = ClauseId(1);
    let flow = CubicMetresPerSecond::of(0.9);
    let openings = [5.0, 10.0, 20.0, 30.0, 40.0].map(Percent::of);
    let release = Setpoint::Release { target: flow, openings };
    let slot = |setpoint, why| Slot { window: window(5), setpoint, why, tide: Some(89_864) };
    let releasing = |limited_by| slot(release, SlotReason::Releasing { limited_by });
    let gate = vec![
        slot(Setpoint::Shut, SlotReason::OutsideWindow { clause: None }),
        slot(Setpoint::Shut, SlotReason::OutsideWindow { clause: Some(clause) }),
        slot(Setpoint::Shut, SlotReason::EdgeMargin { clause: Some(clause) }),
        releasing(FlowLimit::Clause(clause)),
        releasing(FlowLimit::Head),
        releasing(FlowLimit::Pump),
        releasing(FlowLimit::Ramp),
        slot(Setpoint::Shut, SlotReason::CapReached { clause }),
        slot(Setpoint::Shut, SlotReason::StorageLow),
        slot(Setpoint::Shut, SlotReason::NoHead),
    ];
    let pump = vec![
        slot(Setpoint::Stopped, SlotReason::WaitingForHead),
        slot(Setpoint::Stopped, SlotReason::GravityEnough),
        slot(Setpoint::Running, SlotReason::Assisting),
        Slot { tide: None, ..slot(Setpoint::Stopped, SlotReason::Unavailable) },
    ];
    let volume = CubicMetres::of(4_500.0);
    Box::new(Plan {
        id: PlanId(2),
        parent: Some(PlanId(1)),
        as_of: at(),
        span: window(600),
        request_digest: 1,
        forecast_digest: 2,
        assets: vec![
            AssetPlan { asset: GATE, slots: gate },
            AssetPlan { asset: PUMP, slots: pump },
        ],
        releases: vec![PlannedRelease { tide: 89_864, window: window(180), volume }],
        level: series(),
        volume_released: volume,
        energy_kwh: 12.5,
        cost: 3.125,
        shortfalls: vec![Shortfall { spill: window(30), volume, clauses: vec![clause] }],
    })
}
