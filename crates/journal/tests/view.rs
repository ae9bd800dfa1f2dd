//! The view: equal to the evidence however it came about, never in its way, and mended by itself.

#![allow(clippy::unwrap_used, reason = "a test stops where an assumption breaks")]

mod common;

use std::collections::BTreeMap;
use std::fs;
use std::ops::ControlFlow;
use std::path::Path;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::time::Duration;

use common::{Desk, FIRST_DAY, noon};
use journal::{
    AskedFor, Batch, Cell, Filter, Handle, Journal, Reply, Seen, VIEW_FORMAT, VIEW_NAME, View,
    ViewError, ViewPace, ViewReader, ViewSays, ViewThread, Wanted,
};
use proptest::prelude::*;
use record::{Draft, kind};
use rusqlite::Connection;
use units::{Mono, Span, Utc};

/// Everything of the view that has a counterpart in the evidence, row by row.
fn assert_equal(dir: &Path) {
    let reader = ViewReader::open(dir).unwrap();
    let found = reader.entries(&Wanted { whole: true, ..Wanted::default() }).unwrap();
    let rows = journal::rows(dir, &Filter::default()).unwrap();
    assert_eq!(found.len(), rows.len());
    for (entry, row) in found.iter().zip(&rows) {
        let rest = entry.rest.unwrap();
        assert_eq!((entry.seq, entry.utc, rest.term), (row.seq, row.utc, row.term));
        assert_eq!(Some(entry.kind), kind::name(row.kind));
        assert_eq!((entry.subject, rest.cause), (row.subject.as_str(), row.cause.as_str()));
        assert_eq!(entry.words, record::describe(row));
    }
    let mut counts = BTreeMap::new();
    for row in &rows {
        let day = row.utc.to_string()[..10].to_owned();
        *counts.entry((day, kind::name(row.kind).unwrap().to_owned())).or_insert(0_i64) += 1;
    }
    let db = Connection::open(dir.join(VIEW_NAME)).unwrap();
    let mut statement = db.prepare("SELECT day, kind, n FROM counts_by_day").unwrap();
    let kept = statement.query_map([], |r| Ok(((r.get(0)?, r.get(1)?), r.get(2)?))).unwrap();
    assert_eq!(kept.collect::<Result<BTreeMap<_, _>, _>>().unwrap(), counts);
    let head = reader.head();
    let last = rows.last().map_or((0, String::new()), |r| {
        (r.seq, r.hash.iter().map(|b| format!("{b:02x}")).collect())
    });
    assert_eq!((head.seq, head.hash.clone()), last);
}

/// What comes to the daemon's loop here.
enum Input {
    Journal(Reply),
    View(ViewSays),
}

impl From<Reply> for Input {
    fn from(r: Reply) -> Self {
        Self::Journal(r)
    }
}
impl From<ViewSays> for Input {
    fn from(s: ViewSays) -> Self {
        Self::View(s)
    }
}

const PACE: ViewPace =
    ViewPace { check_after: Duration::from_millis(30), retry_after: Duration::from_millis(100) };

/// A daemon's loop with nothing but a journal and a view.
struct Loop {
    handle: Handle,
    view: ViewThread,
    inbox: Receiver<Input>,
    _to: Sender<Input>,
    term: u64,
    caught: usize,
    alarms: Vec<String>,
}

impl Loop {
    fn open(dir: &Path) -> Self {
        let journal = Journal::open(dir, &mut |_| {}).unwrap();
        let (term, rows) = (journal.next_term(), journal.rows());
        let (to, inbox) = channel();
        let handle = journal.start(to.clone());
        let view = ViewThread::start(dir, rows, PACE, to.clone()).unwrap();
        Self { handle, view, inbox, _to: to, term, caught: 0, alarms: Vec::new() }
    }

    fn submit(&self, no: u64) {
        let (utc, boot) = (noon(FIRST_DAY) + Span::minutes(7) * no as i64, Mono::from_nanos(no));
        let drafts = (no..no + 3).map(draft).collect();
        let (term, intents, seen) = (self.term, Vec::new(), Seen::default());
        self.handle.submit(Batch { term, utc, boot, drafts, intents, seen }).unwrap();
    }

