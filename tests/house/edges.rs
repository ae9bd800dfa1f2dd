//! Who may depend on whom, over the workspace's own metadata.

use std::collections::{BTreeMap, BTreeSet};
use std::process::Command;

use serde_json::Value;

use super::root;

const PURE: &str = "units model tide structures signals nowcast licence planner interlock engine \
                    plant world oracle";

/// crate: what of ours it may depend on. From the design, with decisions 7 and 8 of DEVELOPERS.md.
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

type Edges = BTreeMap<String, BTreeSet<String>>;

/// Normal dependencies of each workspace member, ours and others'.
fn edges(metadata: &Value) -> Edges {
    let list = |v: &Value, key: &str| v.get(key).and_then(Value::as_array).cloned();
    let text = |v: &Value, key: &str| v.get(key).and_then(Value::as_str).map(str::to_owned);
    let mut edges = Edges::new();
    for package in list(metadata, "packages").expect("packages") {
        let name = text(&package, "name").expect("a name");
        let deps = list(&package, "dependencies").expect("dependencies");
        let normal = deps.iter().filter(|d| d.get("kind").is_none_or(Value::is_null));
        edges.insert(name, normal.filter_map(|d| text(d, "name")).collect());
    }
    edges
}

fn workspace() -> Edges {
    let out = Command::new(std::env::var("CARGO").unwrap_or_else(|_| "cargo".to_owned()))
        .args(["metadata", "--format-version", "1", "--no-deps", "--offline"])
        .current_dir(root())
        .output()
        .expect("cargo runs");
    assert!(out.status.success(), "{}", String::from_utf8_lossy(&out.stderr));
    edges(&serde_json::from_slice(&out.stdout).expect("JSON"))
}

/// Edges that nobody allowed.
fn forbidden(edges: &Edges) -> Vec<String> {
    let ours: BTreeSet<&String> = edges.keys().collect();
    let mut found = Vec::new();
    for (from, to) in edges {
        // The binary wires everything; the tests may see everything.
        if from == "daemon" || from == "tests" {
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

#[test]
fn the_scanner_finds_an_edge_upwards_and_one_outwards() {
    let set = |s: &str| s.split_whitespace().map(str::to_owned).collect::<BTreeSet<_>>();
    let mut edges = Edges::new();
    edges.insert("units".to_owned(), set("planner serde"));
    edges.insert("planner".to_owned(), set("units"));
    assert_eq!(forbidden(&edges), ["units -> planner", "units -> serde (outside)"]);
    assert!(reaches(&edges, "units", "planner"));
}
