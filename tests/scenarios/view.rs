//! The view of a simulated run, against the engine's own entries and the evidence.

use std::collections::BTreeMap;
use std::path::Path;
use std::sync::LazyLock;
use std::sync::mpsc::channel;

use engine::{Entry, Outcome};
use interlock::Action;
use journal::{Batch, Filter, Journal, Reply, Seen, VIEW_NAME, ViewReader, Wanted};
use model::{By, Site};
use rusqlite::Connection;
use rusqlite::types::Value;
use units::Window;
use world::World;

use super::tarrow::{act, at, setup, tarrow};

/// Four days of the demonstration site, with acts: its state folder, and its entries in order.
struct Days {
    dir: tempfile::TempDir,
    site: Site,
    entries: Vec<Entry>,
}

impl Days {
    fn view(&self) -> Connection {
        Connection::open(self.dir.path().join(VIEW_NAME)).unwrap()
    }
}

/// Run once for all the tests.
fn days() -> &'static Days {
    static DAYS: LazyLock<Days> = LazyLock::new(|| {
        let (dir, site) = (tempfile::tempdir().unwrap(), tarrow());
        let entries = run(dir.path(), &site);
        journal::rebuild_view(dir.path(), &mut |_, _| {}).unwrap();
        Days { dir, site, entries }
    });
    &DAYS
}

fn run(dir: &Path, site: &Site) -> Vec<Entry> {
    let start = at("2027-05-02T00:00:00Z");
    let mut setup = setup(site.clone(), start, 4);
    let hours = |h| start + units::Span::hours(h);
    let penstock = site.asset_named("penstock").unwrap().id;
    let until = hours(40);
    setup.acts.push((hours(30), act(engine::ActKind::Hold { asset: penstock, until })));
    setup.acts.push((hours(50), act(engine::ActKind::Rest { asset: None })));
    setup.acts.push((hours(51), act(engine::ActKind::Auto { asset: penstock })));
    let run = World::new(setup).run().unwrap();
    let journal = Journal::open(dir, &mut |_| {}).unwrap();
    let term = journal.next_term();
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    for chunk in run.entries.chunks(50) {
        let drafts = chunk.iter().map(|(_, entry)| record::encode(entry, site)).collect();
        let (utc, boot) = (chunk[0].0.utc, chunk[0].0.boot);
        let (intents, seen) = (Vec::new(), Seen::default());
        handle.submit(Batch { term, utc, boot, drafts, intents, seen }).unwrap();
        assert!(matches!(replies.recv().unwrap(), Reply::Acked(_)));
    }
    handle.close().unwrap();
    run.entries.into_iter().map(|(_, entry)| entry).collect()
}

fn text(t: &str) -> Value {
    Value::Text(t.to_owned())
}

fn maybe(t: Option<&str>) -> Value {
    t.map_or(Value::Null, text)
}

fn window(w: &Window) -> [Value; 4] {
    let (start, end) = (w.start(), w.end());
    [
        text(&start.to_string()),
        text(&end.to_string()),
        Value::Integer(start.as_micros()),
        Value::Integer(end.as_micros()),
    ]
}

fn action(a: Action) -> [Value; 2] {
    match a {
        Action::Open(p) => [text("open"), Value::Real(p.get())],
        Action::Shut => [text("shut"), Value::Null],
        Action::Run => [text("run"), Value::Null],
        Action::Stop => [text("stop"), Value::Null],
    }
}

/// What each view must say of an entry: (view, its columns without those of the row itself).
fn wanted(entry: &Entry, site: &Site) -> Option<(&'static str, &'static str, Vec<Value>)> {
    let name = |asset: &model::AssetId| text(&site.asset(*asset).name);
    let whole = |n: u64| Value::Integer(n as i64);
    Some(match entry {
        Entry::Decision { asset, action: a, plan, .. } => {
            let plan = plan.map_or(Value::Null, |p| whole(p.0));
            let [does, opening] = action(*a);
            (
                "decisions",
                "asset, action, opening_percent, plan",
                vec![name(asset), does, opening, plan],
            )
        }
        Entry::Intent { asset, action: a, command, lease_end, state_seq, readings } => {
            let [does, opening] = action(*a);
            let columns =
                "asset, action, opening_percent, command, lease_end_ns, state_seq, readings";
            let numbers = [*command, lease_end.as_nanos(), *state_seq].map(whole);
            let readings = text(&format!("{readings:016x}"));
            let all = [vec![name(asset), does, opening], numbers.into(), vec![readings]].concat();
            ("intents", columns, all)
        }
        Entry::Outcome { asset, command, outcome } => {
            let (outcome, why) = match outcome {
                Outcome::Accepted => ("accepted", None),
                Outcome::Refused(why) => ("refused", Some(why.as_str())),
                Outcome::Unknown(why) => ("unknown", Some(why.as_str())),
            };
            let all = vec![name(asset), whole(*command), text(outcome), maybe(why)];
            ("outcomes", "asset, command, outcome, why", all)
        }
        Entry::Confirmed { asset, command, position } => {
            let all = vec![name(asset), whole(*command), Value::Real(*position)];
            ("confirmations", "asset, command, position_percent", all)
        }
        Entry::Discrepancy { asset, command, wanted, found } => {
            let found = found.map_or(Value::Null, Value::Real);
            let all = vec![name(asset), whole(*command), Value::Real(*wanted), found];
            ("discrepancies", "asset, command, wanted_percent, found_percent", all)
        }
        Entry::Rest { asset, cause, .. } => {
            ("rests", "asset, cause", vec![name(asset), text(cause)])
        }
        Entry::Released { tide, bucket, volume, estimated } => {
            let mut all = vec![Value::Integer(*tide)];
            all.extend(window(bucket));
            all.extend([Value::Real(volume.get()), Value::Integer(i64::from(*estimated))]);
            ("releases", "tide, begins, ends, begins_us, ends_us, volume_m3, estimated", all)
        }
        Entry::WindowMissed { tide, window: w, cause } => {
            let mut all = vec![Value::Integer(*tide)];
            all.extend(window(w));
            all.push(text(cause));
            ("missed_windows", "tide, begins, ends, begins_us, ends_us, cause", all)
        }
        Entry::SpillForecast { window: w, volume, clauses } => {
            let numbers: Vec<&str> =
                clauses.iter().map(|c| site.licence.clause(*c).number.as_str()).collect();
            let mut all: Vec<Value> = window(w).into();
            all.extend([Value::Real(volume.get()), text(&numbers.join(", "))]);
            ("forecast_spills", "begins, ends, begins_us, ends_us, volume_m3, clauses", all)
        }
        Entry::PlanAdopted { plan, parent, request_digest, forecast_digest, released, spill } => {
            let parent = parent.map_or(Value::Null, |p| whole(p.0));
            let digests = [request_digest, forecast_digest].map(|d| text(&format!("{d:016x}")));
            let mut all = vec![whole(plan.0), parent];
            all.extend([Value::Real(released.get()), Value::Real(spill.get())]);
            all.extend(digests);
            ("plans", "plan, parent, release_m3, spill_m3, request_digest, forecast_digest", all)
        }
        Entry::Act { act, refused } => {
            let all =
                vec![text(&act.by), text(&act.reason), maybe(refused.as_deref()), text(&act.peer)];
            ("acts", "who, reason, refused, peer", all)
        }
        _ => return None,
    })
}