    /// Goes on for as long as nothing is heard for `quiet`, or until `until` holds.
    fn turn(&mut self, quiet: Duration, until: impl Fn(&Self) -> bool) {
        while !until(self) {
            match self.inbox.recv_timeout(quiet) {
                Ok(Input::Journal(Reply::Acked(acked))) => self.view.take(acked.rows),
                Ok(Input::Journal(other)) => panic!("{other:?}"),
                Ok(Input::View(ViewSays::Read { from_seq, limit, to })) => {
                    self.handle.read(from_seq, limit, to).unwrap();
                }
                Ok(Input::View(ViewSays::Caught { .. })) => self.caught += 1,
                Ok(Input::View(ViewSays::Alarm(why))) => self.alarms.push(why),
                Ok(Input::View(ViewSays::Rebuilding { .. })) => {}
                Err(_) => return,
            }
        }
    }

    fn write(&mut self, batches: u64) {
        for no in 0..batches {
            self.submit(no);
        }
        let wanted = self.view.state().evidence_seq + 3 * batches;
        self.turn(Duration::from_secs(20), |l| l.view.state().evidence_seq == wanted);
        self.settle();
    }

    /// Until the view is as far as the evidence.
    fn settle(&mut self) {
        for _ in 0..400 {
            self.turn(Duration::from_millis(25), |_| false);
            let state = self.view.state();
            if state.view_seq == state.evidence_seq && state.trouble.is_none() {
                return;
            }
        }
        panic!("{:?} {:?}", self.view.state(), self.alarms);
    }

    fn close(self) -> Vec<String> {
        self.handle.close().unwrap();
        self.view.stop();
        self.alarms
    }
}

/// Rows of four kinds, with words that need care.
fn draft(no: u64) -> Draft {
    let text = |t: &str| {
        let mut bytes = (t.len() as u32).to_le_bytes().to_vec();
        bytes.extend(t.as_bytes());
        bytes
    };
    let why = ["tide", "a, \"b\"\nc", "=1+1", "Größe 水位 🌊", ""][(no % 5) as usize];
    let (kind, subject, body) = match no % 4 {
        0 => (kind::STOPPING, "site", text(why)),
        1 => (kind::ADAPTER_UP, "plant-bus", text("plant-bus")),
        2 => (kind::REST, "penstock", [text("penstock"), vec![1], text(why)].concat()),
        // A body that does not read.
        _ => (kind::OUTCOME, "pump-1", vec![1, 2, 3]),
    };
    Draft { kind, version: 1, subject: subject.to_owned(), cause: why.to_owned(), body }
}

fn written(dir: &Path, batches: u64) {
    let mut daemon = Loop::open(dir);
    daemon.write(batches);
    assert_eq!(daemon.close(), Vec::<String>::new());
}

#[test]
fn kept_as_rows_come_it_is_equal_to_the_evidence_and_to_one_made_anew() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 300);
    assert_equal(dir.path());
    assert_eq!(
        journal::evidence_ahead(dir.path(), ViewReader::open(dir.path()).unwrap().head()).unwrap(),
        0
    );
    let tables = |db: &Connection| -> Vec<String> {
        let mut text = Vec::new();
        for table in ["entries", "counts_by_day", "days", "rests", "outcomes", "meta"] {
            let mut s = db.prepare(&format!("SELECT * FROM {table} ORDER BY 1, 2")).unwrap();
            let columns = s.column_count();
            let mut rows = s.query([]).unwrap();
            while let Some(r) = rows.next().unwrap() {
                let cells: Vec<_> = (0..columns).map(|c| r.get_ref(c).unwrap()).collect();
                text.push(format!("{table} {cells:?}"));
            }
        }
        text
    };
    let kept = tables(&Connection::open(dir.path().join(VIEW_NAME)).unwrap());
    let mut last = (0, 0);
    journal::rebuild_view(dir.path(), &mut |done, of| last = (done, of)).unwrap();
    assert_eq!(last, (900, 900));
    assert_eq!(tables(&Connection::open(dir.path().join(VIEW_NAME)).unwrap()), kept);
    assert!(kept.iter().filter(|l| l.starts_with("rests")).count() > 100);
    assert!(
        !kept.iter().any(|l| l.starts_with("outcomes")),
        "a body that does not read is in no table"
    );
}

#[test]
fn packed_rows_are_in_it_too() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    for _ in 0..14 {
        desk.write(FIRST_DAY, 1000, 0);
    }
    let words = desk.done(FIRST_DAY + 1, journal::Task::Seal { before_day: FIRST_DAY + 1 });
    assert!(!words.contains(" 0 packs"), "{words}");
    desk.handle.close().unwrap();
    written(dir.path(), 2);
    assert_equal(dir.path());
    journal::rebuild_view(dir.path(), &mut |_, _| {}).unwrap();
    assert_equal(dir.path());
}

