//! Backups: the file as it stood at a checkpoint, copied while new rows wait in the WAL, then
//! verified from its first row to its last before it gets its name.
//!
//! ```text
//! checkpoint, freeze -> copied in slices -> thaw -> synced, verified, segments copied, renamed
//!   -> BACKED_UP row
//! ```

use std::fs::{self, File};
use std::io::{self, Write};
use std::os::unix::fs::FileExt;
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, TryRecvError, sync_channel};

use record::Note;

use crate::chain::{Head, Walk};
use crate::file::Evidence;
use crate::seal::SEGMENTS;
use crate::task::{Desk, Slice};
use crate::{FILE_NAME, JournalError, durable};

const SLICE_BYTES: u64 = 1 << 20;
/// Ends the name of what is not finished.
const PART: &str = "part";

pub(crate) struct Backing {
    to: PathBuf,
    keep: u32,
    state: State,
}

enum State {
    Begin,
    Copying(Copying),
    Verifying { name: String, head: Head, bytes: u64, verdict: Receiver<Result<(), String>> },
}

struct Copying {
    name: String,
    part: PathBuf,
    file: File,
    head: Head,
    at: u64,
    bytes: u64,
}

impl Backing {
    pub(crate) fn new(to: PathBuf, keep: u32) -> Self {
        Self { to, keep, state: State::Begin }
    }

    pub(crate) fn slice(&mut self, desk: &mut Desk<'_>) -> Result<Slice, JournalError> {
        let begun = std::mem::replace(&mut self.state, State::Begin);
        self.state = match begun {
            State::Begin => State::Copying(self.begin(desk)?),
            State::Copying(mut copying) => match copying.slice(desk) {
                Ok(true) => State::Copying(copying),
                Ok(false) => {
                    desk.journal.frozen = false;
                    self.verify(copying, desk.journal.dir())
                }
                Err(source) => {
                    desk.journal.frozen = false;
                    return Err(self.failed("copying the evidence", source));
                }
            },
            State::Verifying { name, head, bytes, verdict } => match verdict.try_recv() {
                Ok(Ok(())) => {
                    let (of_seq, hash) = (head.seq, head.hash);
                    let words = format!("{} rows in {}", of_seq, self.to.join(&name).display());
                    let note = Note::BackedUp { file: name, of_seq, hash, bytes };
                    desk.keep(&[note], &mut |_| Ok(()))?;
                    let pruned = prune(&self.to, self.keep);
                    pruned.map_err(|e| self.failed("removing old backups", e))?;
                    return Ok(Slice::Done(words));
                }
                Ok(Err(why)) => {
                    return Err(self.failed("verifying a backup", io::Error::other(why)));
                }
                Err(TryRecvError::Empty) => {
                    self.state = State::Verifying { name, head, bytes, verdict };
                    return Ok(Slice::Wait);
                }
                Err(TryRecvError::Disconnected) => {
                    let source = io::Error::other("the thread that verifies it is gone");
                    return Err(self.failed("verifying a backup", source));
                }
            },
        };
        Ok(Slice::More)
    }

    fn failed(&self, doing: &'static str, source: io::Error) -> JournalError {
        JournalError::Io { path: self.to.clone(), doing, source }
    }

    fn begin(&self, desk: &mut Desk<'_>) -> Result<Copying, JournalError> {
        desk.journal.checkpoint()?;
        let head = desk.journal.head();
        let name = format!("evidence-{}.sqlite", head.seq);
        let part = self.to.join(format!("{name}.{PART}"));
        let file = durable::folder(&self.to).and_then(|()| File::create(&part));
        let file = file.map_err(|e| self.failed("beginning a backup", e))?;
        let bytes = desk.journal.evidence.source()?.metadata().map(|m| m.len());
        let bytes = bytes.map_err(|e| self.failed("asking for its size", e))?;
        desk.journal.frozen = true;
        Ok(Copying { name, part, file, head, at: 0, bytes })
    }

