//! Who may depend on whom, over the workspace's own metadata.

use std::collections::{BTreeMap, BTreeSet};
use std::process::Command;

use serde_json::Value;

use super::root;

const PURE: &str = "units model tide structures signals nowcast licence planner interlock engine \
                    plant world oracle";

/// crate: what of ours it may depend on. From the design, with decision 7 of DEVELOPERS.md.
const ALLOWED: &[(&str, &str)] = &[
    ("units", ""),
    ("model", "units"),
    ("tide", "units"),
    ("structures", "units"),
    ("signals", "units model"),
    ("nowcast", "units model tide"),
    ("licence", "units model"),
    ("planner", "units model structures licence"),
    ("interlock", "units"),
    ("engine", "units model signals licence interlock"),
    ("plant", "units structures"),
    ("world", "units model tide structures signals nowcast licence planner interlock engine plant"),
    ("oracle", "units"),
    ("protocol", ""),
    ("sdk", "protocol"),
    ("record", "units model interlock engine"),
    ("journal", "units record"),
    ("host", "protocol units interlock journal"),
    ("site", "units model tide"),
    ("simulated-plant", "plant structures units model tide nowcast site protocol sdk"),
    ("misbehave", ""),
];

/// Outside crates that can read a clock, and who may have them: the processes with a shell round
/// them. `chrono` is for zone rules, so its `clock` and `now` features stay off.
const CLOCKED: &str = "chrono jiff libc nix quanta rustix time";
const MAY_BE_CLOCKED: &str = "daemon host journal sdk simulated-plant";

type Edges = BTreeMap<String, BTreeSet<String>>;

/// What each workspace member is built from, ours and others'; what only its tests need is apart.
fn edges(metadata: &Value) -> Edges {
    let list = |v: &Value, key: &str| v.get(key).and_then(Value::as_array).cloned();
    let text = |v: &Value, key: &str| v.get(key).and_then(Value::as_str).map(str::to_owned);
    let mut edges = Edges::new();
    for package in list(metadata, "packages").expect("packages") {
        let name = text(&package, "name").expect("a name");
        let deps = list(&package, "dependencies").expect("dependencies");
        let normal = deps.iter().filter(|d| text(d, "kind").as_deref() != Some("dev"));
        edges.insert(name, normal.filter_map(|d| text(d, "name")).collect());
    }
    edges
}

fn metadata() -> Value {
    let out = Command::new(std::env::var("CARGO").unwrap_or_else(|_| "cargo".to_owned()))
        .args(["metadata", "--format-version", "1", "--no-deps", "--offline"])
        .current_dir(root())
        .output()
        .expect("cargo runs");
    assert!(out.status.success(), "{}", String::from_utf8_lossy(&out.stderr));
    serde_json::from_slice(&out.stdout).expect("JSON")
}

fn workspace() -> Edges {
    edges(&metadata())
}

/// Edges that nobody allowed.
fn forbidden(edges: &Edges) -> Vec<String> {
    let ours: BTreeSet<&String> = edges.keys().collect();
    let mut found = Vec::new();
    for (from, to) in edges {
        // The judge is for tests alone; the binary wires everything else.
        if from == "tests" {
            continue;
        }
        if from == "daemon" {
            found.extend(to.contains("oracle").then(|| format!("{from} -> oracle")));
            continue;
        }
        let allowed = ALLOWED.iter().find(|(name, _)| name == from).map(|(_, to)| *to);
        let Some(allowed) = allowed else {
            found.push(format!("{from} is not in the table"));
            continue;
        };
        let may: BTreeSet<&str> = allowed.split_whitespace().collect();
        found.extend(
            to.iter()
                .filter(|d| ours.contains(d) && !may.contains(d.as_str()))
                .map(|d| format!("{from} -> {d}")),
        );
        if PURE.split_whitespace().any(|p| p == from) {
            let outside = to.iter().filter(|d| !ours.contains(d) && *d != "libm");
            found.extend(outside.map(|d| format!("{from} -> {d} (outside)")));
        }
    }
    found
}

fn reaches(edges: &Edges, from: &str, to: &str) -> bool {
    let next = edges.get(from).into_iter().flatten();
    next.into_iter().any(|d| d == to || reaches(edges, d, to))
}

#[test]
fn dependencies_point_downwards_only() {
    let edges = workspace();
    assert_eq!(forbidden(&edges), Vec::<String>::new());
    assert_eq!(edges["interlock"].iter().collect::<Vec<_>>(), ["units"]);
}

#[test]
fn a_planner_cannot_move_a_gate() {
    let edges = workspace();
    for target in ["host", "protocol", "sdk", "interlock"] {
        assert!(!reaches(&edges, "planner", target), "planner reaches {target}");
    }
    assert!(!reaches(&edges, "engine", "planner"), "the engine knows the planner");
}

/// Crates that could read a clock and may not.
fn clocked(edges: &Edges) -> Vec<String> {
    let may: BTreeSet<&str> = MAY_BE_CLOCKED.split_whitespace().collect();
    let mut found = Vec::new();
    for (from, to) in edges.iter().filter(|(from, _)| !may.contains(from.as_str())) {
        let can = CLOCKED.split_whitespace().filter(|c| to.contains(*c));
        let zones_only = |c: &&str| from == "site" && *c == "chrono";
        found.extend(can.filter(|c| !zones_only(c)).map(|c| format!("{from} -> {c}")));
    }
    found
}

#[test]
fn no_crate_can_read_a_clock_that_has_no_business_with_one() {
    assert_eq!(clocked(&workspace()), Vec::<String>::new());
    let metadata = metadata();
    let packages = metadata["packages"].as_array().unwrap().iter();
    let all = packages.flat_map(|p| p["dependencies"].as_array().unwrap());
    for chrono in all.filter(|d| d["name"] == "chrono") {
        assert_eq!(chrono["uses_default_features"], false);
        let features = chrono["features"].as_array().unwrap();
        assert!(!features.iter().any(|f| f == "clock" || f == "now"), "{features:?}");
    }
    let mut edges = Edges::new();
    edges.insert("engine".to_owned(), BTreeSet::from(["rustix".to_owned()]));
    assert_eq!(clocked(&edges), ["engine -> rustix"]);
}

#[test]
fn the_scanner_finds_an_edge_upwards_and_one_outwards() {
    let set = |s: &str| s.split_whitespace().map(str::to_owned).collect::<BTreeSet<_>>();
    let mut edges = Edges::new();
    edges.insert("units".to_owned(), set("planner serde"));
    edges.insert("planner".to_owned(), set("units"));
    assert_eq!(forbidden(&edges), ["units -> planner", "units -> serde (outside)"]);
    assert!(reaches(&edges, "units", "planner"));
    edges.clear();
    edges.insert("daemon".to_owned(), set("engine oracle"));
    edges.insert("newcomer".to_owned(), set(""));
    assert_eq!(forbidden(&edges), ["daemon -> oracle", "newcomer is not in the table"]);
}

#[test]
fn an_edge_of_a_build_script_counts_and_one_of_tests_does_not() {
    let dependency = |name: &str, kind: Value| serde_json::json!({ "name": name, "kind": kind });
    let found = edges(&serde_json::json!({ "packages": [{ "name": "tide", "dependencies": [
        dependency("units", Value::Null),
        dependency("host", "build".into()),
        dependency("proptest", "dev".into()),
    ] }] }));
    assert_eq!(found["tide"].iter().collect::<Vec<_>>(), ["host", "units"]);
}
