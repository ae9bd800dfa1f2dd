//! The real journal: batches one after the other, each answer said as it comes.

use std::sync::mpsc::{Receiver, RecvTimeoutError, channel};

use journal::{Batch, Handle, Journal, JournalError, Reply};
use model::Site;
use record::{Draft, kind};
use units::{Mono, Span, Utc};

use crate::{Orders, say, site};

const LOST: u8 = 3;
const REFUSED: u8 = 4;
const STUCK: u8 = 5;
const UNCLOSED: u8 = 6;

/// Rows of the one large batch that makes the next checkpoint due.
const MANY_ROWS: u64 = 990;

pub fn run(orders: &Orders) -> Result<u8, String> {
    let journal = match Journal::open(&orders.dir, &mut |_| {}) {
        Ok(journal) => journal,
        Err(e) => {
            say(&format!("REFUSED {}", in_words(&e)));
            return Ok(REFUSED);
        }
    };
    let term = journal.next_term();
    let (to, replies) = channel::<Reply>();
    let handle = journal.start(to);
    let load = Load { orders, site: site::sallow(), term, handle, replies, owed: 0, lost: false };
    match orders.mode.as_str() {
        "append" => load.append(),
        "checkpoint" => load.checkpoint(),
        "stop" => load.stop(),
        other => Err(format!("no mode {other}")),
    }
}

struct Load<'a> {
    orders: &'a Orders,
    site: Site,
    term: u64,
    handle: Handle,
    replies: Receiver<Reply>,
    /// Batches handed over and not acknowledged yet.
    owed: u64,
    lost: bool,
}

impl Load<'_> {
    /// Ends without a close, as a process that is killed between two commits.
    fn append(mut self) -> Result<u8, String> {
        let code = self.all()?;
        std::mem::forget(self.handle);
        Ok(code)
    }

    /// The batches, with a checkpoint among them.
    fn checkpoint(mut self) -> Result<u8, String> {
        let (utc, boot) = instants(0);
        let drafts = (0..MANY_ROWS).map(|n| draft(self.orders.seed, n, 0)).collect();
        self.hand_over(Batch { term: self.term, utc, boot, drafts, intents: Vec::new() })?;
        let code = match self.answers()? {
            0 => self.all()?,
            stuck => stuck,
        };
        std::mem::forget(self.handle);
        Ok(code)
    }

    /// The batches, then a clean stop.
    fn stop(mut self) -> Result<u8, String> {
        let code = self.all()?;
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

    fn all(&mut self) -> Result<u8, String> {
        for no in 1..=self.orders.batches {
            let batch = batch(&self.site, self.orders.seed, self.term, no);
            self.hand_over(batch)?;
            if !self.lost {
                let code = self.answers()?;
                if code == STUCK {
                    return Ok(code);
                }
            }
        }
        let code = self.answers()?;
        if code == 0 {
            say("DONE");
        }
        Ok(code)
    }

    fn hand_over(&mut self, batch: Batch) -> Result<(), String> {
        self.owed += 1;
        self.handle.submit(batch).map_err(|e| in_words(&e))
    }

    /// Takes answers until all that is owed has come, or, while batches are still to be handed
    /// over, until the journal says that it is lost.
    fn answers(&mut self) -> Result<u8, String> {
        let was_lost = self.lost;
        while self.owed > 0 {
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

    fn take(&mut self, reply: Reply) {
        match reply {
            Reply::Acked(acked) => {
                self.owed -= 1;
                let mut lines: Vec<String> = Vec::new();
                for row in &acked.rows {
                    lines.push(ack(row.seq, &row.hash));
                }
                for committed in acked.committed {
                    let (command, seq) = (committed.permit().command(), committed.seq());
                    lines.push(format!("COMMAND {command} {seq}"));
                }
                if !lines.is_empty() {
                    say(&lines.join("\n"));
                }
            }
            Reply::Lost { why } => {
                self.lost = true;
                say(&format!("LOST {}", why.replace('\n', " ")));
            }
            Reply::Back => {
                self.lost = false;
                say("BACK");
            }
        }
    }
}

pub fn ack(seq: u64, hash: &[u8; 32]) -> String {
    let hex: String = hash[..4].iter().map(|b| format!("{b:02x}")).collect();
    format!("ACK {seq} {hex}")
}

/// Batch `no` of a run: one to four rows of different lengths, and an intent in every second one.
pub fn batch(site: &Site, seed: u64, term: u64, no: u64) -> Batch {
    let (utc, boot) = instants(no);
    let rows = 1 + mixed(seed, no) % 4;
    let drafts = (0..rows).map(|n| draft(seed, no, n)).collect();
    let command = term * 1_000_000 + no;
    let intents = match no % 2 {
        0 => vec![site::intent(site, command, term, boot)],
        _ => Vec::new(),
    };
    Batch { term, utc, boot, drafts, intents }
}

/// What a check adds.
pub fn one_row(term: u64) -> Batch {
    let (utc, boot) = instants(0);
    Batch { term, utc, boot, drafts: vec![draft(0, 0, 0)], intents: Vec::new() }
}

/// Ten minutes apart, so that a long run passes midnight.
fn instants(no: u64) -> (Utc, Mono) {
    let start = Utc::from_civil(2027, 5, 1, 23, 0, 0).expect("a day of the calendar");
    let no = no as i64;
    (start + Span::minutes(10) * no, Mono::from_nanos(1_000_000_000) + Span::minutes(10) * no)
}

/// One row in eight is longer than a page of the file.
fn draft(seed: u64, no: u64, n: u64) -> Draft {
    let mix = mixed(seed ^ 0x5eed, no * 16 + n);
    let long = if mix.is_multiple_of(8) { 5_000 } else { 0 };
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
