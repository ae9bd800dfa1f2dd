//! The real journal: batches and tasks one after the other, each answer said as it comes.

use std::sync::mpsc::{Receiver, RecvTimeoutError, channel};

use journal::{Batch, Done, Handle, Journal, JournalError, Minute, MinuteReading, Reply, Seen};
use journal::{Stamp, Task};
use model::Site;
use record::{Draft, Note, encode_note, kind};
use units::{Mono, Span, Utc};

use crate::{Orders, say, site};

const LOST: u8 = 3;
const REFUSED: u8 = 4;
const STUCK: u8 = 5;
const UNCLOSED: u8 = 6;

const COMMANDS_PER_TERM: u64 = 1_000_000;
/// Rows of the one large batch that makes the next checkpoint due.
const MANY_ROWS: u64 = 990;
/// 2027-05-02, the second day of a run: see [`instants`].
pub const SECOND_DAY: i32 = 20_940;

pub fn run(orders: &Orders) -> Result<u8, String> {
    let journal = match Journal::open(&orders.dir, &mut |_| {}) {
        Ok(journal) => journal,
        Err(e) => {
            say(&format!("REFUSED {}", in_words(&e)));
            return Ok(REFUSED);
        }
    };
    let (term, lifted_from) = (journal.next_term(), journal.lifted_from());
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    let (site, events) = (site::sallow(), Vec::new());
    let (lost, undone) = (false, 0);
    let mut load = Load { orders, site, term, handle, replies, events, lost, undone };
    let mut code = load.mode(lifted_from)?;
    while code == 0 && load.owed() {
        code = load.answers()?;
    }
    if code == 0 {
        say(&format!("DONE {term}"));
    }
    load.end(code)
}

struct Load<'a> {
    orders: &'a Orders,
    site: Site,
    term: u64,
    handle: Handle,
    replies: Receiver<Reply>,
    /// For each batch that was handed over and not acknowledged: the events in it.
    events: Vec<Vec<Vec<u8>>>,
    lost: bool,
    /// Tasks that have not been answered.
    undone: u64,
}

