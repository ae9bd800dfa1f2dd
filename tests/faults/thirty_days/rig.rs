//! The binary as real processes: started, asked, killed by its own number, and its record read.

use std::fs;
use std::io::{BufRead, BufReader};
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};
use std::sync::{Arc, Mutex};
use std::thread;
use std::time::{Duration, Instant};

use model::Site;
use oracle::{Event, EventKind, Run, Sample};
use serde_json::Value;
use units::{Mono, Utc};

/// `tidereeve` beside this test's own binary; `tests/run` builds it before the tests.
fn binary() -> PathBuf {
    let own = std::env::current_exe().unwrap();
    let folder = own.ancestors().nth(2).expect("target/PROFILE/deps/TEST");
    let binary = folder.join("tidereeve");
    assert!(
        binary.is_file(),
        "{} is missing; build it first: cargo build --workspace",
        binary.display()
    );
    binary
}

/// Rows as the daemon printed them: (number, `UTC words`).
pub type Printed = Arc<Mutex<Vec<(u64, String)>>>;

pub struct Rig {
    /// Removed with the rig.
    folder: tempfile::TempDir,
    speed: u32,
    daemon: Option<Child>,
    pub printed: Printed,
    printer: Option<thread::JoinHandle<()>>,
}

impl Rig {
    /// The demonstration site with these changes to the end of its file, in a folder of its own.
    pub fn new(start: &str, faults: &str, speed: u32) -> Self {
        let folder = tempfile::tempdir().unwrap();
        let site = folder.path().join("site");
        fs::create_dir(&site).unwrap();
        let from = Path::new(env!("CARGO_MANIFEST_DIR")).join("../deploy/sites/tarrow-works");
        fs::copy(from.join("licence.toml"), site.join("licence.toml")).unwrap();
        let text = fs::read_to_string(from.join("site.toml")).unwrap();
        assert!(text.contains("seed = 2027\n"), "the site file has its seed");
        let text = text.replace("seed = 2027\n", &format!("seed = 2027\nstart = \"{start}\"\n"));
        // A start takes some tenths of a second, which are minutes here: they are not the outage that
        // the limit is about.
        assert!(text.contains("outage_max = \"15 min\""), "the site file has its limit");
        let text = text.replace("outage_max = \"15 min\"", "outage_max = \"45 min\"");
        fs::write(site.join("site.toml"), text + faults).unwrap();
        let printed = Printed::default();
        let mut rig = Self { folder, speed, daemon: None, printed, printer: None };
        rig.start();
        rig
    }
    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }
    /// Starts the daemon and waits until it answers.
    pub fn start(&mut self) {
        let log = fs::OpenOptions::new().create(true).append(true).open(self.path("log")).unwrap();
        let mut child = Command::new(binary())
            .arg("run")
            .arg(self.path("site"))
            .arg("--state")
            .arg(self.path("state"))
            .args(["--rows", "--speed", &self.speed.to_string()])
            .stdin(Stdio::null())
            .stdout(Stdio::piped())
            .stderr(log)
            .spawn()
            .unwrap();
        let out = child.stdout.take().unwrap();
        let printed = self.printed.clone();
        self.printer = Some(thread::spawn(move || read_rows(out, &printed)));
        self.daemon = Some(child);
        let until = Instant::now() + Duration::from_secs(30);
        while self.now().is_none() {
            assert!(Instant::now() < until, "the daemon does not answer:\n{}", self.log());
            thread::sleep(Duration::from_millis(20));
        }
    }
    pub fn log(&self) -> String {
        fs::read_to_string(self.path("log")).unwrap_or_default()
    }
    fn command(&self, words: &[&str], more: &[&str]) -> Output {
        let mut c = Command::new(binary());
        c.args(words).arg(self.path("site")).arg("--state").arg(self.path("state")).args(more);
        c.output().unwrap()
    }
    /// `None` while nobody answers.
    pub fn now(&self) -> Option<Value> {
        let out = self.command(&["now"], &["--json"]);
        out.status.success().then(|| serde_json::from_slice(&out.stdout).unwrap())
    }
    pub fn order(&self, act: &[&str]) {
        let who = ["--by", "A. Reeve", "--reason", "a rehearsal"];
        let out = self.command(&["order"], &[&who[..], act].concat());
        let said = String::from_utf8_lossy(&out.stderr);
        assert!(out.status.success(), "order {act:?}: {said}");
    }
    /// Cuts the daemon's power: SIGKILL, to this one process.
    pub fn kill_daemon(&mut self) {
        let mut child = self.daemon.take().expect("a daemon runs");
        child.kill().unwrap();
        child.wait().unwrap();
        self.printer.take().unwrap().join().unwrap();
    }
    /// SIGKILL to the adapter that this daemon started.
    pub fn kill_adapter(&self) {
        let daemon = self.daemon.as_ref().expect("a daemon runs").id();
        let pid = child_of(daemon).expect("the daemon has an adapter");
        signal("KILL", pid);
    }
    /// A clean stop.
    pub fn stop(&mut self) {
        let mut child = self.daemon.take().expect("a daemon runs");
        signal("TERM", child.id());
        let status = child.wait().unwrap();
        self.printer.take().unwrap().join().unwrap();
        assert!(status.success(), "a clean stop: {status}\n{}", self.log());
    }
    /// The record holds, and passes through every anchor that the plant was told of.
    pub fn verify(&self) {
        let kept = self.path("state/plant/anchors");
        let kept = kept.to_str().expect("a temporary folder's name is text");
        let out = self.command(&["journal", "verify"], &["--json", "--anchors", kept]);
        let said = String::from_utf8_lossy(&out.stderr);
        assert!(out.status.success(), "journal verify: {said}");
        let found: Value = serde_json::from_slice(&out.stdout).unwrap();
        assert!(found["anchors_kept"].as_u64().unwrap() > 20, "{found}");
        assert!(found["segments"].as_u64().unwrap() > 0, "{found}");
    }
    /// Stamps of the events that the engine was told of, in order: term and sequence.
    pub fn seen(&self, site: &Site) -> Vec<(u64, u64)> {
        let mut seen = Vec::new();
        journal::events(&self.path("state"), &mut |bytes| {
            let (stamp, _) = record::decode_event(bytes, site).unwrap();
            seen.push((stamp.term.0, stamp.seq));
        })
        .unwrap();
        seen
    }
    /// Every row of the evidence: (number, `UTC words`). The view must say the same.
    pub fn rows(&self) -> Vec<(u64, String)> {
        let rows = journal::rows(&self.path("state"), &journal::Filter::default()).unwrap();
        let words = |r: &record::Row| (r.seq, format!("{} {}", r.utc, record::describe(r)));
        let rows: Vec<_> = rows.iter().map(words).collect();
        let out = self.command(&["journal", "query"], &["--json", "--limit", "100000000"]);
        let said = String::from_utf8_lossy(&out.stderr);
        assert!(out.status.success() && said.is_empty(), "journal query: {said}");
        let text = String::from_utf8(out.stdout).unwrap();
        let row = |line: &str| {
            let v: Value = serde_json::from_str(line).unwrap();
            let text = |key: &str| v[key].as_str().unwrap().to_owned();
            (v["seq"].as_u64().unwrap(), format!("{} {}", text("utc"), text("words")))
        };
        assert_eq!(text.lines().map(row).collect::<Vec<_>>(), rows, "the view is not the evidence");
        rows
    }
    pub fn plant_record(&self) -> String {
        fs::read_to_string(self.path("state/plant/plant.jsonl")).unwrap()
    }
}

