//! How fast and how small: single appends against the disk's own sync, the hand-over, groups, bytes
//! a row and the ten-year budgets. Answers are checked before they are timed.
//!
//! `cargo bench -p journal --bench keeping -- [DIR [ROWS]]`, on the disk to be measured. Prints one
//! line a figure: name, value, unit. With ROWS it only makes a record of so many decisions in DIR and
//! leaves it there, for a daemon to start on. `tests/BENCHES.md` keeps results.

#![expect(clippy::disallowed_methods, reason = "a bench reads a clock")]

use std::fs::{self, File, OpenOptions};
use std::io::{Seek, SeekFrom, Write};
use std::os::fd::AsFd;
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, channel};
use std::time::{Duration, Instant};

use journal::{Batch, Handle, Journal, Minute, MinuteReading, Opening, Reply, Seen, Stamp, Task};
use record::{Draft, kind};
use units::{Mono, Span, Utc};

/// Nearly seven years at 2,000 a day.
const LONG_ROWS: u64 = 5_000_000;

fn main() {
    let args: Vec<String> = std::env::args().skip(1).filter(|a| !a.starts_with("--")).collect();
    let dir = args.first().map_or_else(std::env::temp_dir, PathBuf::from);
    if let Some(rows) = args.get(1) {
        return long(&dir, rows.parse().expect("a number of rows"));
    }
    let dir = dir.join(format!("tidereeve-bench-{}", std::process::id()));
    singles(&fresh(&dir));
    groups(&fresh(&dir));
    long(&fresh(&dir), LONG_ROWS);
    minutes(&fresh(&dir));
    fs::remove_dir_all(&dir).expect("the folder is ours");
}

fn fresh(dir: &Path) -> PathBuf {
    let _not_there = fs::remove_dir_all(dir);
    fs::create_dir_all(dir).expect("a place to measure");
    dir.to_owned()
}

fn say(name: &str, value: f64, unit: &str) {
    println!("{name}\t{value:.4}\t{unit}");
}

fn quantile(times: &mut [Duration], q: f64) -> f64 {
    times.sort_unstable();
    times[((times.len() - 1) as f64 * q) as usize].as_secs_f64() * 1e6
}

struct Desk {
    handle: Handle,
    replies: Receiver<Reply>,
    term: u64,
    rows: u64,
}

impl Desk {
    fn open(dir: &Path) -> Self {
        let journal = Journal::open(dir, &mut |_| {}).expect("an empty folder");
        let (term, rows) = (journal.next_term(), journal.rows());
        let (to, replies) = channel();
        Self { handle: journal.start(to), replies, term, rows }
    }

    fn batch(&self, drafts: Vec<Draft>, utc: Utc, seen: Seen) -> Batch {
        let boot = Mono::from_nanos(utc.as_micros().unsigned_abs() * 1000);
        Batch { term: self.term, utc, boot, drafts, intents: Vec::new(), seen }
    }

    fn write(&mut self, batch: Batch) {
        let rows = batch.drafts.len();
        self.handle.submit(batch).expect("the journal runs");
        match self.replies.recv().expect("the journal answers") {
            Reply::Acked(acked) => assert_eq!(acked.rows.len(), rows),
            other => panic!("{other:?}"),
        }
        self.rows += rows as u64;
    }

    fn task(&self, utc: Utc, task: Task) {
        let stamp = Stamp { term: self.term, utc, boot: Mono::ZERO };
        self.handle.task(stamp, task).expect("the journal runs");
        match self.replies.recv().expect("the journal answers") {
            Reply::Done(done) => drop(done.outcome.expect("the task is done")),
            other => panic!("{other:?}"),
        }
    }
}

fn start() -> Utc {
    Utc::from_civil(2027, 5, 1, 0, 0, 0).expect("a day of 2027")
}

/// A decision with one cause and its numbers, as the engine's are: 100 bytes of body, a sentence.
fn decision(no: u64) -> Draft {
    let asset = ["penstock", "pump-1", "pump-2"][(no % 3) as usize];
    let level_m = 3.0 + ((no * 7919) % 3000) as f64 / 1000.0;
    let mut body = Vec::new();
    let mut text = |t: &str| {
        body.extend((t.len() as u32).to_le_bytes());
        body.extend(t.as_bytes());
    };
    text(asset);
    text("IC-07");
    text("outer-level");
    body.extend([1]);
    body.extend(level_m.to_bits().to_le_bytes());
    body.extend((level_m + 0.25).to_bits().to_le_bytes());
    body.extend((no / 7).to_le_bytes());
    let cause =
        format!("outer-level is {level_m:.3} m HD and must be at most {:.3}", level_m + 0.25);
    Draft { kind: kind::DECISION, version: 1, subject: asset.to_owned(), cause, body }
}

