//! How fast the view answers: a month read into memory and counted by kind, out of a year of
//! one-minute rows; and how fast it is made anew. Answers are checked before they are timed.
//!
//! `cargo bench -p journal --bench view -- [DIR]`, on the disk to be measured. Prints one line a
//! figure: name, median CPU milliseconds, least, greatest. A year of rows stays in DIR for the next
//! time, if DIR is given.

use std::collections::BTreeMap;
use std::ops::ControlFlow;
use std::path::{Path, PathBuf};
use std::sync::mpsc::channel;

use journal::{Batch, Journal, Reply, Rest, Seen, ViewReader, Wanted};
use record::{Draft, kind};
use rustix::time::{ClockId, clock_gettime};
use units::{Mono, Span, Utc};

const ROWS: u64 = 525_600;
const MONTH_ROWS: u64 = 43_200;
const RUNS: usize = 21;

fn main() {
    let given = std::env::args().skip(1).find(|a| !a.starts_with("--")).map(PathBuf::from);
    let own = std::env::temp_dir().join(format!("tidereeve-view-bench-{}", std::process::id()));
    let dir = given.clone().unwrap_or(own);
    std::fs::create_dir_all(&dir).expect("a place to measure");
    if !dir.join(journal::FILE_NAME).exists() {
        year(&dir);
    }
    let before = cpu_ms();
    let head = journal::rebuild_view(&dir, &mut |_, _| {}).expect("the view is made");
    assert_eq!(head.seq, ROWS);
    println!("rebuild\t{:.0}\tms\t{ROWS} rows", cpu_ms() - before);
    let size = dir.join(journal::VIEW_NAME).metadata().expect("it is there").len();
    println!("bytes_per_row\t{:.1}\tbytes", size as f64 / ROWS as f64);
    figures(&dir);
    if given.is_none() {
        std::fs::remove_dir_all(&dir).expect("the folder is ours");
    }
}

fn figures(dir: &Path) {
    let reader = ViewReader::open(dir).expect("the view opens");
    let from = begin() + Span::minutes(1) * (ROWS as i64 / 2);
    let to = from + Span::days(30);
    let wanted = Wanted { from: Some(from), to: Some(to), ..Wanted::default() };
    let whole = Wanted { whole: true, ..wanted.clone() };
    let entries = reader.entries(&whole).expect("the month reads");
    assert_eq!(entries.len() as u64, MONTH_ROWS);
    let mut by_hand = BTreeMap::new();
    for (no, entry) in (ROWS / 2..).zip(entries.iter()) {
        let draft = draft(no);
        assert_eq!((entry.seq, entry.utc), (no + 1, from + Span::minutes((no - ROWS / 2) as i64)));
        assert_eq!(entry.rest, Some(Rest { term: 1, cause: &draft.cause }));
        assert_eq!(entry.subject, draft.subject);
        assert_eq!(Some(entry.kind), kind::name(draft.kind));
        *by_hand.entry(entry.kind.to_owned()).or_insert(0_u64) += 1;
    }
    assert_eq!(reader.counts(&wanted).expect("the month counts"), by_hand);
    let bytes: usize = entries.iter().map(|e| e.words.len()).sum();
    println!("text_per_row\t{:.1}\tbytes", bytes as f64 / MONTH_ROWS as f64);
    timed("month_read", || {
        assert_eq!(reader.entries(&wanted).expect("it reads").len() as u64, MONTH_ROWS)
    });
    timed("month_read_whole", || {
        assert_eq!(reader.entries(&whole).expect("it reads").len() as u64, MONTH_ROWS);
    });
    timed("month_visited", || {
        let mut rows = 0;
        let visit = &mut |_: &journal::Entry<'_>| {
            rows += 1;
            ControlFlow::Continue(())
        };
        reader.each_entry(&wanted, visit).expect("it reads");
        assert_eq!(rows, MONTH_ROWS);
    });
    timed("month_count_by_kind", || assert_eq!(reader.counts(&wanted).expect("it reads"), by_hand));
}