impl Drop for Rig {
    /// A test that failed leaves no daemon behind; adapter and plant end by themselves.
    fn drop(&mut self) {
        if let Some(mut child) = self.daemon.take() {
            let _ = child.kill();
            let _ = child.wait();
        }
    }
}

/// A line counts as printed when its end has been read.
fn read_rows(out: impl std::io::Read, to: &Printed) {
    let mut reader = BufReader::new(out);
    let mut line = String::new();
    while reader.read_line(&mut line).is_ok_and(|n| n > 0) {
        let whole = line.strip_suffix('\n').and_then(|l| l.strip_prefix("row "));
        if let Some((seq, text)) = whole.and_then(|l| l.split_once(' ')) {
            to.lock().unwrap().push((seq.parse().unwrap(), text.to_owned()));
        }
        line.clear();
    }
}

fn child_of(parent: u32) -> Option<u32> {
    let processes = fs::read_dir("/proc").unwrap().flatten();
    let pids = processes.filter_map(|p| p.file_name().to_str()?.parse::<u32>().ok());
    let is_child = |pid: &u32| {
        let stat = fs::read_to_string(format!("/proc/{pid}/stat")).unwrap_or_default();
        // pid (name) state parent ...
        let after = stat.rsplit_once(')').map_or("", |s| s.1);
        after.split_whitespace().nth(1).and_then(|p| p.parse().ok()) == Some(parent)
    };
    let adapter = |pid: &u32| {
        fs::read_to_string(format!("/proc/{pid}/cmdline"))
            .is_ok_and(|c| c.contains("simulated-adapter"))
    };
    pids.filter(is_child).find(adapter)
}