#[test]
fn scen_the_view_says_what_the_engine_decided_row_for_row() {
    let Days { site, entries, .. } = days();
    let db = days().view();
    let mut seen: BTreeMap<&str, i64> = BTreeMap::new();
    for (entry, seq) in entries.iter().zip(1_i64..) {
        let Some((view, columns, wanted)) = wanted(entry, site) else { continue };
        *seen.entry(view).or_default() += 1;
        let mut statement =
            db.prepare_cached(&format!("SELECT {columns} FROM {view} WHERE seq = ?1")).unwrap();
        let found: Vec<Value> = statement
            .query_row([seq], |r| (0..wanted.len()).map(|c| r.get(c)).collect())
            .unwrap_or_else(|e| panic!("row {seq} in {view}: {e}"));
        assert_eq!(found, wanted, "row {seq} in {view}");
    }
    println!("{seen:?}");
    for (view, n) in &seen {
        let rows: i64 =
            db.query_row(&format!("SELECT count(*) FROM {view}"), [], |r| r.get(0)).unwrap();
        assert_eq!(rows, *n, "{view}");
    }
    for view in ["decisions", "intents", "outcomes", "confirmations", "rests", "releases", "acts"] {
        assert!(seen.contains_key(view), "none of the {} rows is in {view}", entries.len());
    }
}

#[test]
fn scen_what_stood_against_movement_is_in_the_view_cause_by_cause() {
    let Days { site, entries, .. } = days();
    let db = days().view();
    let mut wanted = Vec::new();
    for (entry, seq) in entries.iter().zip(1_i64..) {
        let Entry::Decision { causes, .. } = entry else { continue };
        wanted.extend(causes.iter().zip(1_i64..).map(|(cause, no)| {
            let (says, name) = match cause.by {
                By::Clause(id) => ("clause", site.licence.clause(id).number.as_str()),
                By::Interlock(code) => ("interlock", code),
                By::AssetState => ("asset", ""),
                By::Latch => ("latch", ""),
                By::Mode => ("mode", ""),
                By::Armed => ("armed", ""),
                By::Person => ("person", ""),
                By::Plan => ("plan", ""),
            };
            (seq, no, says.to_owned(), name.to_owned())
        }));
    }
    let mut statement =
        db.prepare("SELECT seq, no, says, name FROM objections ORDER BY seq, no").unwrap();
    let found = statement.query_map([], |r| Ok((r.get(0)?, r.get(1)?, r.get(2)?, r.get(3)?)));
    let found: Vec<(i64, i64, String, String)> = found.unwrap().collect::<Result<_, _>>().unwrap();
    assert_eq!(found, wanted);
    assert!(wanted.iter().any(|w| w.2 == "clause"), "{wanted:?}");
}

#[test]
fn scen_the_view_has_every_row_of_the_evidence_in_its_words() {
    let Days { dir, .. } = days();
    let reader = ViewReader::open(dir.path()).unwrap();
    let found = reader.entries(&Wanted { whole: true, ..Wanted::default() }).unwrap();
    let rows = journal::rows(dir.path(), &Filter::default()).unwrap();
    assert_eq!(found.len(), rows.len());
    for (entry, row) in found.iter().zip(&rows) {
        let rest = entry.rest.unwrap();
        assert_eq!((entry.seq, entry.utc, rest.term), (row.seq, row.utc, row.term));
        assert_eq!(Some(entry.kind), record::kind::name(row.kind));
        assert_eq!((entry.subject, rest.cause), (row.subject.as_str(), row.cause.as_str()));
        assert_eq!(entry.words, record::describe(row));
    }
}