/// Single rows, A B A B with a raw sync of as many bytes in the same folder, and the hand-over.
fn singles(dir: &Path) {
    let mut desk = Desk::open(dir);
    let mut raw = OpenOptions::new()
        .create(true)
        .truncate(true)
        .write(true)
        .open(dir.join("raw"))
        .expect("a file to sync");
    // As long as the log is after its first checkpoint: overwritten, not grown.
    raw.write_all(&vec![0; 8 << 20]).and_then(|()| raw.sync_all()).expect("8 MiB");
    for no in 0..1200 {
        desk.write(desk.batch(vec![decision(no)], start(), Seen::default()));
    }
    let (mut ours, mut theirs, mut handed) = (Vec::new(), Vec::new(), Vec::new());
    for no in 0..600_u64 {
        let batch = desk.batch(vec![decision(no)], start(), Seen::default());
        let began = Instant::now();
        desk.handle.submit(batch).expect("the journal runs");
        handed.push(began.elapsed());
        assert!(matches!(desk.replies.recv(), Ok(Reply::Acked(_))));
        ours.push(began.elapsed());
        let began = Instant::now();
        raw.seek(SeekFrom::Start((no % 500) * 12_288)).expect("within the file");
        raw.write_all(&[no as u8; 12_288]).expect("room");
        rustix_sync(&raw);
        theirs.push(began.elapsed());
    }
    for (name, times) in
        [("single", &mut ours), ("raw_sync", &mut theirs), ("hand_over", &mut handed)]
    {
        say(&format!("{name}.p50"), quantile(times, 0.5), "us");
        say(&format!("{name}.p99"), quantile(times, 0.99), "us");
    }
    say("single_to_raw", quantile(&mut ours, 0.5) / quantile(&mut theirs, 0.5), "x");
    desk.handle.close().expect("all is on disk");
}

fn rustix_sync(file: &File) {
    rustix::fs::fdatasync(file.as_fd()).expect("a sync");
}

fn groups(dir: &Path) {
    let mut desk = Desk::open(dir);
    for size in [100_u64, 1_000, 10_000] {
        let rounds = (40_000 / size).max(5);
        let mut rates = Vec::new();
        for round in 0..rounds {
            let drafts: Vec<Draft> = (0..size).map(|n| decision(round * size + n)).collect();
            let batch = desk.batch(drafts, start(), Seen::default());
            let began = Instant::now();
            desk.write(batch);
            rates.push(size as f64 / began.elapsed().as_secs_f64());
        }
        rates.sort_by(f64::total_cmp);
        say(&format!("group_{size}"), rates[rates.len() / 2], "rows/s");
    }
    desk.handle.close().expect("all is on disk");
}

/// Years at 2,000 decisions a day: bytes a row live and packed, and starts from the last day on.
fn long(dir: &Path, most: u64) {
    let mut desk = Desk::open(dir);
    let mut day = 0;
    while desk.rows < most {
        let utc = start() + Span::days(1) * day;
        let drafts = (0..2_000).map(|n| decision(desk.rows + n)).collect();
        desk.write(desk.batch(drafts, utc, Seen::default()));
        if day == 7 {
            desk.task(utc, Task::Checkpoint);
            let bytes = fs::metadata(dir.join(journal::FILE_NAME)).expect("the file").len();
            say("bytes_a_live_row", bytes as f64 / desk.rows as f64, "bytes");
        }
        if day > 0 && day % 7 == 0 {
            desk.task(utc, Task::Seal { before_day: 0 });
        }
        day += 1;
    }
    desk.task(start(), Task::Checkpoint);
    let rows = desk.rows;
    desk.handle.close().expect("all is on disk");
    let bytes = fs::metadata(dir.join(journal::FILE_NAME)).expect("the file").len();
    say("bytes_a_row", bytes as f64 / rows as f64, "bytes");
    say(
        "ten_years_of_decisions",
        bytes as f64 / rows as f64 * 7_305_000.0 / (1 << 30) as f64,
        "GiB",
    );
    starts(dir, rows);
    let began = Instant::now();
    let verified = journal::verify(dir, &mut |_, _| {}).expect("the chain holds");
    assert!(verified.rows >= rows);
    say("verify", verified.rows as f64 / began.elapsed().as_secs_f64(), "rows/s");
}

