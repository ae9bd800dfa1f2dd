//! The plant as a real process: leases, a kill, a restart, a finish. What is judged is the plant's
//! own record on disk.
#![allow(clippy::unwrap_used, reason = "a test stops where an assumption breaks")]

mod common;

use std::io::{BufRead, BufReader, Write};
use std::os::unix::net::UnixStream;
use std::path::Path;
use std::process::{Child, Command, Stdio};

use serde_json::{Value, json};
use simulated_plant::{ClockMap, SOCKET};
use units::Span;

use common::{Folder, boot_ns, events, fast, site};

/// A plant process that is killed when the test is over, however it ends.
struct Plant {
    child: Child,
    asks: BufReader<UnixStream>,
}

impl Drop for Plant {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

fn command(folder: &Path, clock: &ClockMap) -> Command {
    let numbers = [
        clock.real_boot_origin_ns.to_string(),
        clock.sim_boot_origin_ns.to_string(),
        clock.sim_utc_origin_us.to_string(),
        clock.speed.to_string(),
    ];
    let mut c = Command::new(env!("CARGO_BIN_EXE_simulated-plant"));
    c.arg("plant").arg(site()).arg(folder).args(numbers).stdout(Stdio::piped());
    c
}

impl Plant {
    fn start(folder: &Path, clock: &ClockMap) -> Self {
        let mut child = command(folder, clock).spawn().unwrap();
        let mut ready = String::new();
        BufReader::new(child.stdout.take().unwrap()).read_line(&mut ready).unwrap();
        assert_eq!(ready.trim_end(), "the simulated plant is ready");
        let stream = UnixStream::connect(folder.join(SOCKET)).unwrap();
        Self { child, asks: BufReader::new(stream) }
    }
    fn ask(&mut self, ask: &Value) -> Value {
        let mut out = self.asks.get_ref();
        out.write_all(format!("{ask}\n").as_bytes()).unwrap();
        let mut line = String::new();
        self.asks.read_line(&mut line).unwrap();
        serde_json::from_str(&line).unwrap()
    }
    fn reading(&mut self, point: &str) -> f64 {
        let all = self.ask(&json!({"ask": "sense"}));
        let list = all["list"].as_array().unwrap();
        list.iter().find(|v| v["point"] == point).unwrap()["value"].as_f64().unwrap()
    }
    /// Asks for readings until they satisfy `done`; at 600 times real time this is seconds.
    fn until(&mut self, point: &str, done: impl Fn(f64) -> bool) -> f64 {
        for _ in 0..200_000 {
            let value = self.reading(point);
            if done(value) {
                return value;
            }
        }
        panic!("{point} never came to what was awaited");
    }
    fn drive(&mut self, clock: &ClockMap, percent: f64, lease: Span) -> (u64, Value) {
        let end = (clock.now().1 + lease).as_nanos();
        let answer = self.ask(&json!({"ask": "drive", "point": "penstock", "command": 7,
            "setting_percent": percent, "lease_end_ns": end}));
        (end, answer)
    }
}

#[test]
fn fault_nobody_renews_and_the_device_rests_within_its_lease() {
    let folder = Folder::new("lease");
    let clock = fast(600);
    let mut plant = Plant::start(&folder.0, &clock);
    let (end, answer) = plant.drive(&clock, 60.0, Span::seconds(120));
    assert_eq!(answer, json!({"answer": "done"}));
    plant.until("penstock-position", |p| p > 10.0);
    plant.until("penstock-position", |p| p == 0.0);
    let out = events(&folder.0, "lease_out");
    assert_eq!((out.len(), out[0]["command"].as_u64()), (1, Some(7)));
    let begun = events(&folder.0, "rest_begun");
    let begun = begun.iter().find(|e| boot_ns(e) >= boot_ns(&out[0])).unwrap();
    assert!(boot_ns(begun) <= end, "rest begun within the lease");
    let done = events(&folder.0, "rest_done");
    let done = done.iter().find(|e| boot_ns(e) >= boot_ns(begun)).unwrap();
    assert!(boot_ns(done) <= end + 480_000_000_000, "rest done within lease + stroke");
}

#[test]
fn fault_a_killed_plant_goes_on_with_its_water_and_shuts() {
    let folder = Folder::new("killed");
    let clock = fast(600);
    let mut plant = Plant::start(&folder.0, &clock);
    let before = plant.reading("lagoon-level-a");
    assert!((before - 5.2).abs() < 0.02, "as the site file begins: {before}");
    plant.drive(&clock, 100.0, Span::hours(3));
    plant.until("lagoon-level-a", |level| level < before - 0.05);
    let second = command(&folder.0, &clock).stderr(Stdio::piped()).output().unwrap();
    assert_eq!(second.status.code(), Some(4));
    assert!(String::from_utf8_lossy(&second.stderr).contains("already works"));
    let level = plant.reading("lagoon-level-a");
    drop(plant);
    let mut again = Plant::start(&folder.0, &clock);
    let after = again.reading("lagoon-level-a");
    assert!((after - level).abs() < 0.12, "{level} before the kill, {after} after");
    again.until("penstock-position", |p| p == 0.0);
    let (_, refused) = again.drive(&clock, 101.0, Span::hours(1));
    assert_eq!(refused["answer"], "refused");
    assert_eq!(again.ask(&json!({"ask": "finish"})), json!({"answer": "done"}));
    assert!(again.child.wait().unwrap().success());
    assert!(!folder.0.join(SOCKET).exists());
}

#[test]
fn fault_garbage_on_the_socket_moves_nothing_and_harms_nobody() {
    let folder = Folder::new("garbage");
    let clock = fast(1);
    let mut plant = Plant::start(&folder.0, &clock);
    let nonsense = [
        json!({"ask": "drive", "point": "penstock"}),
        json!({"ask": "drive", "point": "no-such", "command": 1, "setting_percent": 50.0,
            "lease_end_ns": u64::MAX}),
        json!(["ask", "sense"]),
        json!({"ask": "explode"}),
    ];
    for n in nonsense {
        assert_eq!(plant.ask(&n)["answer"], "refused", "{n}");
    }
    // A line without end closes its own connection only.
    let mut long = UnixStream::connect(folder.0.join(SOCKET)).unwrap();
    let _ = long.write_all(&vec![b'x'; 200_000]);
    assert_eq!(plant.reading("penstock-position"), 0.0);
    assert!(events(&folder.0, "drive_received").is_empty());
}
