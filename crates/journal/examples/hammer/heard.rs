//! What a run said, so that the files can be held to it.

use std::collections::BTreeMap;
use std::path::Path;

/// Empty if nothing was heard.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct Heard {
    /// First eight hex digits of the hash of each acknowledged row.
    pub acked: BTreeMap<u64, String>,
    /// Commands that may have left, and the sequence of their intent.
    pub commands: BTreeMap<u64, u64>,
    /// The run came to its end, with nothing left to be acknowledged.
    pub done: bool,
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
            ["DONE"] => self.done = true,
            _ => {}
        }
        Some(())
    }
}