/// Each after a life that ended without closing.
fn starts(dir: &Path, rows: u64) {
    let mut times = Vec::new();
    for no in 0..100 {
        let began = Instant::now();
        let opening = Opening::begin(dir).expect("it opens");
        if no > 0 {
            assert!(opening.last_of_kind(kind::STOPPING).expect("it reads").is_some());
        }
        let journal = opening.walk(rows - 2_000, &mut |_| {}).expect("it verifies");
        times.push(began.elapsed());
        assert_eq!(journal.rows(), rows + no);
        let (to, replies) = channel();
        let term = journal.next_term();
        let handle = journal.start(to);
        let drafts = vec![Draft { kind: kind::STOPPING, ..decision(no) }];
        let (utc, boot, seen) = (start(), Mono::ZERO, Seen::default());
        handle
            .submit(Batch { term, utc, boot, drafts, intents: Vec::new(), seen })
            .expect("the journal runs");
        assert!(matches!(replies.recv(), Ok(Reply::Acked(_))));
        handle.close().expect("all is on disk");
    }
    say("open_from_the_last_day.p50", quantile(&mut times, 0.5) / 1e3, "ms");
    say("open_from_the_last_day.p99", quantile(&mut times, 0.99) / 1e3, "ms");
}

/// A month of minutes of fifty signals: levels that move with the tide and a millimetre of noise,
/// and some that stand still.
fn minutes(dir: &Path) {
    const DAYS: i64 = 30;
    let mut desk = Desk::open(dir);
    let mut noise = 12_345_u64;
    for day in 0..DAYS {
        let midnight = start() + Span::days(1) * day;
        let minutes: Vec<Minute> = (0..1440)
            .map(|m| {
                let at = midnight + Span::minutes(1) * m;
                let readings = (0..50).map(|no| reading(no, day * 1440 + m, &mut noise)).collect();
                Minute { at, readings }
            })
            .collect();
        let seen = Seen { events: Vec::new(), minutes };
        desk.write(desk.batch(Vec::new(), midnight, seen));
    }
    let last = start() + Span::days(DAYS);
    let before_day = (last.as_micros() / 86_400_000_000) as i32;
    desk.task(last, Task::Seal { before_day });
    desk.handle.close().expect("all is on disk");
    let mut count = 0;
    journal::minutes(dir, &mut |m| count += m.readings.len()).expect("they read back");
    assert_eq!(count as i64, DAYS * 1440 * 50);
    let bytes: u64 = fs::read_dir(dir.join("segments"))
        .expect("segments")
        .map(|e| e.and_then(|e| e.metadata()).expect("a segment").len())
        .sum();
    say("bytes_a_minute_reading", bytes as f64 / count as f64, "bytes");
    let ten_years = bytes as f64 / DAYS as f64 * 3652.5;
    say("ten_years_of_minutes", ten_years / (1 << 30) as f64, "GiB");
}

/// Forty move with the tide, each with noise of some millimetres; ten stand still but for a step.
fn reading(no: u32, minute: i64, noise: &mut u64) -> MinuteReading {
    *noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
    let jitter = f64::from((*noise >> 59) as u32) - 16.0;
    let phase = minute as f64 * 0.008_4 + f64::from(no);
    let steps = if no < 40 { (3_000.0 * libm_sin(phase) + jitter / 4.0) as i32 } else { 10_000 };
    MinuteReading { signal: format!("signal-{no}"), steps: Some(steps), exponent: -3, quality: 0 }
}

/// A tide-like curve needs no better one: a parabola an half-turn.
fn libm_sin(phase: f64) -> f64 {
    let turn = phase / std::f64::consts::PI;
    let within = turn - turn.floor();
    let sign = if (turn.floor() as i64) % 2 == 0 { 1.0 } else { -1.0 };
    sign * 4.0 * within * (1.0 - within)
}
