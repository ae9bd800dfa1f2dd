//! Thirty days at Tarrow Works with faults, in one process, judged from the plant's own record.

pub mod judging;

use std::sync::Arc;

use engine::{Act, ActKind, Carried, Entry, Mode, Stamp};
use model::Site;
use plant::{FaultKind, Plant, Point, Truth};
use record::{Fold, Row};
use units::{Mono, Span, Utc, Window};
use world::{Fault, Run, Setup, World};

use super::tarrow::{act, at, tarrow};

const DAYS: i64 = 30;

fn start() -> Utc {
    at("2027-05-01T00:00:00Z")
}

/// What the journal would hand over: every entry as a row, folded.
fn carry(site: &Site, entries: &[(Stamp, Entry)]) -> Carried {
    let mut fold = Fold::new(site);
    for (seq, (stamp, entry)) in (1..).zip(entries) {
        let d = record::encode(entry, site);
        fold.push(&Row {
            seq,
            term: stamp.term.0,
            utc: stamp.utc,
            boot: stamp.boot,
            kind: d.kind,
            version: d.version,
            subject: d.subject,
            cause: d.cause,
            body: d.body,
            hash: [0; 32],
        });
    }
    fold.finish()
}

/// The forecast's own windows: where a release is likely, for aiming faults at it.
fn windows(site: &Site) -> Vec<Window> {
    let span = Window::new(start(), start() + Span::days(DAYS + 1)).unwrap();
    let forecast = nowcast::forecast(site, start(), span).unwrap();
    let lawful = licence::lawful(site, &forecast, site.outlets[0].gate);
    lawful.windows.iter().map(|w| w.window).collect()
}

fn plant_faults(windows: &[Window]) -> Vec<plant::Fault> {
    let fault = |kind, from: Utc, length| {
        let window = Window::new(from, from + length).unwrap();
        plant::Fault { kind, window }
    };
    vec![
        // While it is shut: the release cannot begin.
        fault(FaultKind::GateJam, windows[8].start() - Span::hours(1), Span::hours(4)),
        // In the middle of a release: it stays open at first, then cannot follow.
        fault(FaultKind::GateJam, windows[25].start() + Span::minutes(40), Span::minutes(20)),
        fault(FaultKind::SignalFrozen(Point::Level(0)), windows[14].start(), Span::days(1)),
    ]
}

/// Six deaths of the adapter of 2 to 40 min; ten of the daemon of 40 s to 3 min, every second one
/// aimed at a release.
fn outside_faults(windows: &[Window]) -> Vec<Fault> {
    let mut list = Vec::new();
    for (n, minutes) in [2, 5, 10, 20, 30, 40].into_iter().enumerate() {
        let at = windows[4 + n * 8].start() + Span::minutes(20 * n as i64);
        list.push(Fault::AdapterKilled { at, back_after: Span::minutes(minutes) });
    }
    for n in 0..10_i64 {
        let window = windows[2 + n as usize * 5];
        let later = if n % 2 == 0 { Span::minutes(50 + n) } else { Span::hours(6) };
        let back_after = Span::seconds(40 + n * 15);
        list.push(Fault::DaemonKilled { at: window.start() + later, back_after });
    }
    list
}

/// A person at the start; and one who looks in twice a day for a trip, and resets it if its cause
/// is gone (the engine refuses otherwise).
fn acts(site: &Site, jams: &[plant::Fault]) -> Vec<(Utc, Act)> {
    let first = start() + Span::minutes(30);
    let until = start() + Span::days(DAYS + 10);
    let mut list = vec![
        (first, act(ActKind::Authorise { until })),
        (first + Span::seconds(1), act(ActKind::Mode(Mode::Automatic))),
    ];
    let gate = site.outlets[0].gate;
    for jam in jams.iter().filter(|f| f.kind == FaultKind::GateJam) {
        for minutes in [15, 45] {
            let at = jam.window.end() + Span::minutes(minutes);
            list.push((at, act(ActKind::Reset { asset: Some(gate) })));
        }
    }
    list
}

fn setup(site: &Site) -> Setup {
    let windows = windows(site);
    let boot = Mono::from_nanos(1_000_000_000_000);
    let wide = Window::new(start(), start() + Span::days(DAYS + 1)).unwrap();
    let mut config = simulated_plant::plant_for(site, &wide, boot).unwrap();
    config.faults = plant_faults(&windows);
    let point = |s: &model::Signal| simulated_plant::point_of(site, s.id).unwrap();
    Setup {
        acts: acts(site, &config.faults),
        plant: Plant::new(config).unwrap(),
        points: site.signals.iter().map(point).collect(),
        span: Window::new(start(), start() + Span::days(DAYS)).unwrap(),
        sense_every: Span::seconds(15),
        faults: outside_faults(&windows),
        carry,
        site: Arc::new(site.clone()),
    }
}

