//! What the protocol says of each command, whatever the equipment.

use std::collections::{BTreeMap, VecDeque};

use protocol::{Code, Drive, LeaseHolder, Point, RpcError};

/// Remembered answers: the same command again gets the same one.
const REMEMBERED: usize = 256;

/// The state that the rules need.
#[derive(Debug, Default)]
pub(crate) struct Rules {
    points: BTreeMap<String, Point>,
    highest_term: u64,
    answered: VecDeque<(u64, Result<(), RpcError>)>,
    /// Leases that the adapter itself must end: point, command, end.
    leases: BTreeMap<String, (u64, u64)>,
    introduced: bool,
}

impl Rules {
    pub(crate) fn introduced(&mut self, points: &[Point], term: u64) {
        self.points = points.iter().map(|p| (p.id.clone(), p.clone())).collect();
        self.highest_term = self.highest_term.max(term);
        self.introduced = true;
    }
    pub(crate) const fn is_introduced(&self) -> bool {
        self.introduced
    }
    pub(crate) fn drivable(&self) -> impl Iterator<Item = &Point> {
        self.points.values().filter(|p| p.drivable)
    }
    pub(crate) fn point(&self, id: &str) -> Option<&Point> {
        self.points.get(id)
    }
    /// The answer that this command had before.
    pub(crate) fn before(&self, command: u64) -> Option<Result<(), RpcError>> {
        self.answered.iter().find(|(c, _)| *c == command).map(|(_, a)| a.clone())
    }
    pub(crate) fn remember(&mut self, command: u64, answer: &Result<(), RpcError>) {
        if self.answered.len() == REMEMBERED {
            self.answered.pop_front();
        }
        self.answered.push_back((command, answer.clone()));
    }
    /// Refuses what no equipment should be asked.
    pub(crate) fn may_drive(&mut self, d: &Drive, now_ns: u64) -> Result<(), RpcError> {
        if d.term < self.highest_term {
            let text = format!("term {} is older than {}", d.term, self.highest_term);
            return Err(RpcError::new(Code::OldTerm, text));
        }
        let point = self.points.get(&d.point).ok_or_else(|| {
            RpcError::new(Code::UnknownPoint, format!("there is no point {:?}", d.point))
        })?;
        if !point.drivable {
            let text = format!("{:?} can only be read", d.point);
            return Err(RpcError::new(Code::NotDrivable, text));
        }
        if !(point.min..=point.max).contains(&d.setpoint) {
            let text = format!("{} is outside {} to {}", d.setpoint, point.min, point.max);
            return Err(RpcError::new(Code::OutOfRange, text));
        }
        if d.expires_boottime_ns <= now_ns {
            return Err(RpcError::new(Code::Expired, "the command's end is past"));
        }
        let shortest_ns = point.lease_shortest_ms.unwrap_or(0).saturating_mul(1_000_000);
        if d.expires_boottime_ns - now_ns < shortest_ns {
            let text = format!("this point needs {shortest_ns} ns of lease at least");
            return Err(RpcError::new(Code::LeaseTooShort, text));
        }
        self.highest_term = d.term;
        Ok(())
    }
    pub(crate) fn driven(&mut self, d: &Drive) {
        let held = self.points.get(&d.point).and_then(|p| p.lease_holder);
        if held == Some(LeaseHolder::Adapter) {
            self.leases.insert(d.point.clone(), (d.command, d.expires_boottime_ns));
        }
    }
    pub(crate) fn renewed(&mut self, command: u64, expires_ns: u64) {
        if let Some(lease) = self.leases.values_mut().find(|l| l.0 == command) {
            lease.1 = expires_ns;
        }
    }
    pub(crate) fn rested(&mut self, point: &str) {
        self.leases.remove(point);
    }
    /// Points whose lease has run out; they are taken off the list.
    pub(crate) fn run_out(&mut self, now_ns: u64) -> Vec<String> {
        let out: Vec<String> =
            self.leases.iter().filter(|(_, l)| l.1 <= now_ns).map(|(p, _)| p.clone()).collect();
        out.iter().for_each(|p| {
            self.leases.remove(p);
        });
        out
    }
}