#[test]
fn the_utc_of_an_entry_is_what_the_program_says_everywhere() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 40);
    let rows = journal::rows(dir.path(), &Filter::default()).unwrap();
    let db = Connection::open(dir.path().join(VIEW_NAME)).unwrap();
    let mut statement = db.prepare("SELECT utc FROM entries ORDER BY seq").unwrap();
    let found = statement.query_map([], |r| r.get::<_, String>(0)).unwrap();
    let wanted: Vec<String> = rows.iter().map(|r| r.utc.to_string()).collect();
    assert_eq!(found.collect::<Result<Vec<_>, _>>().unwrap(), wanted);
}

/// What a kill leaves behind is what lies in the folder at that moment.
#[test]
fn fault_killed_at_any_point_it_is_caught_up_with() {
    let dir = tempfile::tempdir().unwrap();
    let kills = tempfile::tempdir().unwrap();
    let mut daemon = Loop::open(dir.path());
    let mut states = 0;
    for no in 0..40 {
        daemon.submit(no);
        daemon.turn(Duration::from_millis(2), |_| false);
        let state = kills.path().join(no.to_string());
        fs::create_dir(&state).unwrap();
        for end in ["", "-wal"] {
            let name = format!("{VIEW_NAME}{end}");
            if fs::copy(dir.path().join(&name), state.join(&name)).is_ok() && end.is_empty() {
                states += 1;
            }
        }
    }
    daemon.settle();
    daemon.close();
    assert!(states > 20, "{states}");
    let evidence = fs::read(dir.path().join(journal::FILE_NAME)).unwrap();
    for no in 0..40 {
        let state = kills.path().join(no.to_string());
        fs::write(state.join(journal::FILE_NAME), &evidence).unwrap();
        let mut daemon = Loop::open(&state);
        daemon.settle();
        daemon.close();
        assert_equal(&state);
    }
}

#[test]
fn fault_cut_short_or_filled_with_rubbish_it_is_made_anew() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 200);
    let view = dir.path().join(VIEW_NAME);
    let good = fs::read(&view).unwrap();
    let mut bad: Vec<Vec<u8>> = [0, 1, 99, 100, 4096, 8192, good.len() / 2, good.len() - 1]
        .map(|n| good[..n].to_vec())
        .into();
    for page in (0..good.len() / 8192).step_by(3) {
        let mut rubbish = good.clone();
        let noise = (0..8192_usize).map(|i| (i * 31 + page * 7 + 1) as u8);
        rubbish.splice(page * 8192..(page + 1) * 8192, noise);
        bad.push(rubbish);
    }
    bad.push(b"this is no database, and long enough to be taken for one".repeat(20));
    let cases = bad.len();
    for (no, bytes) in bad.into_iter().enumerate() {
        fs::write(&view, bytes).unwrap();
        let mut daemon = Loop::open(dir.path());
        daemon.settle();
        // The check from end to end comes in the first quiet time.
        daemon.turn(Duration::from_millis(120), |_| false);
        daemon.settle();
        daemon.write(1);
        let alarms = daemon.close();
        assert!(!alarms.is_empty(), "case {no} of {cases} was not noticed");
        assert_equal(dir.path());
        assert!(!dir.path().join(format!("{VIEW_NAME}.part")).exists());
    }
}

#[test]
fn fault_a_view_of_another_record_is_made_anew() {
    let (one, two) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
    written(one.path(), 30);
    let desk = Desk::open(two.path());
    desk.write(FIRST_DAY, 200, 0);
    desk.handle.close().unwrap();
    for batches in [0, 1] {
        fs::copy(one.path().join(VIEW_NAME), two.path().join(VIEW_NAME)).unwrap();
        let mut daemon = Loop::open(two.path());
        daemon.settle();
        daemon.write(batches);
        let alarms = daemon.close();
        assert!(alarms[0].contains("this record does not have"), "{alarms:?}");
        assert_equal(two.path());
    }
}