fn timed(name: &str, mut work: impl FnMut()) {
    let mut times: Vec<f64> = (0..RUNS)
        .map(|_| {
            let before = cpu_ms();
            work();
            cpu_ms() - before
        })
        .collect();
    times.sort_by(f64::total_cmp);
    println!("{name}\t{:.3}\tms\t{:.3}\t{:.3}", times[RUNS / 2], times[0], times[RUNS - 1]);
}

fn cpu_ms() -> f64 {
    let t = clock_gettime(ClockId::ProcessCPUTime);
    t.tv_sec as f64 * 1e3 + t.tv_nsec as f64 / 1e6
}

fn begin() -> Utc {
    Utc::from_civil(2026, 1, 1, 0, 0, 0).expect("a day of 2026")
}

/// A year of rows, one a minute, a batch an hour.
fn year(dir: &Path) {
    let journal = Journal::open(dir, &mut |_| {}).expect("an empty folder");
    let term = journal.next_term();
    let (to, replies) = channel();
    let handle = journal.start(to);
    for no in 0..ROWS {
        let at = begin() + Span::minutes(no as i64);
        let boot = Mono::from_nanos(no * 60_000_000_000);
        let (drafts, intents, seen) = (vec![draft(no)], Vec::new(), Seen::default());
        handle.submit(Batch { term, utc: at, boot, drafts, intents, seen }).expect("it runs");
        assert!(no % 4096 > 0 || matches!(replies.recv(), Ok(Reply::Acked(_))));
    }
    let left = replies.iter().take((ROWS - ROWS.div_ceil(4096)) as usize).count();
    assert_eq!(left as u64, ROWS - ROWS.div_ceil(4096));
    handle.close().expect("the journal closes");
}

struct Body(Vec<u8>);

impl Body {
    fn text(mut self, text: &str) -> Self {
        self.0.extend((text.len() as u32).to_le_bytes());
        self.0.extend(text.as_bytes());
        self
    }
    fn bytes(mut self, bytes: &[u8]) -> Self {
        self.0.extend(bytes);
        self
    }
    fn u64(self, n: u64) -> Self {
        self.bytes(&n.to_le_bytes())
    }
    fn f64(self, v: f64) -> Self {
        self.u64(v.to_bits())
    }
}

/// Rows as the engine writes them, of six kinds in turn; each reads back.
fn draft(no: u64) -> Draft {
    let asset = ["penstock", "pump-1", "pump-2"][(no % 3) as usize];
    let level_m = 3.0 + ((no * 7919) % 3000) as f64 / 1000.0;
    let body = Body(Vec::new());
    let at_us = begin().as_micros().cast_unsigned() + no * 60_000_000;
    let (kind, subject, cause, body) = match no % 6 {
        0 | 1 => (
            kind::DECISION,
            asset,
            format!("clause 2.4: outer level is {level_m:.3} m and must be at most 4.250"),
            body.text(asset)
                .bytes(&[1])
                .f64(level_m * 10.0)
                .bytes(&[1])
                .u64(no / 50)
                .bytes(&1_u32.to_le_bytes())
                .bytes(&[4])
                .text("2.4")
                .bytes(&[1])
                .text("outer-level")
                .bytes(&[1])
                .f64(level_m)
                .bytes(&[2])
                .f64(4.25),
        ),
        2 => (
            kind::INTENT,
            asset,
            String::new(),
            body.text(asset).bytes(&[1]).f64(level_m * 10.0).u64(no).u64(no * 60).u64(no).u64(no),
        ),
        3 => (kind::OUTCOME, asset, String::new(), body.text(asset).u64(no).bytes(&[1])),
        4 => (kind::CONFIRMED, asset, String::new(), body.text(asset).u64(no).f64(level_m * 10.0)),
        _ => (
            kind::RELEASED,
            "site",
            String::new(),
            body.u64(no / 745).u64(at_us).u64(at_us + 300_000_000).f64(level_m * 100.0).bytes(&[0]),
        ),
    };
    Draft { kind, version: 1, subject: subject.to_owned(), cause, body: body.0 }
}
