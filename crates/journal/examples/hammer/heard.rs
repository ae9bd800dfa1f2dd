//! What a run said, so that the files can be held to it.

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;

/// Empty if nothing was heard.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Heard {
    /// First eight hex digits of the hash of each acknowledged row.
    pub acked: BTreeMap<u64, String>,
    /// Commands that may have left, and the sequence of their intent.
    pub commands: BTreeMap<u64, u64>,
    /// Events that were acknowledged with their batch, by hash.
    pub seen: BTreeSet<String>,
    /// The legal hold was to be lifted: what was seen on the first day may go.
    pub may_go: bool,
    /// Terms that came to their end, with nothing left to be acknowledged.
    pub done: BTreeSet<u64>,
}

impl Heard {
    /// The first `lines` lines of the file. A last line without its end was not said in full.
    pub fn read(file: &Path, lines: usize) -> Result<Self, String> {
        let text = std::fs::read_to_string(file).map_err(|e| format!("{}: {e}", file.display()))?;
        let whole = text.split_inclusive('\n').filter(|l| l.ends_with('\n'));
        let mut heard = Self::default();
        for line in whole.take(lines) {
            heard.take(line).ok_or_else(|| format!("{}: what is {line:?}?", file.display()))?;
        }
        Ok(heard)
    }

    fn take(&mut self, line: &str) -> Option<()> {
        let words: Vec<&str> = line.split_whitespace().collect();
        match words[..] {
            ["ACK", seq, hash] => {
                self.acked.insert(seq.parse().ok()?, hash.to_owned());
            }
            ["COMMAND", id, seq] => {
                let (id, seq) = (id.parse().ok()?, seq.parse().ok()?);
                // The same permit twice would be a second command.
                if self.commands.insert(id, seq).is_some() {
                    return None;
                }
            }
            ["SEEN", hash] => {
                self.seen.insert(hash.to_owned());
            }
            ["MAY-GO"] => self.may_go = true,
            ["DONE", term] => {
                self.done.insert(term.parse().ok()?);
            }
            _ => {}
        }
        Some(())
    }
}
