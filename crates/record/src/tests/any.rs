//! Generated entries: every kind, every form of its fields.

use engine::{Act, ActKind, ClockTrust, Entry, Mode, Outcome};
use interlock::Action;
use model::{
    About, AdapterId, AssetId, By, Cause, ClauseId, Fact, Is, MustBe, PlanId, RestAction, SignalId,
};
use proptest::collection::vec;
use proptest::option::of;
use proptest::prelude::*;
use units::{CubicMetres, Mono, Percent, Utc, Window};

pub fn text() -> impl Strategy<Value = String> {
    "[ -~äλ水]{0,12}"
}

pub fn number() -> impl Strategy<Value = f64> {
    use proptest::num::f64::{NEGATIVE, NORMAL, POSITIVE, SUBNORMAL, ZERO};
    POSITIVE | NEGATIVE | NORMAL | SUBNORMAL | ZERO
}

pub fn utc() -> impl Strategy<Value = Utc> {
    any::<i64>().prop_map(Utc::from_micros)
}

pub fn window() -> impl Strategy<Value = Window> {
    (any::<i64>(), any::<i64>()).prop_filter_map("an empty window", |(a, b)| {
        Window::new(Utc::from_micros(a.min(b)), Utc::from_micros(a.max(b))).ok()
    })
}

pub fn asset() -> impl Strategy<Value = AssetId> {
    (0..3_u16).prop_map(AssetId)
}

fn percent() -> impl Strategy<Value = Percent> {
    (0.0..=100.0).prop_map(Percent::of)
}

fn volume() -> impl Strategy<Value = CubicMetres> {
    number().prop_map(CubicMetres::of)
}

pub fn mode() -> impl Strategy<Value = Mode> {
    prop_oneof![Just(Mode::Observe), Just(Mode::Advise), Just(Mode::Automatic)]
}

pub fn trust() -> impl Strategy<Value = ClockTrust> {
    prop_oneof![Just(ClockTrust::Trusted), Just(ClockTrust::Distrusted)]
}

pub fn action() -> impl Strategy<Value = Action> {
    prop_oneof![
        percent().prop_map(Action::Open),
        Just(Action::Shut),
        Just(Action::Run),
        Just(Action::Stop)
    ]
}

pub fn outcome() -> impl Strategy<Value = Outcome> {
    prop_oneof![
        Just(Outcome::Accepted),
        text().prop_map(Outcome::Refused),
        text().prop_map(Outcome::Unknown)
    ]
}

pub fn act() -> impl Strategy<Value = Act> {
    let kind = prop_oneof![
        mode().prop_map(ActKind::Mode),
        utc().prop_map(|until| ActKind::Authorise { until }),
        asset().prop_map(|asset| ActKind::Confirm { asset }),
        (asset(), utc()).prop_map(|(asset, until)| ActKind::Hold { asset, until }),
        (asset(), percent(), utc()).prop_map(|(asset, setting, until)| ActKind::Hand {
            asset,
            setting,
            until
        }),
        asset().prop_map(|asset| ActKind::Auto { asset }),
        (asset(), any::<bool>())
            .prop_map(|(asset, locked)| ActKind::OutOfService { asset, locked }),
        of(asset()).prop_map(|asset| ActKind::Reset { asset }),
        of(asset()).prop_map(|asset| ActKind::Rest { asset }),
        Just(ActKind::TrustClock),
    ];
    (text(), text(), text(), kind).prop_map(|(by, reason, peer, kind)| Act {
        by,
        reason,
        peer,
        kind,
    })
}

fn about() -> impl Strategy<Value = About> {
    prop_oneof![
        (0..3_u16).prop_map(|n| About::Signal(SignalId(n))),
        Just(About::Adapter(AdapterId(0))),
        asset().prop_map(About::Position),
        asset().prop_map(About::Lock),
        asset().prop_map(About::Selector),
        asset().prop_map(About::Hold),
        asset().prop_map(About::Confirmation),
        asset().prop_map(About::LastMove),
        prop::sample::select(vec![
            About::Now,
            About::Mode,
            About::Latch,
            About::ClockTrust,
            About::Journal,
            About::Forecast,
            About::VolumeThisTide,
            About::VolumeRolling,
            About::VolumeMonth,
            About::MeanFlow,
            About::Plan,
        ]),
    ]
}

