//! The record looked after: duties when they are due, what was seen handed over with what followed
//! from it, and what the journal answers.

use std::fs;
use std::os::unix::fs::MetadataExt;
use std::path::{Path, PathBuf};
use std::sync::mpsc::SyncSender;

use anyhow::{Context, Result, bail};
use engine::{Event, Stamp, State};
use journal::{Done, Seen, Task};
use model::{DutyKind, Site};
use record::Note;
use serde_json::Value;
use units::{Mono, Span, Utc};

use super::duties::{self, About, Duties};
use super::minutes::Minutes;
use super::shell::Shell;
use super::speak;
use crate::control::{KeepRequest, Response};

pub struct Keeping {
    state_dir: PathBuf,
    duties: Duties,
    minutes: Minutes,
    seen: Seen,
    /// When what was seen is handed over at the latest, alone if nothing followed from it.
    flush_at: Option<Mono>,
    /// Since when, and why, the journal is lost.
    lost: Option<(Utc, String)>,
    key: Option<[u8; 32]>,
    /// Who waits for a task.
    asked: Vec<(Task, SyncSender<Response>)>,
}

/// What was seen waits so long at most.
const FLUSH_AFTER: Span = Span::seconds(1);

impl Keeping {
    pub fn new(site: &Site, site_file: &Path, state_dir: PathBuf, now: Utc) -> Result<Self> {
        let folder = if site_file.is_dir() { Some(site_file) } else { site_file.parent() };
        let folder = folder.unwrap_or(Path::new("."));
        let key = site.keeping.anchor_key.as_ref().map(|name| secret_key(&folder.join(name)));
        Ok(Self {
            state_dir,
            duties: Duties::new(site, now)?,
            minutes: Minutes::default(),
            seen: Seen::default(),
            flush_at: None,
            lost: None,
            key: key.transpose()?,
            asked: Vec::new(),
        })
    }

    /// Before the engine sees it.
    pub fn event(&mut self, stamp: &Stamp, event: &Event, site: &Site, speed: u32) {
        self.seen.events.push(record::encode_event(stamp, event, site));
        self.flush_at.get_or_insert(stamp.boot + FLUSH_AFTER * i64::from(speed));
    }

    /// After it, once a minute.
    pub fn minute(&mut self, state: &State, now: Utc) {
        if self.minutes.is_over(now) {
            let minute = self.minutes.over(state.site(), now, &state.readings(now));
            self.seen.minutes.extend(minute);
        }
    }

    pub fn take_seen(&mut self) -> Seen {
        self.flush_at = None;
        std::mem::take(&mut self.seen)
    }

    fn tasks(&self, kind: DutyKind, now: Utc, site: &Site) -> Vec<Task> {
        let (keeping, key) = (&site.keeping, self.key);
        duties::tasks(kind, now, &About { keeping, state_dir: &self.state_dir, key })
    }

    fn flush_due(&self, boot: Mono) -> bool {
        self.flush_at.is_some_and(|t| t <= boot)
    }
}

/// 64 hexadecimal digits in a file that only its owner reads.
pub fn secret_key(file: &Path) -> Result<[u8; 32]> {
    let at = || format!("the anchors' key in {}", file.display());
    let mode = fs::metadata(file).with_context(at)?.mode();
    if mode & 0o077 != 0 {
        bail!("{} has mode {:o}: others can read it; chmod 600 it", at(), mode & 0o777);
    }
    let text = fs::read_to_string(file).with_context(at)?;
    match blake3::Hash::from_hex(text.trim()) {
        Ok(bytes) => Ok(*bytes.as_bytes()),
        Err(_) => {
            bail!("{} must be 64 hexadecimal digits; make one with `tidereeve journal key`", at())
        }
    }
}

/// Whatever is due now.
pub fn turn(shell: &mut Shell) -> Result<()> {
    let now = shell.parts.clock.utc();
    for kind in shell.keeping.duties.take(now) {
        duty(shell, kind, now)?;
    }
    shell.snapshot(false)?;
    if shell.keeping.flush_due(shell.parts.clock.boot()) {
        shell.submit_alone(Vec::new())?;
    }
    Ok(())
}

fn duty(shell: &mut Shell, kind: DutyKind, now: Utc) -> Result<()> {
    if kind == DutyKind::Replan {
        return shell.feed(Event::Replan);
    }
    if kind == DutyKind::Seal {
        shell.snapshot(true)?;
    }
    for task in shell.keeping.tasks(kind, now, &shell.parts.site) {
        start(shell, task)?;
    }
    Ok(())
}

pub fn start(shell: &Shell, task: Task) -> Result<()> {
    let Stamp { term, utc, boot, .. } = shell.stamp();
    Ok(shell.parts.journal.task(journal::Stamp { term: term.0, utc, boot }, task)?)
}

