//! What recurs by the clock on the wall, and what the journal is then told to do.

use std::path::Path;

use anyhow::{Context, Result};
use model::{DutyKind, Keeping, Site};
use site::Schedule;
use units::{Span, Utc};

/// A clock that has gone back by more than this has its duties counted anew.
const BACK_MOST: Span = Span::minutes(1);

#[derive(Debug)]
pub struct Duties {
    list: Vec<Due>,
    last: Utc,
}

#[derive(Debug)]
struct Due {
    kind: DutyKind,
    schedule: Schedule,
    next: Option<Utc>,
}

impl Duties {
    pub fn new(site: &Site, now: Utc) -> Result<Self> {
        let due = |d: &model::Duty| {
            let schedule = Schedule::new(&d.when, site.zone.name(), d.in_both_passes);
            let schedule =
                schedule.map_err(anyhow::Error::msg).context("a duty of the site file")?;
            Ok(Due { kind: d.kind, next: schedule.next(now), schedule })
        };
        let list = site.keeping.duties.iter().map(due).collect::<Result<_>>()?;
        Ok(Self { list, last: now })
    }

    /// Those that are due by now. One that was due more than once meanwhile comes once.
    pub fn take(&mut self, now: Utc) -> Vec<DutyKind> {
        let went_back = now < self.last - BACK_MOST;
        self.last = now;
        let mut due = Vec::new();
        for one in &mut self.list {
            let is_due = one.next.is_some_and(|t| t <= now);
            if is_due {
                due.push(one.kind);
            }
            if is_due || went_back {
                one.next = one.schedule.next(now);
            }
        }
        due
    }
}

/// Days since 1970-01-01, UTC.
pub fn day(at: Utc) -> i32 {
    let day = at.as_micros().div_euclid(Span::days(1).as_micros());
    i32::try_from(day).unwrap_or(i32::MAX)
}

/// What a duty is done by.
pub struct About<'a> {
    pub keeping: &'a Keeping,
    pub state_dir: &'a Path,
    /// The secret key of signed anchors.
    pub key: Option<[u8; 32]>,
}

/// The tasks of the journal that a duty stands for.
pub fn tasks(kind: DutyKind, now: Utc, about: &About<'_>) -> Vec<journal::Task> {
    let &About { keeping, state_dir, key } = about;
    use journal::Task;
    let today = day(now);
    match kind {
        DutyKind::Checkpoint => vec![Task::Checkpoint],
        DutyKind::Seal => vec![
            Task::Seal { before_day: today },
            Task::Retain { before_day: day(now - keeping.segments_for) },
        ],
        DutyKind::Anchor => vec![Task::Anchor { key }],
        DutyKind::Backup => {
            let to = keeping.backup_to.as_ref().map(|to| state_dir.join(to));
            let backup = |to| Task::Backup { to, keep: keeping.backups };
            to.map(backup).into_iter().collect()
        }
        DutyKind::Verify => vec![Task::Verify],
        DutyKind::Summary => vec![Task::Summary { day: today - 1 }],
        DutyKind::Replan => Vec::new(),
    }
}

#[cfg(test)]
mod tests {
    use model::Duty;

    use super::*;

    fn utc(text: &str) -> Utc {
        Utc::parse(text).unwrap()
    }

    fn duties(when: &str, now: &str) -> Duties {
        let duty = Duty { kind: DutyKind::Anchor, when: when.to_owned(), in_both_passes: true };
        let schedule = Schedule::new(&duty.when, "UTC", true).unwrap();
        let next = schedule.next(utc(now));
        Duties { list: vec![Due { kind: duty.kind, schedule, next }], last: utc(now) }
    }

    #[test]
    fn a_duty_that_was_missed_often_is_done_once() {
        let mut duties = duties("0 0 * * * *", "2027-05-01T00:30:00Z");
        assert_eq!(duties.take(utc("2027-05-01T00:59:59Z")), []);
        assert_eq!(duties.take(utc("2027-05-01T01:00:00Z")), [DutyKind::Anchor]);
        assert_eq!(duties.take(utc("2027-05-01T01:00:01Z")), []);
        assert_eq!(duties.take(utc("2027-05-03T07:10:00Z")), [DutyKind::Anchor]);
        assert_eq!(duties.take(utc("2027-05-03T07:10:01Z")), []);
    }

    #[test]
    fn a_clock_that_goes_back_by_a_day_does_not_silence_a_duty_for_a_day() {
        let mut duties = duties("0 0 * * * *", "2027-05-02T00:30:00Z");
        assert_eq!(duties.take(utc("2027-05-01T00:40:00Z")), []);
        assert_eq!(duties.take(utc("2027-05-01T01:00:00Z")), [DutyKind::Anchor]);
    }

    #[test]
    fn days_before_1970_count_down() {
        assert_eq!(day(utc("1970-01-01T23:59:59Z")), 0);
        assert_eq!(day(utc("1969-12-31T23:59:59Z")), -1);
        assert_eq!(day(utc("2027-05-01T00:00:00Z")), 20_939);
    }
}