impl Load<'_> {
    fn mode(&mut self, lifted_from: Option<u32>) -> Result<u8, String> {
        let to = self.orders.dir.with_file_name("backups");
        let (by, reason) = ("A. Reeve".to_owned(), "asked for".to_owned());
        let (before_day, day) = (SECOND_DAY, SECOND_DAY - 1);
        match self.orders.mode.as_str() {
            "append" | "again" | "stop" => self.batches(0),
            "checkpoint" => {
                let drafts = (0..MANY_ROWS).map(|n| draft(self.orders.seed, n, 0)).collect();
                self.submit(self.batch_of(drafts))?;
                self.batches(0)
            }
            "seal" => self.around(vec![
                Task::Checkpoint,
                Task::Seal { before_day },
                Task::Anchor { key: Some([7; 32]) },
                Task::Verify,
            ]),
            "retain" => {
                let (from_day, to_day) = (day, day);
                let (by_too, reason_too) = (by.clone(), reason.clone());
                self.around(vec![
                    Task::Seal { before_day },
                    Task::Hold { from_day, to_day, by, reason },
                    Task::Retain { before_day },
                    Task::Lift { from_day, to_day, by: by_too, reason: reason_too },
                    Task::Retain { before_day },
                    Task::Summary { day },
                ])
            }
            "backup" => self.around(vec![
                Task::Seal { before_day },
                Task::Backup { to: to.clone(), keep: 1 },
                Task::Backup { to, keep: 1 },
            ]),
            "pack" => self.around(vec![Task::Seal { before_day }]),
            "migrate" => {
                if let Some(from) = lifted_from {
                    let lifted = encode_note(&Note::Migrated { from, to: 2 });
                    self.submit(self.batch_of(vec![lifted]))?;
                }
                self.batches(0)
            }
            other => Err(format!("no mode {other}")),
        }
    }

    /// All but `append` and `again` end with a clean stop; those as a process that is killed between
    /// two commits.
    fn end(self, code: u8) -> Result<u8, String> {
        if ["append", "again"].contains(&self.orders.mode.as_str()) || code != 0 {
            std::mem::forget(self.handle);
            return Ok(code);
        }
        match self.handle.close() {
            Ok(()) => {
                say("CLOSED");
                Ok(code)
            }
            Err(e) => {
                say(&format!("UNCLOSED {}", in_words(&e)));
                Ok(UNCLOSED)
            }
        }
    }

    /// The batches, then each task with a batch after it.
    fn around(&mut self, tasks: Vec<Task>) -> Result<u8, String> {
        let mut code = self.batches(0)?;
        for (task, no) in tasks.into_iter().zip(1..) {
            if code != 0 {
                break;
            }
            code = self.task(task, no)?;
        }
        Ok(code)
    }

    /// So many of the orders' batches, after `from` others.
    fn batches(&mut self, from: u64) -> Result<u8, String> {
        for no in from + 1..=from + self.orders.batches {
            self.submit(batch(&self.site, self.orders.seed, self.term, no))?;
            // While it is lost, batches are handed over all the same.
            if !self.lost && self.answers()? == STUCK {
                return Ok(STUCK);
            }
        }
        self.answers()
    }

    /// The task, once more if the journal was lost over it, and a batch after it.
    fn task(&mut self, task: Task, no: u64) -> Result<u8, String> {
        if matches!(task, Task::Lift { .. }) {
            say("MAY-GO");
        }
        let after = self.orders.batches + no;
        let (utc, boot) = instants(after);
        let stamp = Stamp { term: self.term, utc, boot };
        for _again in 0..2 {
            self.undone += 1;
            self.handle.task(stamp, task.clone()).map_err(|e| in_words(&e))?;
            let before = self.lost;
            let code = self.answers()?;
            if code != 0 || (!before && !self.lost) {
                break;
            }
        }
        self.submit(batch(&self.site, self.orders.seed, self.term, after))?;
        self.answers()
    }

    fn submit(&mut self, batch: Batch) -> Result<(), String> {
        self.events.push(batch.seen.events.clone());
        self.handle.submit(batch).map_err(|e| in_words(&e))
    }

    fn batch_of(&self, drafts: Vec<Draft>) -> Batch {
        let (utc, boot) = instants(0);
        let (intents, seen) = (Vec::new(), Seen::default());
        Batch { term: self.term, utc, boot, drafts, intents, seen }
    }

    /// Takes answers until all that is owed has come; or until the journal becomes lost, so that
    /// more is handed over while it is.
    fn answers(&mut self) -> Result<u8, String> {
        let was_lost = self.lost;
        while self.owed() {
            match self.replies.recv_timeout(self.orders.patience) {
                Ok(reply) => self.take(reply),
                Err(RecvTimeoutError::Timeout) if self.lost => {
                    say("GIVEN-UP");
                    return Ok(LOST);
                }
                Err(RecvTimeoutError::Timeout) => {
                    say("STUCK");
                    return Ok(STUCK);
                }
                Err(RecvTimeoutError::Disconnected) => return Err("no journal".to_owned()),
            }
            if self.lost && !was_lost {
                return Ok(0);
            }
        }
        Ok(0)
    }

    fn owed(&self) -> bool {
        !self.events.is_empty() || self.undone > 0 || self.lost
    }

    fn take(&mut self, reply: Reply) {
        match reply {
            Reply::Acked(acked) => {
                let events = self.events.remove(0);
                let mut lines: Vec<String> =
                    acked.rows.iter().map(|r| ack(r.seq, &r.hash)).collect();
                lines.extend(events.iter().map(|e| format!("SEEN {}", short_hash(e))));
                for committed in acked.committed {
                    let (command, seq) = (committed.permit().command(), committed.seq());
                    lines.push(format!("COMMAND {command} {seq}"));
                }
                say(&lines.join("\n"));
            }
            Reply::Lost { why } => {
                self.lost = true;
                say(&format!("LOST {}", why.replace('\n', " ")));
            }
            Reply::Back { .. } => {
                self.lost = false;
                say("BACK");
            }
            Reply::Done(done) => self.done(&done),
        }
    }

    fn done(&mut self, done: &Done) {
        self.undone -= 1;
        let mut lines: Vec<String> = done.rows.iter().map(|r| ack(r.seq, &r.hash)).collect();
        let name = done.task.name();
        lines.push(match &done.outcome {
            Ok(words) => format!("TASK {name}: {words}"),
            Err(why) => format!("FAILED {name}: {}", why.replace('\n', " ")),
        });
        say(&lines.join("\n"));
    }
}