#[test]
fn compat_a_newer_view_is_refused_and_stays_an_older_one_is_made_anew() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 20);
    let form = |n: i64| {
        let db = Connection::open(dir.path().join(VIEW_NAME)).unwrap();
        db.pragma_update(None, "user_version", n).unwrap();
    };
    form(VIEW_FORMAT + 1);
    let bytes = fs::read(dir.path().join(VIEW_NAME)).unwrap();
    let newer = |e: ViewError| {
        assert!(matches!(&e, ViewError::Newer { found, .. } if *found == VIEW_FORMAT + 1), "{e}");
        assert!(e.to_string().contains("use the version that wrote it"), "{e}");
    };
    newer(ViewReader::open(dir.path()).unwrap_err());
    newer(View::open(dir.path()).unwrap_err());
    newer(journal::rebuild_view(dir.path(), &mut |_, _| {}).unwrap_err());
    let mut daemon = Loop::open(dir.path());
    daemon.turn(Duration::from_secs(10), |l| !l.alarms.is_empty());
    // The journal goes on all the same.
    daemon.submit(1);
    daemon.turn(Duration::from_secs(10), |l| l.view.state().evidence_seq == 63);
    assert!(daemon.view.state().trouble.is_some());
    daemon.close();
    assert!(fs::read(dir.path().join(VIEW_NAME)).unwrap() == bytes, "it was changed");
    form(VIEW_FORMAT - 1);
    let older = ViewReader::open(dir.path()).unwrap_err();
    assert!(matches!(older, ViewError::Older { .. }), "{older}");
    written(dir.path(), 1);
    assert_equal(dir.path());
}

#[test]
fn somebody_elses_database_is_left_alone() {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    desk.write(FIRST_DAY, 3, 0);
    desk.handle.close().unwrap();
    let other = Connection::open(dir.path().join(VIEW_NAME)).unwrap();
    other.execute_batch("CREATE TABLE recipes (dish TEXT)").unwrap();
    let mut daemon = Loop::open(dir.path());
    daemon.turn(Duration::from_secs(10), |l| !l.alarms.is_empty());
    let alarms = daemon.close();
    assert!(alarms[0].contains("no view of ours"), "{alarms:?}");
    other.execute_batch("SELECT dish FROM recipes").unwrap();
}

#[test]
fn a_reader_who_stays_holds_up_neither_the_evidence_nor_the_view() {
    let dir = tempfile::tempdir().unwrap();
    let mut daemon = Loop::open(dir.path());
    daemon.write(10);
    let reader = Connection::open(dir.path().join(VIEW_NAME)).unwrap();
    reader.execute_batch("BEGIN; SELECT count(*) FROM entries").unwrap();
    let count = |db: &Connection| -> i64 {
        db.query_row("SELECT count(*) FROM entries", [], |r| r.get(0)).unwrap()
    };
    assert_eq!(count(&reader), 30);
    daemon.write(500);
    assert_eq!(daemon.view.state().view_seq, 1530);
    assert_eq!(count(&reader), 30, "it sees the moment at which it began");
    reader.execute_batch("COMMIT").unwrap();
    assert_eq!(count(&reader), 1530);
    assert_eq!(daemon.close(), Vec::<String>::new());
}

#[test]
fn a_writer_who_stays_holds_up_the_view_alone_and_is_named() {
    let dir = tempfile::tempdir().unwrap();
    let mut daemon = Loop::open(dir.path());
    daemon.write(10);
    let writer = Connection::open(dir.path().join(VIEW_NAME)).unwrap();
    writer.execute_batch("BEGIN IMMEDIATE").unwrap();
    daemon.submit(10);
    daemon.turn(Duration::from_secs(10), |l| !l.alarms.is_empty());
    assert!(daemon.alarms[0].contains("another program that writes"), "{:?}", daemon.alarms);
    assert_eq!(daemon.view.state().evidence_seq, 33);
    assert_eq!(daemon.view.state().view_seq, 30);
    writer.execute_batch("COMMIT").unwrap();
    daemon.settle();
    daemon.close();
    assert_equal(dir.path());
}

#[test]
fn only_owner_and_group_read_it_and_it_is_one_file_after_a_clean_end() {
    use std::os::unix::fs::PermissionsExt;
    let dir = tempfile::tempdir().unwrap();
    let mut daemon = Loop::open(dir.path());
    daemon.write(5);
    for end in ["", "-wal", "-shm"] {
        let meta = fs::metadata(dir.path().join(format!("{VIEW_NAME}{end}"))).unwrap();
        assert_eq!(meta.permissions().mode() & 0o777, 0o640, "{end:?}");
    }
    daemon.close();
    for end in ["-wal", "-shm", ".part"] {
        assert!(!dir.path().join(format!("{VIEW_NAME}{end}")).exists(), "{end}");
    }
    // Somebody without the right to write beside it still reads it.
    let folder = fs::metadata(dir.path()).unwrap().permissions();
    fs::set_permissions(dir.path(), fs::Permissions::from_mode(0o555)).unwrap();
    let read = ViewReader::open(dir.path()).and_then(|r| r.entries(&Wanted::default()));
    fs::set_permissions(dir.path(), folder).unwrap();
    assert_eq!(read.unwrap().len(), 15);
}