fn signal(name: &str, pid: u32) {
    let sent = Command::new("kill").args([&format!("-{name}"), &pid.to_string()]).status().unwrap();
    assert!(sent.success(), "kill -{name} {pid}");
}

/// What the plant wrote, in the judge's own types.
pub struct Recorded {
    pub run: Run,
    pub current: Vec<(Utc, f64)>,
}

/// A line that a kill cut off is no record.
pub fn recorded(text: &str, assets: &[String]) -> Recorded {
    let mut all = Recorded { run: Run::default(), current: Vec::new() };
    for line in text.lines() {
        let Ok(v) = serde_json::from_str::<Value>(line) else { continue };
        if let Some(s) = v.get("sample") {
            let sample = sample(s);
            all.current.extend(s["current_m_s"].as_f64().map(|c| (sample.utc, c)));
            all.run.samples.push(sample);
        } else if let Some(e) = v.get("event") {
            let kind = kind(e, assets);
            all.run.events.extend(kind.map(|kind| Event { utc: utc(e), boot: boot(e), kind }));
        }
    }
    all
}

fn utc(v: &Value) -> Utc {
    Utc::from_micros(v["utc_us"].as_i64().unwrap())
}
fn boot(v: &Value) -> Mono {
    Mono::from_nanos(v["boot_ns"].as_u64().unwrap())
}

fn sample(s: &Value) -> Sample {
    let f = |key: &str| s[key].as_f64().unwrap_or_else(|| panic!("{key} in {s}"));
    let pumps = s["pumps_run"].as_array().unwrap();
    Sample {
        utc: utc(s),
        boot: boot(s),
        level_m: f("level_m"),
        outer_m: f("outer_m"),
        gate_percent: f("gate_percent"),
        pumps_run: pumps.iter().map(|p| u32::from(p.as_bool().unwrap())).sum(),
        ports_m3_s: f("ports_m3_s"),
        inflow_m3_s: f("inflow_m3_s"),
        released_m3: f("released_m3"),
        spilled_m3: f("spilled_m3"),
    }
}

fn kind(e: &Value, assets: &[String]) -> Option<EventKind> {
    let asset = || {
        let name = e["asset"].as_str().unwrap();
        assets.iter().position(|a| a == name).unwrap_or_else(|| panic!("no asset {name}"))
    };
    let lease_end = || Mono::from_nanos(e["lease_end_ns"].as_u64().unwrap());
    let jam = e["fault"].as_str() == Some("gate_jam");
    Some(match e["kind"].as_str().unwrap() {
        "drive_received" => EventKind::Driven {
            asset: asset(),
            setting_percent: e["setting_percent"].as_f64().unwrap(),
            lease_end: lease_end(),
        },
        "drive_refused" => EventKind::DriveRefused { asset: asset() },
        "renewed" => EventKind::Renewed { asset: asset(), lease_end: lease_end() },
        "rest_told" => EventKind::RestTold { asset: asset() },
        "rest_begun" => EventKind::RestBegun { asset: asset() },
        "rest_done" => EventKind::RestDone { asset: asset() },
        "protection_stopped" => EventKind::ProtectionStopped { asset: asset() },
        "local_taken" => EventKind::LocalTaken { asset: asset() },
        "local_given" => EventKind::LocalGiven { asset: asset() },
        "fault_begun" if jam => EventKind::JamBegun,
        "fault_ended" if jam => EventKind::JamEnded,
        "ports_flow" => EventKind::PortsFlow,
        "ports_still" => EventKind::PortsStill,
        _ => return None,
    })
}