pub fn ack(seq: u64, hash: &[u8; 32]) -> String {
    format!("ACK {seq} {}", hex(hash))
}

pub fn short_hash(bytes: &[u8]) -> String {
    hex(blake3::hash(bytes).as_bytes())
}

fn hex(hash: &[u8; 32]) -> String {
    hash[..4].iter().map(|b| format!("{b:02x}")).collect()
}

/// Batch `no` of a run: one to four rows of different lengths, an intent in every second one, and
/// what was seen.
pub fn batch(site: &Site, seed: u64, term: u64, no: u64) -> Batch {
    let (utc, boot) = instants(no);
    let rows = 1 + mixed(seed, no) % 4;
    let drafts = (0..rows).map(|n| draft(seed, no, n)).collect();
    let command = term * COMMANDS_PER_TERM + no;
    let intents = match no % 2 {
        0 => vec![site::intent(site, command, term, boot)],
        _ => Vec::new(),
    };
    let seen = match no % 3 {
        0 => Seen::default(),
        n => seen(seed, term, no, n, utc),
    };
    Batch { term, utc, boot, drafts, intents, seen }
}

fn seen(seed: u64, term: u64, no: u64, n: u64, at: Utc) -> Seen {
    let event = |k| format!("event {k} of batch {no} in term {term} of {seed}").into_bytes();
    let reading = |k: u64| MinuteReading {
        signal: format!("level-{k}"),
        steps: (!mixed(seed, no + k).is_multiple_of(9)).then_some((mixed(seed, no) % 5_000) as i32),
        exponent: -3,
        quality: 0,
    };
    let minutes = vec![Minute { at, readings: (0..4).map(reading).collect() }];
    Seen { events: (0..n).map(event).collect(), minutes }
}

/// The term that a command was numbered in.
pub const fn term_of(command: u64) -> u64 {
    command / COMMANDS_PER_TERM
}

/// What a check adds.
pub fn one_row(term: u64) -> Batch {
    let (utc, boot) = instants(0);
    let (drafts, intents) = (vec![draft(0, 0, 0)], Vec::new());
    Batch { term, utc, boot, drafts, intents, seen: Seen::default() }
}

/// Twenty minutes apart from an hour before midnight on, so that the third batch is in another day.
fn instants(no: u64) -> (Utc, Mono) {
    let start = Utc::from_civil(2027, 5, 1, 23, 0, 0).expect("a day of the calendar");
    let no = no as i64;
    (start + Span::minutes(20) * no, Mono::from_nanos(1_000_000_000) + Span::minutes(20) * no)
}

/// One row in eight is longer than a page of the file.
pub fn draft(seed: u64, no: u64, n: u64) -> Draft {
    let mix = mixed(seed ^ 0x5eed, no * 16 + n);
    let long = if mix.is_multiple_of(8) && no < 100 { 5_000 } else { 0 };
    let length = (mix >> 8) % 60 + long;
    let body = (0..length).map(|i| mixed(mix, i) as u8).collect();
    Draft {
        kind: kind::STOPPING,
        version: record::VERSION,
        subject: "site".to_owned(),
        cause: format!("row {n} of batch {no}"),
        body,
    }
}

/// A number that looks like any other: Steele, Lea and Flood (2014), "Fast splittable pseudorandom
/// number generators", the finaliser of SplitMix64.
pub fn mixed(seed: u64, no: u64) -> u64 {
    let step = no.wrapping_add(1).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    let mut z = seed.wrapping_add(step);
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    z ^ (z >> 31)
}

pub fn in_words(error: &JournalError) -> String {
    let mut words = error.to_string();
    let mut under = std::error::Error::source(error);
    while let Some(e) = under {
        words.push_str(": ");
        words.push_str(&e.to_string());
        under = e.source();
    }
    words.replace('\n', " ")
}