/// What became of a task: rows shown, an anchor told to the log, a failure raised.
pub fn done(shell: &mut Shell, done: Done) -> Result<()> {
    for row in &done.rows {
        speak::row(row, shell.parts.rows);
        shell.took(row);
    }
    let name = done.task.name();
    match &done.outcome {
        // What wrote nothing down is of no interest to a person.
        Ok(words) if done.rows.is_empty() => tracing::debug!("{name}: {words}"),
        Ok(words) => {
            tracing::info!("{name}: {words}");
            if matches!(done.task, Task::Anchor { .. }) {
                shell.parts.host.anchor(words);
            }
        }
        Err(why) => tracing::error!("ALARM {name} failed: {why}"),
    }
    let waits = shell.keeping.asked.iter().position(|(task, _)| *task == done.task);
    if let Some(no) = waits {
        let (_, to) = shell.keeping.asked.remove(no);
        // Whoever asked may have gone away.
        let _ = to.send(match &done.outcome {
            Ok(words) => Response::Ok(Value::String(words.clone())),
            Err(why) => Response::Refused(why.clone()),
        });
    }
    match (done.task, done.outcome) {
        // A record with a wrong row proves nothing: whatever needs it stops until a person has
        // looked.
        (Task::Verify, Err(why)) => shell.feed(Event::JournalLost { why }),
        _ => Ok(()),
    }
}

pub fn lost(shell: &mut Shell, why: String) -> Result<()> {
    let now = shell.parts.clock.utc();
    shell.keeping.lost.get_or_insert((now, why.clone()));
    shell.feed(Event::JournalLost { why })
}

pub fn back(shell: &mut Shell, rows_kept: usize) -> Result<()> {
    if let Some((lost_at, why)) = shell.keeping.lost.take() {
        let rows_kept = rows_kept as u64;
        shell.submit_alone(vec![Note::JournalBack { lost_at, why, rows_kept }])?;
    }
    shell.feed(Event::JournalBack)
}

/// A person's task; the answer comes when it is done.
pub fn asked(shell: &mut Shell, what: KeepRequest, reply: SyncSender<Response>) -> Result<()> {
    let now = shell.parts.clock.utc();
    let kind = match what {
        KeepRequest::Hold { from_day, to_day, by, reason } => {
            return wait(shell, Task::Hold { from_day, to_day, by, reason }, reply);
        }
        KeepRequest::Lift { from_day, to_day, by, reason } => {
            return wait(shell, Task::Lift { from_day, to_day, by, reason }, reply);
        }
        KeepRequest::Seal => DutyKind::Seal,
        KeepRequest::Anchor => DutyKind::Anchor,
        KeepRequest::Backup => DutyKind::Backup,
        KeepRequest::Verify => DutyKind::Verify,
    };
    if kind == DutyKind::Seal {
        shell.snapshot(true)?;
    }
    let tasks = shell.keeping.tasks(kind, now, &shell.parts.site);
    match tasks.into_iter().next() {
        Some(task) => wait(shell, task, reply),
        None => {
            let why = "the site file names no folder for backups: set backup_to in [keeping]";
            let _ = reply.send(Response::Refused(why.to_owned()));
            Ok(())
        }
    }
}

fn wait(shell: &mut Shell, task: Task, reply: SyncSender<Response>) -> Result<()> {
    if matches!(&task, Task::Hold { by, reason, .. } | Task::Lift { by, reason, .. }
        if by.trim().is_empty() || reason.trim().is_empty())
    {
        let why = "a legal hold needs --by with a name and --reason with words";
        let _ = reply.send(Response::Refused(why.to_owned()));
        return Ok(());
    }
    start(shell, task.clone())?;
    shell.keeping.asked.push((task, reply));
    Ok(())
}

#[cfg(test)]
mod tests {
    use std::os::unix::fs::PermissionsExt;

    use super::*;

    #[test]
    fn a_key_that_others_can_read_or_that_is_none_is_refused() {
        let dir = tempfile::tempdir().unwrap();
        let file = dir.path().join("anchor.key");
        let write = |text: &str, mode| {
            fs::write(&file, text).unwrap();
            fs::set_permissions(&file, fs::Permissions::from_mode(mode)).unwrap();
        };
        write(&format!("{}\n", "07".repeat(32)), 0o600);
        assert_eq!(secret_key(&file).unwrap(), [7; 32]);
        write(&"07".repeat(32), 0o640);
        assert!(secret_key(&file).unwrap_err().to_string().contains("chmod 600"));
        write("seven", 0o600);
        assert!(secret_key(&file).unwrap_err().to_string().contains("64 hexadecimal digits"));
        assert!(secret_key(&dir.path().join("none")).is_err());
    }
}