    /// Sync and verification take long, and touch only the copy: a thread of its own.
    fn verify(&self, copying: Copying, state_dir: &Path) -> State {
        let Copying { name, part, file, head, bytes, .. } = copying;
        let (to, verdict) = sync_channel(1);
        let (target, segments) = (self.to.clone(), state_dir.join(SEGMENTS));
        let to_name = target.join(&name);
        let work = move || {
            let done = file.sync_all().map_err(|e| e.to_string()).and_then(|()| {
                verified(&part, head)?;
                copy_segments(&segments, &target.join(SEGMENTS)).map_err(|e| e.to_string())?;
                durable::rename(&part, &to_name).map_err(|e| e.to_string())
            });
            // Nobody waits any more if the journal was lost meanwhile.
            let _ = to.send(done);
        };
        let thread = std::thread::Builder::new().name("backup".to_owned()).spawn(work);
        drop(thread.expect("the system gives one small thread"));
        State::Verifying { name, head, bytes, verdict }
    }
}

impl Copying {
    /// Whether there is more to copy.
    fn slice(&mut self, desk: &Desk<'_>) -> io::Result<bool> {
        let n = SLICE_BYTES.min(self.bytes - self.at);
        let mut buffer = vec![0; n as usize];
        let source = desk.journal.evidence.source().map_err(io::Error::other)?;
        source.read_exact_at(&mut buffer, self.at)?;
        self.file.write_all(&buffer)?;
        self.at += n;
        Ok(self.at < self.bytes)
    }
}

/// The copy holds the whole chain up to `head`.
fn verified(copy: &Path, head: Head) -> Result<(), String> {
    let in_words = |e| crate::lost::in_words(&e);
    let evidence = Evidence::open_copy(copy).map_err(in_words)?;
    let end = Walk::WHOLE.finish(&evidence, &mut |_| {}).map_err(in_words)?;
    if end == head { Ok(()) } else { Err(format!("the copy ends at row {}", end.seq)) }
}

/// Segments never change, so that those which are there already are left.
fn copy_segments(from: &Path, to: &Path) -> io::Result<()> {
    if !from.exists() {
        return Ok(());
    }
    durable::folder(to)?;
    for entry in fs::read_dir(from)? {
        let entry = entry?;
        let target = to.join(entry.file_name());
        let part = Path::new(&entry.file_name()).extension().is_some_and(|e| e == PART);
        if part || target.exists() {
            continue;
        }
        let copy = to.join(format!("{}.{PART}", entry.file_name().display()));
        fs::copy(entry.path(), &copy)?;
        File::open(&copy)?.sync_all()?;
        fs::rename(&copy, &target)?;
    }
    // Those that were there already may have names that no sync has reached: an earlier attempt may
    // have ended, or failed, between the two.
    File::open(to)?.sync_all()
}

/// Removes the oldest copies beyond `keep`, and what an earlier run left half done.
fn prune(to: &Path, keep: u32) -> io::Result<()> {
    let mut copies: Vec<(u64, PathBuf)> = Vec::new();
    for entry in fs::read_dir(to)? {
        let path = entry?.path();
        let name = path.file_name().and_then(|n| n.to_str()).unwrap_or_default();
        let Some(rest) = name.strip_prefix("evidence-") else { continue };
        if rest.ends_with(PART) {
            fs::remove_file(&path)?;
        } else if let Some(Ok(seq)) = rest.strip_suffix(".sqlite").map(str::parse) {
            copies.push((seq, path));
        }
    }
    copies.sort_unstable_by(|a, b| b.cmp(a));
    for (_, path) in copies.into_iter().skip(keep.max(1) as usize) {
        fs::remove_file(path)?;
    }
    Ok(())
}

/// Puts a backup into an empty state folder: verified before and after, so that the hash of its last
/// row is that of the backup. Gives how many rows it has.
///
/// # Errors
/// The backup does not verify; the state folder holds a record already.
pub fn restore(backup: &Path, dir: &Path) -> Result<u64, JournalError> {
    let target = dir.join(FILE_NAME);
    if target.exists() {
        return Err(JournalError::NotEmpty { path: target });
    }
    let head = Walk::WHOLE.finish(&Evidence::open_copy(backup)?, &mut |_| {})?;
    let failed = |source| JournalError::Io { path: dir.to_owned(), doing: "restoring", source };
    let part = dir.join(format!("{FILE_NAME}.{PART}"));
    let copied = fs::create_dir_all(dir).and_then(|()| {
        fs::copy(backup, &part)?;
        File::open(&part)?.sync_all()?;
        copy_segments(&backup.with_file_name(SEGMENTS), &dir.join(SEGMENTS))
    });
    copied.map_err(failed)?;
    verified(&part, head).map_err(|why| failed(io::Error::other(why)))?;
    durable::rename(&part, &target).map_err(failed)?;
    Ok(head.seq)
}
