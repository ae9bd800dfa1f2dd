//! The plant's record on disk: `plant.jsonl`, one JSON object a line, flushed at each turn.
//!
//! `{"begin": ..}` at each start, then `{"sample": ..}` once a simulated minute and `{"event": ..}`
//! as they happen. Times are simulated: `utc_us` in microseconds, `boot_ns` in nanoseconds.

use std::fs::{File, OpenOptions};
use std::io::{self, BufWriter, Write};
use std::path::Path;

use plant::{Event, EventKind, FaultKind, Point, Record, RestDo, Sample, Truth};
use serde_json::{Value, json};

use crate::resume::tail;
use crate::works::Names;

pub(crate) const FILE: &str = "plant.jsonl";

/// Appends to the record.
pub(crate) struct Lines {
    out: BufWriter<File>,
}

impl Lines {
    pub fn append(folder: &Path) -> io::Result<Self> {
        let path = folder.join(FILE);
        // A plant that was killed in the middle of a line left it without an end.
        let torn = tail(&path).is_some_and(|end| !end.is_empty() && !end.ends_with('\n'));
        let file = OpenOptions::new().create(true).append(true).open(path)?;
        let mut lines = Self { out: BufWriter::new(file) };
        if torn {
            lines.out.write_all(b"\n")?;
        }
        Ok(lines)
    }
    pub fn begin(&mut self, truth: &Truth, resumed: bool) -> io::Result<()> {
        self.line(&json!({"begin": {
            "seed": truth.seed,
            "resumed": resumed,
            "friction_factor": truth.friction_factor,
            "loss_factor": truth.loss_factor,
            "pump_factor": truth.pump_factor,
            "spill_factor": truth.spill_factor,
            "inflow_factor": truth.inflow_factor,
            "meter_factor": truth.meter_factor,
            "lag_s": truth.lag.as_seconds(),
        }}))
    }
    /// Writes what has happened, samples and events each in their order, and flushes.
    pub fn write(&mut self, record: &Record, names: &Names) -> io::Result<()> {
        let mut events = record.events.iter().peekable();
        for s in &record.samples {
            while let Some(e) = events.next_if(|e| e.utc <= s.utc) {
                self.line(&event(e, names))?;
            }
            self.line(&sample(s))?;
        }
        events.try_for_each(|e| self.line(&event(e, names)))?;
        self.out.flush()
    }
    fn line(&mut self, value: &Value) -> io::Result<()> {
        serde_json::to_writer(&mut self.out, value)?;
        self.out.write_all(b"\n")
    }
}

fn sample(s: &Sample) -> Value {
    json!({"sample": {
        "utc_us": s.utc.as_micros(),
        "boot_ns": s.boot.as_nanos(),
        "level_m": s.level_m,
        "volume_m3": s.volume_m3,
        "outer_m": s.outer_m,
        "gate_percent": s.gate_percent,
        "pumps_run": s.pumps_run,
        "ports_m3_s": s.ports_m3_s,
        "spill_m3_s": s.spill_m3_s,
        "inflow_m3_s": s.inflow_m3_s,
        "inflow_m3": s.totals.inflow_m3,
        "released_m3": s.totals.released_m3,
        "spilled_m3": s.totals.spilled_m3,
        "pump_kwh": s.totals.pump_kwh,
        "current_m_s": s.current_m_s,
    }})
}

fn event(e: &Event, names: &Names) -> Value {
    let mut fields = kind(&e.kind, names);
    fields["utc_us"] = json!(e.utc.as_micros());
    fields["boot_ns"] = json!(e.boot.as_nanos());
    json!({ "event": fields })
}

fn kind(kind: &EventKind, names: &Names) -> Value {
    let name = |asset: &usize| names.assets.get(*asset).map_or("unknown", |a| a.name.as_str());
    match kind {
        EventKind::DriveReceived { asset, command, setting_percent, lease_end } => json!({
            "kind": "drive_received", "asset": name(asset), "command": command,
            "setting_percent": setting_percent, "lease_end_ns": lease_end.as_nanos(),
        }),
        EventKind::DriveRefused { asset, command, why } => json!({
            "kind": "drive_refused", "asset": name(asset), "command": command, "why": why,
        }),
        EventKind::Renewed { asset, command, lease_end } => json!({
            "kind": "renewed", "asset": name(asset), "command": command,
            "lease_end_ns": lease_end.as_nanos(),
        }),
        EventKind::LeaseOut { asset, command, lease_end } => json!({
            "kind": "lease_out", "asset": name(asset), "command": command,
            "lease_end_ns": lease_end.as_nanos(),
        }),
        EventKind::RestTold { asset, why } => {
            json!({"kind": "rest_told", "asset": name(asset), "why": why})
        }
        EventKind::RestBegun { asset, action } => {
            json!({"kind": "rest_begun", "asset": name(asset), "action": rest_word(*action)})
        }
        EventKind::RestDone { asset } => json!({"kind": "rest_done", "asset": name(asset)}),
        EventKind::ProtectionStopped { asset, why } => {
            json!({"kind": "protection_stopped", "asset": name(asset), "why": why})
        }
        EventKind::LocalTaken { asset } => json!({"kind": "local_taken", "asset": name(asset)}),
        EventKind::LocalGiven { asset } => json!({"kind": "local_given", "asset": name(asset)}),
        EventKind::FaultBegun { kind } => fault("fault_begun", *kind, names),
        EventKind::FaultEnded { kind } => fault("fault_ended", *kind, names),
        EventKind::PortsFlow => json!({"kind": "ports_flow"}),
        EventKind::PortsStill => json!({"kind": "ports_still"}),
        EventKind::SpillBegun => json!({"kind": "spill_begun"}),
        EventKind::SpillEnded => json!({"kind": "spill_ended"}),
    }
}

fn fault(event: &str, kind: FaultKind, names: &Names) -> Value {
    let signal = |p: Point| names.signals.iter().find(|s| s.reads == p).map(|s| s.name.as_str());
    let (fault, subject) = match kind {
        FaultKind::GateJam => ("gate_jam", names.assets.first().map(|a| a.name.as_str())),
        FaultKind::SignalFrozen(p) => ("signal_frozen", signal(p)),
        FaultKind::SignalMissing(p) => ("signal_missing", signal(p)),
    };
    json!({"kind": event, "fault": fault, "subject": subject})
}

const fn rest_word(action: RestDo) -> &'static str {
    match action {
        RestDo::Close => "close",
        RestDo::Open => "open",
        RestDo::Stop => "stop",
        RestDo::Hold => "hold",
    }
}
