//! The rules that an adapter is proven against, on an adapter with nothing behind it.

use std::sync::{Arc, Mutex};

use protocol::{LeaseHolder, Point, PointKind, RestSet};

use super::*;

/// Writes down what it was asked to do.
struct Scribe(Arc<Mutex<Vec<String>>>);

impl Scribe {
    fn note(&self, text: String) {
        self.0.lock().unwrap().push(text);
    }
}

impl Adapter for Scribe {
    fn introduce(&mut self, _: &Introduce, _: BootClock) -> Result<Introduced, String> {
        let close = RestAction::Close;
        let rest = RestSet { lease_out: close, input_end: close, trip: close, stop: close };
        let point = Point {
            id: "gate".to_owned(),
            kind: PointKind::Position,
            unit: "%".to_owned(),
            min: 0.0,
            max: 100.0,
            readable: true,
            drivable: true,
            lease_holder: Some(LeaseHolder::Adapter),
            lease_shortest_ms: Some(1),
            rest: Some(rest),
        };
        let features = vec![protocol::feature::ANCHORS.to_owned()];
        let (name, version) = ("scribe".to_owned(), "1".to_owned());
        Ok(Introduced { name, version, points: vec![point], features })
    }
    fn drive(&mut self, drive: &Drive) -> Result<(), String> {
        self.note(format!("drive {} {}", drive.point, drive.setpoint));
        Ok(())
    }
    fn renew(&mut self, command: u64, _: u64) {
        self.note(format!("renew {command}"));
    }
    fn rest(&mut self, point: &str, _: RestAction, cause: RestCause) {
        self.note(format!("rest {point} {cause:?}"));
    }
    fn anchored(&mut self, anchor: &Anchor) {
        self.note(format!("anchor {}", anchor.anchor));
    }
    fn sense(&mut self, _: &[String]) -> Vec<Reading> {
        Vec::new()
    }
    fn tick(&mut self, _: &mut Outbox) {}
}

const INTRODUCE: &str = r#"{"jsonrpc":"2.0","id":1,"method":"introduce","params":{"version":1,
"features":[],"site":"s","term":5,"session":"x","line_max_bytes":65536,"settings":{}}}"#;

fn drive(id: u64, command: u64, setpoint: f64, term: u64, ahead_ms: i64) -> String {
    let now = BootClock::real().boot_ns() as i64;
    let end = now + ahead_ms * 1_000_000;
    format!(
        r#"{{"jsonrpc":"2.0","id":{id},"method":"drive","params":{{"point":"gate","setpoint":{setpoint},"command":{command},"term":{term},"sequence":1,"expires_boottime_ns":{end}}}}}"#
    )
}

/// Feeds the lines, keeps the input open for `open`, and gives what was done and answered.
fn session(lines: &[String], open: Duration) -> (Vec<String>, Vec<String>) {
    let (reader, mut writer) = std::io::pipe().unwrap();
    let done = Arc::new(Mutex::new(Vec::new()));
    let scribe = Scribe(done.clone());
    let worker = thread::spawn(move || {
        let mut output = Vec::new();
        run_on(scribe, reader, &mut output).unwrap();
        String::from_utf8(output).unwrap()
    });
    for line in lines {
        writer.write_all(line.replace('\n', "").as_bytes()).unwrap();
        writer.write_all(b"\n").unwrap();
    }
    let (_keep, wait) = sync_channel::<()>(0);
    let _ = wait.recv_timeout(open);
    drop(writer);
    let output = worker.join().unwrap();
    let done = done.lock().unwrap().clone();
    (done, output.lines().map(str::to_owned).collect())
}

#[test]
fn nothing_is_driven_before_introduce() {
    let (done, said) = session(&[drive(1, 1, 10.0, 5, 1000)], Duration::ZERO);
    assert!(said[0].contains("-32001"), "{said:?}");
    assert!(done.is_empty());
}

#[test]
fn the_end_of_input_brings_everything_to_rest() {
    let lines = [INTRODUCE.to_owned(), drive(2, 1, 10.0, 5, 60_000)];
    let (done, _) = session(&lines, Duration::ZERO);
    assert_eq!(done, ["drive gate 10", "rest gate InputEnd"]);
}

#[test]
fn a_lease_that_runs_out_brings_its_point_to_rest_untold() {
    let lines = [INTRODUCE.to_owned(), drive(2, 1, 10.0, 5, 60)];
    let (done, _) = session(&lines, Duration::from_millis(300));
    assert_eq!(done, ["drive gate 10", "rest gate LeaseOut", "rest gate InputEnd"]);
}

#[test]
fn the_same_command_twice_is_done_once_and_answered_the_same() {
    let d = drive(2, 1, 10.0, 5, 60_000);
    let (done, said) = session(&[INTRODUCE.to_owned(), d.clone(), d], Duration::ZERO);
    assert_eq!(done.iter().filter(|d| d.starts_with("drive")).count(), 1);
    assert_eq!(said[1], said[2]);
}

#[test]
fn what_must_be_refused_is_refused_and_nothing_moves() {
    let lines = [
        INTRODUCE.to_owned(),
        drive(2, 1, 100.5, 5, 60_000),
        drive(3, 2, 10.0, 4, 60_000),
        drive(4, 3, 10.0, 5, -1),
        drive(5, 4, 10.0, 5, 60_000).replace("gate", "moon"),
        drive(6, 5, 10.0, 5, 60_000).replace("drive", "dance"),
        "garbage".to_owned(),
        "x".repeat(protocol::LINE_MAX + 10),
        drive(7, 6, 20.0, 5, 60_000),
    ];
    let (done, said) = session(&lines, Duration::ZERO);
    for (line, code) in
        said[1..].iter().zip(["-32004", "-32006", "-32005", "-32002", "-32601", "-32700", "-32600"])
    {
        assert!(line.contains(code), "{code} {line}");
    }
    assert_eq!(done, ["drive gate 20", "rest gate InputEnd"]);
}

#[test]
fn an_anchor_is_handed_on_once_introduced_and_needs_no_answer() {
    let anchor = r#"{"jsonrpc":"2.0","method":"anchor","params":{"site":"s","anchor":"7:ab"}}"#;
    let lines = [anchor.to_owned(), INTRODUCE.to_owned(), anchor.to_owned()];
    let (done, answers) = session(&lines, Duration::from_millis(50));
    assert_eq!(done.iter().filter(|d| *d == "anchor 7:ab").count(), 1, "{done:?}");
    assert_eq!(answers.len(), 1, "{answers:?}");
}