const BRIEF: AskedFor = AskedFor { time: Duration::from_millis(300), rows: 1000 };

fn asked(dir: &Path, sql: &str) -> Result<Vec<String>, String> {
    let mut lines = Vec::new();
    let visit = &mut |names: &[String], cells: Option<&[Cell<'_>]>| {
        lines.push(format!("{names:?} {cells:?}"));
        ControlFlow::Continue(())
    };
    journal::ask(dir, sql, BRIEF, visit).map_err(|e| e.to_string())?;
    Ok(lines)
}

#[test]
fn sql_reads_and_does_nothing_else() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 50);
    let before = fs::read(dir.path().join(VIEW_NAME)).unwrap();
    let lines =
        asked(dir.path(), "SELECT kind, count(*) AS n FROM entries GROUP BY kind;").unwrap();
    assert!(lines[0].contains("[\"kind\", \"n\"]"), "{lines:?}");
    assert_eq!(asked(dir.path(), "SELECT 1 AS one WHERE false").unwrap(), ["[\"one\"] None"]);
    asked(dir.path(), "WITH w AS (SELECT * FROM rests) SELECT count(*) FROM w -- a remark")
        .unwrap();
    asked(dir.path(), "SELECT sql FROM sqlite_schema").unwrap();
    for sql in [
        "DELETE FROM entry_rows",
        "INSERT INTO meta VALUES (1, 2, 'x')",
        "UPDATE meta SET head_seq = 0 RETURNING head_seq",
        "DROP VIEW entries",
        "CREATE TABLE t (a)",
        "CREATE TEMP TABLE t (a)",
        "ATTACH 'other.sqlite' AS other",
        "DETACH main",
        "PRAGMA journal_mode = DELETE",
        "PRAGMA user_version",
        "SELECT * FROM pragma_table_info('entries')",
        "BEGIN",
        "VACUUM",
        "VACUUM INTO 'copy.sqlite'",
        "REINDEX",
        "ANALYZE",
        "SAVEPOINT a",
        "SELECT load_extension('x')",
        "SELECT 1; SELECT 2",
        "SELECT 1; DROP TABLE meta",
        "SELECT 1; nonsense",
        "",
        "-- nothing",
    ] {
        let why = asked(dir.path(), sql).expect_err(sql);
        assert!(why.starts_with("--sql "), "{sql}: {why}");
        let said = ["only reading", "one statement", "not authorized"];
        assert!(said.iter().any(|s| why.contains(s)), "{sql}: {why}");
    }
    let why = asked(dir.path(), "SELECT words FROM nowhere").unwrap_err();
    assert!(why.contains("no such table") && why.contains("sqlite_schema"), "{why}");
    assert!(fs::read(dir.path().join(VIEW_NAME)).unwrap() == before);
}

#[test]
fn sql_that_takes_too_long_or_gives_too_much_ends_politely() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 1);
    let endless = "WITH RECURSIVE n(i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n) \
                   SELECT count(*) FROM n";
    let why = asked(dir.path(), endless).unwrap_err();
    assert!(why.contains("longer than 0.3 s") && why.contains("narrow it down"), "{why}");
    let many = "WITH RECURSIVE n(i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n) SELECT i FROM n";
    let mut seen = 0;
    let found = journal::ask(dir.path(), many, BRIEF, &mut |_, _| {
        seen += 1;
        ControlFlow::Continue(())
    });
    let found = found.unwrap();
    assert_eq!((found.rows, found.more, seen), (1000, true, 1000));
    let large = asked(dir.path(), "SELECT zeroblob(1000000000)").unwrap_err();
    assert!(large.contains("too big"), "{large}");
}

#[test]
fn every_view_and_table_says_what_it_is() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 1);
    let db = Connection::open(dir.path().join(VIEW_NAME)).unwrap();
    let mut statement =
        db.prepare("SELECT name, sql FROM sqlite_schema WHERE type IN ('table', 'view')").unwrap();
    let list = statement.query_map([], |r| Ok((r.get(0)?, r.get(1)?))).unwrap();
    let list: Vec<(String, String)> = list.collect::<Result<_, _>>().unwrap();
    assert!(list.len() > 25, "{}", list.len());
    let readme = include_str!("../README.md");
    for (name, sql) in list {
        let fields = name.ends_with("_fields");
        assert!(fields || sql.contains("\n    -- "), "{name} has no remark");
        assert!(fields || readme.contains(&format!("`{name}`")), "{name} is not in the README");
        db.prepare(&format!("SELECT * FROM {name}")).unwrap();
    }
}