/// Daemon's deaths while water left the ports.
fn killed_in_a_release(run: &Run, faults: &[Fault]) -> usize {
    let flows = |t: Utc| {
        let after = run.record.samples.partition_point(|s| s.utc <= t);
        after > 0 && run.record.samples[after - 1].ports_m3_s > 0.005
    };
    let killed =
        faults.iter().filter(|f| matches!(f, Fault::DaemonKilled { at, .. } if flows(*at)));
    killed.count()
}

/// The run's rows as the daemon keeps them, until some are packed: bytes a row on disk, while it is
/// live and once it is packed. The chain holds, and every packed row still says what it said.
fn room(run: &Run, site: &Site) {
    let dir = tempfile::tempdir().unwrap();
    let journal = journal::Journal::open(dir.path(), &mut |_| {}).unwrap();
    let (to, replies) = std::sync::mpsc::channel();
    let handle = journal.start(to);
    let mut rows = 0;
    // Twice the month, so that there is enough to pack.
    for (term, entries) in (1..=2).flat_map(|term| run.entries.chunks(40).map(move |e| (term, e))) {
        let drafts: Vec<_> = entries.iter().map(|(_, e)| record::encode(e, site)).collect();
        rows += drafts.len();
        let (utc, boot) = (entries[0].0.utc, entries[0].0.boot);
        let (intents, seen) = (Vec::new(), journal::Seen::default());
        handle.submit(journal::Batch { term, utc, boot, drafts, intents, seen }).unwrap();
        assert!(matches!(replies.recv().unwrap(), journal::Reply::Acked(_)));
    }
    let (utc, boot) = (start(), Mono::ZERO);
    let live = bytes(dir.path(), &handle, &replies) / rows as f64;
    let task = journal::Task::Seal { before_day: 0 };
    handle.task(journal::Stamp { term: 2, utc, boot }, task).unwrap();
    let journal::Reply::Done(done) = replies.recv().unwrap() else { panic!("no answer") };
    done.outcome.unwrap();
    handle.close().unwrap();
    let db = rusqlite::Connection::open(dir.path().join(journal::FILE_NAME)).unwrap();
    let text = "SELECT sum(length(body)), sum(last_seq - first_seq + 1) FROM packs";
    let (packed, of): (f64, f64) = db.query_row(text, [], |r| Ok((r.get(0)?, r.get(1)?))).unwrap();
    drop(db);
    println!(
        "a row on disk             {live:>10.0} bytes live, {:.0} packed ({rows} rows)",
        packed / of
    );
    assert!(packed / of <= 140.0, "{packed} bytes of {of} rows");
    assert_eq!(journal::verify(dir.path(), &mut |_, _| {}).unwrap().rows, rows as u64);
    let read = journal::rows(dir.path(), &journal::Filter::default()).unwrap();
    for (row, (_, entry)) in read.iter().zip(run.entries.iter().chain(&run.entries)) {
        assert_eq!(&record::decode(row, site).unwrap(), entry);
    }
}

fn bytes(
    dir: &std::path::Path,
    handle: &journal::Handle,
    replies: &std::sync::mpsc::Receiver<journal::Reply>,
) -> f64 {
    let stamp = journal::Stamp { term: 2, utc: start(), boot: Mono::ZERO };
    handle.task(stamp, journal::Task::Checkpoint).unwrap();
    assert!(matches!(replies.recv().unwrap(), journal::Reply::Done(_)));
    std::fs::metadata(dir.join(journal::FILE_NAME)).unwrap().len() as f64
}

#[test]
fn scen_thirty_days_with_faults_release_what_foresight_could_and_break_nothing() {
    let site = tarrow();
    let setup = setup(&site);
    let (span, faults) = (setup.span, setup.faults.clone());
    let run = World::new(setup).run().unwrap();
    let current: Vec<(Utc, f64)> =
        run.record.samples.iter().filter_map(|s| Some((s.utc, s.current_m_s?))).collect();
    let rules = judging::rules_for(&site, &span, &current);
    let judged = judging::run_of(&run.record);
    let report = oracle::judge(&judged, &rules);
    let truth = Truth::drawn(site.simulation.as_ref().unwrap().seed);
    let foresight_m3 = judging::foresight_m3(&site, &truth, &judged, &rules);
    let share = report.totals.released_m3 / foresight_m3;
    let in_release = killed_in_a_release(&run, &faults);
    println!("{report}");
    println!("perfect foresight         {foresight_m3:>10.0} m3, of which {:.2} %", share * 100.0);
    println!("daemon killed in a release {in_release:>9}");
    println!("steps of the engine       {:>10}", run.steps);
    room(&run, &site);
    for (utc, text) in run.notices.iter().filter(|_| !report.findings.is_empty()) {
        println!("  {utc} {text}");
    }
    println!("acts: {:?}", run.answers);
    assert!(in_release >= 4, "{in_release} deaths of the daemon fell into a release");
    assert_eq!(tests::but_for_the_ramp(&report.findings, 40), Vec::<String>::new());
    assert!(report.totals.releases >= 50, "{} releases", report.totals.releases);
    assert!(share >= 0.95, "{share}");
    assert!(report.totals.rests_begun > 0 && report.totals.leases_run_out > 0);
}
