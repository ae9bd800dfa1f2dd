//! Adapter and plant as real processes, spoken to over the adapter protocol as the daemon does it.
//! What is judged is the plant's own record on disk.
#![allow(clippy::unwrap_used, reason = "a test stops where an assumption breaks")]

mod common;

use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};

use sdk::protocol::{Drive, Introduced, LeaseHolder, Renew, RenewOne, Sensed, method, request};
use serde_json::{Value, json};
use simulated_plant::ClockMap;
use units::Span;

use common::{Folder, boot_ns, events, fast, site};

/// An adapter process and the two ends of its pipes.
struct Adapter {
    child: Child,
    input: Option<ChildStdin>,
    output: BufReader<ChildStdout>,
    next_id: u64,
    /// Readings that came unasked.
    pushed: Vec<Sensed>,
}

impl Drop for Adapter {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

const PROGRAM: &str = env!("CARGO_BIN_EXE_simulated-plant");

impl Adapter {
    fn start() -> Self {
        let mut c = Command::new(PROGRAM);
        c.arg("adapter").env_clear().stdin(Stdio::piped()).stdout(Stdio::piped());
        let mut child = c.spawn().unwrap();
        let (input, output) = (child.stdin.take(), child.stdout.take().unwrap());
        Self { child, input, output: BufReader::new(output), next_id: 1, pushed: Vec::new() }
    }
    fn introduced(folder: &Path, clock: &ClockMap, term: u64) -> (Self, Introduced) {
        let mut adapter = Self::start();
        let numbers = [
            clock.real_boot_origin_ns.to_string(),
            clock.sim_boot_origin_ns.to_string(),
            clock.sim_utc_origin_us.to_string(),
            clock.speed.to_string(),
        ];
        let mut args = vec!["plant".to_owned(), site().display().to_string()];
        args.push(folder.display().to_string());
        args.extend(numbers.clone());
        let [real_boot, sim_boot, sim_utc, speed] = numbers;
        let answer = adapter.call(
            method::INTRODUCE,
            &json!({"version": 1, "features": [], "site": "tarrow-works", "term": term,
            "session": "s", "line_max_bytes": 65536, "settings": {
                "plant_folder": folder, "plant_program": PROGRAM,
                "plant_args": serde_json::to_string(&args).unwrap(),
                "clock_real_boot_origin_ns": real_boot, "clock_sim_boot_origin_ns": sim_boot,
                "clock_sim_utc_origin_us": sim_utc, "clock_speed": speed,
            }}),
        );
        (adapter, serde_json::from_value(answer.unwrap()).unwrap())
    }
    /// Sends a request and reads on to its answer.
    fn call(&mut self, name: &str, params: &impl serde::Serialize) -> Result<Value, Value> {
        let id = self.next_id;
        self.next_id += 1;
        let line = request(id, name, params).unwrap();
        self.input.as_mut().unwrap().write_all(line.as_bytes()).unwrap();
        loop {
            let message = self.line();
            if message["id"] == id {
                let error = message.get("error").cloned();
                return error.map_or_else(|| Ok(message["result"].clone()), Err);
            }
        }
    }
    /// The next line; readings that come unasked are kept.
    fn line(&mut self) -> Value {
        let mut line = String::new();
        assert!(self.output.read_line(&mut line).unwrap() > 0, "the adapter has gone");
        let message: Value = serde_json::from_str(&line).unwrap();
        if message["method"] == method::READING {
            self.pushed.push(serde_json::from_value(message["params"].clone()).unwrap());
        }
        message
    }
    fn drive(
        &mut self,
        clock: &ClockMap,
        command: u64,
        percent: f64,
    ) -> (u64, Result<Value, Value>) {
        let end = (clock.now().1 + Span::seconds(120)).as_nanos();
        let drive = Drive {
            point: "penstock".to_owned(),
            setpoint: percent,
            command,
            term: 1,
            sequence: command,
            expires_boottime_ns: end,
        };
        (end, self.call(method::DRIVE, &drive))
    }
    fn position(&mut self) -> f64 {
        let answer = self.call(method::SENSE, &json!({"points": ["penstock-position"]})).unwrap();
        let sensed: Sensed = serde_json::from_value(answer).unwrap();
        assert_eq!(sensed.readings.len(), 1);
        sensed.readings[0].value
    }
    fn until_shut(&mut self) {
        assert!((0..200_000).any(|_| self.position() == 0.0), "it never shut");
    }
    /// Ends its input and waits for it.
    fn end_of_input(&mut self) {
        self.input = None;
        assert!(self.child.wait().unwrap().success());
    }
}

/// Tells the plant to end, through one more adapter, so that no process is left behind.
fn tidy(folder: &Path, clock: &ClockMap) {
    let (mut adapter, _) = Adapter::introduced(folder, clock, 9);
    adapter.call(method::FINISH, &Value::Null).unwrap();
    assert!(adapter.child.wait().unwrap().success());
    // The plant takes its socket away when it ends.
    let socket = folder.join(simulated_plant::SOCKET);
    let real = ClockMap::real();
    let until = real.now().1 + Span::seconds(20);
    while socket.exists() {
        assert!(real.now().1 < until, "the plant does not end");
        std::thread::yield_now();
    }
}

/// The rest that follows a lease's end: begun within the lease, done within lease + stroke.
fn judge_rest(folder: &Path, command: u64, lease_end_ns: u64) {
    let out = events(folder, "lease_out");
    let out = out.iter().find(|e| e["command"] == command).unwrap();
    assert_eq!(out["lease_end_ns"], lease_end_ns);
    let after = |kind: &str, from: u64| {
        let all = events(folder, kind);
        let found = all.iter().find(|e| e["asset"] == "penstock" && boot_ns(e) >= from);
        boot_ns(found.unwrap())
    };
    let begun = after("rest_begun", boot_ns(out));
    assert!(begun <= lease_end_ns, "rest begun {begun} after the lease's end {lease_end_ns}");
    assert!(after("rest_done", begun) <= lease_end_ns + 480_000_000_000, "within lease + stroke");
}

#[test]
fn fault_a_lease_that_nobody_renews_ends_in_the_device() {
    let folder = Folder::new("adapter-lease");
    let clock = fast(600);
    let (mut adapter, introduced) = Adapter::introduced(&folder.0, &clock, 1);
    let penstock = introduced.points.iter().find(|p| p.id == "penstock").unwrap();
    assert_eq!(penstock.lease_holder, Some(LeaseHolder::Device));
    assert_eq!(introduced.points.iter().filter(|p| p.drivable).count(), 3);
    let (_, done) = adapter.drive(&clock, 7, 40.0);
    assert_eq!(done, Ok(Value::Null));
    // Renewed once, to twice as long; then left alone.
    let end = (clock.now().1 + Span::seconds(240)).as_nanos();
    let renew = Renew { commands: vec![RenewOne { command: 7, expires_boottime_ns: end }] };
    adapter.call(method::RENEW, &renew).unwrap();
    assert!((0..200_000).any(|_| adapter.position() > 30.0), "it opens");
    adapter.until_shut();
    judge_rest(&folder.0, 7, end);
    assert!(adapter.pushed.len() > 5, "readings come unasked");
    let stamps: Vec<i64> = adapter.pushed.iter().map(|s| s.readings[0].time_utc_us).collect();
    assert!(stamps.windows(2).all(|w| w[1] - w[0] >= 12_000_000), "20 ms real at 600 times");
    let (_, refused) = adapter.drive(&clock, 8, 101.0);
    assert_eq!(refused.unwrap_err()["code"], -32004);
    drop(adapter);
    tidy(&folder.0, &clock);
}

#[test]
fn fault_a_killed_adapter_leaves_the_plant_and_its_lease() {
    let folder = Folder::new("adapter-killed");
    let clock = fast(600);
    let (mut adapter, _) = Adapter::introduced(&folder.0, &clock, 1);
    let (end, done) = adapter.drive(&clock, 3, 60.0);
    done.unwrap();
    drop(adapter);
    let (mut next, _) = Adapter::introduced(&folder.0, &clock, 2);
    let text = std::fs::read_to_string(folder.0.join("plant.jsonl")).unwrap();
    assert_eq!(text.matches("\"begin\"").count(), 1, "the same plant, not a new one");
    next.until_shut();
    judge_rest(&folder.0, 3, end);
    drop(next);
    tidy(&folder.0, &clock);
}

#[test]
fn fault_the_end_of_input_rests_everything_and_keeps_the_plant() {
    let folder = Folder::new("adapter-input");
    let clock = fast(60);
    let (mut adapter, _) = Adapter::introduced(&folder.0, &clock, 1);
    let (end, done) = adapter.drive(&clock, 5, 60.0);
    done.unwrap();
    adapter.end_of_input();
    let told = events(&folder.0, "rest_told");
    let told = told.iter().rfind(|e| e["asset"] == "penstock").unwrap();
    assert_eq!(told["why"], "end of the adapter's input");
    assert!(boot_ns(told) < end, "long before its lease");
    assert!(folder.0.join(simulated_plant::SOCKET).exists(), "the plant lives on");
    tidy(&folder.0, &clock);
}

#[test]
fn fault_a_killed_plant_is_started_again_by_its_adapter() {
    let folder = Folder::new("adapter-plant");
    let clock = fast(600);
    let (mut adapter, _) = Adapter::introduced(&folder.0, &clock, 1);
    // The plant ends behind the adapter's back, as if it had died.
    let mut line = std::os::unix::net::UnixStream::connect(folder.0.join("plant.socket")).unwrap();
    line.write_all(b"{\"ask\":\"finish\"}\n").unwrap();
    let mut answer = String::new();
    BufReader::new(&line).read_line(&mut answer).unwrap();
    drop(line);
    assert!((0..2_000_000).any(|_| !folder.0.join("plant.socket").exists()));
    let (_, done) = adapter.drive(&clock, 4, 20.0);
    assert_eq!(done, Ok(Value::Null));
    let text = std::fs::read_to_string(folder.0.join("plant.jsonl")).unwrap();
    assert_eq!(text.matches("\"resumed\":true").count(), 1);
    assert!((0..200_000).any(|_| adapter.position() > 10.0), "and it moves");
    drop(adapter);
    tidy(&folder.0, &clock);
}

#[test]
fn fault_settings_that_are_missing_are_named() {
    let mut adapter = Adapter::start();
    let answer = adapter.call(
        method::INTRODUCE,
        &json!({"version": 1, "features": [], "site": "x", "term": 1, "session": "s",
            "line_max_bytes": 65536, "settings": {"plant_folder": "/nowhere"}}),
    );
    let message = answer.unwrap_err()["message"].as_str().unwrap().to_owned();
    assert!(message.contains("plant_args"), "{message}");
}
