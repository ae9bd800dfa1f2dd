//! A journal under a few rows, for the tests beside it.

use std::path::Path;
use std::sync::mpsc::{Receiver, channel};

use journal::{Batch, Done, Handle, Journal, Minute, MinuteReading, Reply, Seen, Stamp, Task};
use record::{Draft, kind};
use units::{Mono, Span, Utc};

/// 2027-05-01, counted from 1970-01-01.
pub const FIRST_DAY: i32 = 20_939;

pub fn noon(day: i32) -> Utc {
    Utc::EPOCH + Span::days(1) * i64::from(day) + Span::hours(12)
}

pub struct Desk {
    pub handle: Handle,
    replies: Receiver<Reply>,
    term: u64,
}

impl Desk {
    pub fn open(dir: &Path) -> Self {
        Self::of(Journal::open(dir, &mut |_| {}).unwrap())
    }

    pub fn of(journal: Journal) -> Self {
        let term = journal.next_term();
        let (to, replies) = channel();
        Self { handle: journal.start(to), replies, term }
    }

    pub fn stamp(&self, day: i32) -> Stamp {
        Stamp { term: self.term, utc: noon(day), boot: Mono::from_nanos(5) }
    }

    /// So many rows at noon of that day, with so many events and one minute, in one batch.
    pub fn write(&self, day: i32, rows: u64, events: u64) -> Vec<record::Row> {
        let drafts = (0..rows).map(draft).collect();
        let Stamp { term, utc, boot } = self.stamp(day);
        let seen = seen(day, events);
        self.handle.submit(Batch { term, utc, boot, drafts, intents: Vec::new(), seen }).unwrap();
        match self.reply() {
            Reply::Acked(acked) => acked.rows,
            other => panic!("{other:?}"),
        }
    }

    pub fn reply(&self) -> Reply {
        self.replies.recv().unwrap()
    }

    pub fn task(&self, day: i32, task: Task) -> Done {
        self.handle.task(self.stamp(day), task).unwrap();
        loop {
            if let Reply::Done(done) = self.reply() {
                return done;
            }
        }
    }

    /// A task that must succeed; its words.
    pub fn done(&self, day: i32, task: Task) -> String {
        self.task(day, task).outcome.unwrap()
    }
}

pub fn draft(no: u64) -> Draft {
    let body = [4, 0, 0, 0].iter().chain(b"tide").copied().collect();
    let cause = format!("reason {}", no % 7);
    Draft { kind: kind::STOPPING, version: 1, subject: "site".to_owned(), cause, body }
}

fn seen(day: i32, events: u64) -> Seen {
    if events == 0 {
        return Seen::default();
    }
    let readings = (0..3).map(|no| MinuteReading {
        signal: format!("level-{no}"),
        steps: (no < 2).then_some(1234 + no),
        exponent: -3,
        quality: if no < 2 { 0 } else { 4 },
    });
    let minutes = vec![Minute { at: noon(day), readings: readings.collect() }];
    Seen { events: (0..events).map(|no| event(day, no)).collect(), minutes }
}

pub fn event(day: i32, no: u64) -> Vec<u8> {
    format!("day {day} event {no}").into_bytes()
}