fn cause() -> impl Strategy<Value = Cause> {
    let by = prop_oneof![
        (0..5_u16).prop_map(|n| By::Clause(ClauseId(n))),
        prop::sample::select(vec![
            By::AssetState,
            By::Interlock("I4"),
            By::Latch,
            By::Mode,
            By::Armed,
            By::Person,
            By::Plan,
        ]),
    ];
    let is = prop_oneof![
        number().prop_map(Is::Number),
        utc().prop_map(Is::Instant),
        text().prop_map(Is::Words),
        Just(Is::Nothing)
    ];
    let must_be = prop_oneof![
        number().prop_map(MustBe::AtLeast),
        number().prop_map(MustBe::AtMost),
        window().prop_map(MustBe::Inside),
        utc().prop_map(MustBe::After),
        Just(MustBe::Words("shut"))
    ];
    (by, about(), is, must_be)
        .prop_map(|(by, about, is, must_be)| Cause { by, fact: Fact { about, is, must_be } })
}

fn rest_action() -> impl Strategy<Value = RestAction> {
    prop::sample::select(vec![
        RestAction::Close,
        RestAction::Open,
        RestAction::Stop,
        RestAction::Hold,
        RestAction::HandToLocal,
    ])
}

/// Few commands, so that outcomes meet their intents.
fn command() -> impl Strategy<Value = u64> {
    prop_oneof![0..5_u64, any::<u64>()]
}

pub fn entry() -> BoxedStrategy<Entry> {
    prop_oneof![site_wide(), water(), commands()].boxed()
}

fn site_wide() -> impl Strategy<Value = Entry> {
    prop_oneof![
        (text(), text(), text(), mode()).prop_map(|(build, site_digest, licence_digest, mode)| {
            Entry::Started { build, site_digest, licence_digest, mode }
        }),
        (act(), of(text())).prop_map(|(act, refused)| Entry::Act { act, refused }),
        (mode(), text()).prop_map(|(mode, why)| Entry::ModeChanged { mode, why }),
        (any::<bool>(), vec(text(), 0..4))
            .prop_map(|(armed, reasons)| Entry::Armed { armed, reasons }),
        (trust(), text()).prop_map(|(trust, why)| Entry::Clock { trust, why }),
        text().prop_map(|adapter| Entry::AdapterUp { adapter }),
        (text(), text()).prop_map(|(adapter, why)| Entry::AdapterDown { adapter, why }),
        text().prop_map(|why| Entry::Stopping { why }),
    ]
}

fn water() -> impl Strategy<Value = Entry> {
    let plan = (any::<u64>(), of(any::<u64>()), any::<u64>(), any::<u64>(), volume(), volume());
    prop_oneof![
        plan.prop_map(|(plan, parent, request_digest, forecast_digest, released, spill)| {
            let (plan, parent) = (PlanId(plan), parent.map(PlanId));
            Entry::PlanAdopted { plan, parent, request_digest, forecast_digest, released, spill }
        }),
        (any::<i64>(), window(), volume(), any::<bool>()).prop_map(
            |(tide, bucket, volume, estimated)| {
                Entry::Released { tide, bucket, volume, estimated }
            }
        ),
        (any::<i64>(), window(), text()).prop_map(|(tide, window, cause)| Entry::WindowMissed {
            tide,
            window,
            cause
        }),
        (window(), volume(), vec((0..5_u16).prop_map(ClauseId), 0..4))
            .prop_map(|(window, volume, clauses)| Entry::SpillForecast { window, volume, clauses }),
    ]
}

fn commands() -> impl Strategy<Value = Entry> {
    prop_oneof![
        (asset(), action(), of(any::<u64>().prop_map(PlanId)), vec(cause(), 0..4)).prop_map(
            |(asset, action, plan, causes)| Entry::Decision { asset, action, plan, causes }
        ),
        (asset(), action(), command(), any::<u64>(), any::<u64>(), any::<u64>()).prop_map(
            |(asset, action, command, lease_end, state_seq, readings)| {
                let lease_end = Mono::from_nanos(lease_end);
                Entry::Intent { asset, action, command, lease_end, state_seq, readings }
            }
        ),
        (asset(), command(), outcome()).prop_map(|(asset, command, outcome)| Entry::Outcome {
            asset,
            command,
            outcome
        }),
        (asset(), command(), number()).prop_map(|(asset, command, position)| Entry::Confirmed {
            asset,
            command,
            position
        }),
        (asset(), rest_action(), text()).prop_map(|(asset, action, cause)| Entry::Rest {
            asset,
            action,
            cause
        }),
        (asset(), command(), number(), of(number())).prop_map(|(asset, command, wanted, found)| {
            Entry::Discrepancy { asset, command, wanted, found }
        }),
        (of(asset()), text()).prop_map(|(asset, cause)| Entry::Latched { asset, cause }),
        of(asset()).prop_map(|asset| Entry::Reset { asset }),
    ]
}