/// The SQL of the README's examples, each in its own block.
#[test]
fn the_queries_of_the_readme_run() {
    let dir = tempfile::tempdir().unwrap();
    written(dir.path(), 100);
    let readme = include_str!("../README.md");
    let blocks: Vec<&str> =
        readme.split("```sql\n").skip(1).map(|b| b.split("```").next().unwrap()).collect();
    assert!(blocks.len() >= 3, "{}", blocks.len());
    for sql in blocks {
        asked(dir.path(), sql).unwrap();
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..Default::default() })]

    /// Whatever is asked for, entries and counts are those of a plain look through the evidence.
    #[test]
    fn prop_a_query_gives_what_a_look_through_the_evidence_gives(
        steps in proptest::collection::vec((-40_000_i64..90_000, 1_u64..4), 1..40),
        from in proptest::option::of(-100_000_i64..900_000),
        to in proptest::option::of(-100_000_i64..900_000),
        kinds in proptest::sample::subsequence(vec!["stopping", "adapter-up", "rest", "outcome", "act"], 0..5),
        subject in proptest::option::of(proptest::sample::select(vec!["site", "penstock", "nobody"])),
        last in proptest::option::of(0_u64..20),
        limit in proptest::option::of(0_u64..20),
        from_seq in 0_u64..30,
    ) {
        let dir = tempfile::tempdir().unwrap();
        let journal = Journal::open(dir.path(), &mut |_| {}).unwrap();
        let (to_us, replies) = channel::<Reply>();
        let handle = journal.start(to_us);
        let (mut at, mut no) = (noon(FIRST_DAY), 0);
        for (seconds, rows) in steps {
            // The clock may be set back.
            at = at + Span::seconds(seconds);
            let drafts = (no..no + rows).map(draft).collect();
            no += rows;
            let (boot, intents, seen) = (Mono::from_nanos(no), Vec::new(), Seen::default());
            handle.submit(Batch { term: 1, utc: at, boot, drafts, intents, seen }).unwrap();
            let _acked = replies.recv().unwrap();
        }
        handle.close().unwrap();
        journal::rebuild_view(dir.path(), &mut |_, _| {}).unwrap();
        let at = |s: i64| noon(FIRST_DAY) + Span::seconds(s);
        let wanted = Wanted {
            from: from.map(at),
            to: to.map(at),
            from_seq,
            kinds: kinds.iter().map(|k| (*k).to_owned()).collect(),
            subject: subject.map(str::to_owned),
            limit,
            last,
            whole: true,
        };
        let fits = |r: &record::Row| {
            r.seq >= from_seq
                && wanted.from.is_none_or(|t: Utc| r.utc >= t)
                && wanted.to.is_none_or(|t: Utc| r.utc < t)
                && (kinds.is_empty() || kinds.contains(&kind::name(r.kind).unwrap()))
                && subject.is_none_or(|s| r.subject == s)
        };
        let mut rows = journal::rows(dir.path(), &Filter::default()).unwrap();
        rows.retain(fits);
        let mut counts = BTreeMap::new();
        for row in &rows {
            *counts.entry(kind::name(row.kind).unwrap().to_owned()).or_insert(0_u64) += 1;
        }
        let reader = ViewReader::open(dir.path()).unwrap();
        prop_assert_eq!(reader.counts(&wanted).unwrap(), counts);
        let rows = match (last, limit) {
            (Some(n), _) => &rows[rows.len().saturating_sub(n as usize)..],
            (None, Some(n)) => &rows[..rows.len().min(n as usize)],
            (None, None) => &rows[..],
        };
        let found: Vec<u64> = reader.entries(&wanted).unwrap().iter().map(|e| e.seq).collect();
        prop_assert_eq!(found, rows.iter().map(|r| r.seq).collect::<Vec<_>>());
        let visited = &mut Vec::new();
        reader.each_entry(&wanted, &mut |e| {
            visited.push(e.words.to_owned());
            ControlFlow::Continue(())
        }).unwrap();
        prop_assert_eq!(&*visited, &rows.iter().map(record::describe).collect::<Vec<_>>());
    }
}
