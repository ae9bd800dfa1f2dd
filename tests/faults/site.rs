//! A wrong site is refused whole, and each fault says its file, line, value, rule and remedy.

use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};

use site::{Fault, Report};
use tempfile::TempDir;

use super::site_rows::{ROWS, Wrong};

/// A folder of this repository.
pub fn folder(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("..").join(path)
}

fn tarrow() -> PathBuf {
    folder("deploy/sites/tarrow-works")
}

/// A copy of the good site with changes, each of a text that stands there at least once.
pub fn changed(changes: &[(&str, &str, &str)]) -> TempDir {
    let dir = tempfile::tempdir().expect("a temporary folder");
    for file in ["site.toml", "licence.toml"] {
        let mut text = fs::read_to_string(tarrow().join(file)).expect("the good site");
        for (_, find, replace) in changes.iter().filter(|c| c.0 == file) {
            assert!(text.contains(find), "{find:?} does not stand in {file}");
            text = text.replacen(find, replace, 1);
        }
        fs::write(dir.path().join(file), text).expect("a file in a temporary folder");
    }
    dir
}

fn refused(dir: &Path) -> Report {
    match site::load(dir) {
        Ok(site) => panic!("a wrong {} must not load", site.name),
        Err(report) => report,
    }
}

/// What is wrong with the report on this row: all five parts, and the text form of them.
fn misses(row: &Wrong, dir: &Path, report: &Report) -> Vec<String> {
    let [fault] = &report.faults[..] else {
        return vec![format!("one fault was expected:\n{report}")];
    };
    let path = dir.join(row.file);
    let text = fs::read_to_string(&path).expect("the changed file");
    let line = text.lines().nth(fault.line - 1).unwrap_or_default();
    let place: String = line.chars().skip(fault.column - 1).collect();
    // Something missing has no text, and a fault of grammar shows its whole line.
    let in_place = match fault.code {
        "S002" => line.contains(&fault.value),
        _ => fault.value == "(nothing)" || place.starts_with(&fault.value),
    };
    let parts = [
        ("code", fault.code == row.code),
        ("file", Path::new(&fault.file) == path),
        ("line", line.starts_with(row.line)),
        ("column", in_place),
        ("value", fault.value == row.value),
        ("rule", fault.rule.contains(row.rule)),
        ("remedy", fault.remedy.contains(row.remedy)),
        ("text", text_has_all(fault, &report.to_string())),
    ];
    parts.iter().filter(|p| !p.1).map(|p| format!("{}: {fault:?}\n{report}", p.0)).collect()
}

/// Whether the form for people has the same five parts, and a caret.
fn text_has_all(fault: &Fault, text: &str) -> bool {
    let place = format!("{}:{}:{}", fault.file, fault.line, fault.column);
    let parts = [fault.code, place.as_str(), fault.rule.as_str(), fault.remedy.as_str(), "^"];
    let value = fault.value == "(nothing)" || text.contains(&fault.value);
    value && parts.iter().all(|part| text.contains(part))
}

#[test]
fn fault_site_each_wrong_file_is_refused_with_all_five_parts() {
    let mut wrong = Vec::new();
    for row in ROWS {
        let dir = changed(&[(row.file, row.find, row.replace)]);
        let missed = misses(row, dir.path(), &refused(dir.path()));
        wrong.extend(missed.into_iter().map(|m| format!("{}: {m}", row.name)));
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n\n"));
    let codes: BTreeSet<_> = ROWS.iter().map(|r| r.code).collect();
    assert!(ROWS.len() >= 60 && codes.len() >= 40, "{} rows, {codes:?}", ROWS.len());
}

#[test]
fn fault_site_every_code_has_a_row_or_a_test_of_its_own() {
    // S001 and L009 need more than one change of text; N codes refuse nothing.
    let elsewhere = ["S001", "L009"];
    let with_row: BTreeSet<_> = ROWS.iter().map(|r| r.code).collect();
    for e in site::explanations().filter(|e| !e.code.starts_with('N')) {
        assert!(with_row.contains(e.code) != elsewhere.contains(&e.code), "{}", e.code);
    }
}

#[test]
fn fault_site_all_faults_of_both_files_come_at_once_in_order() {
    let dir = changed(&[
        ("site.toml", "\"6.60 m HD\"  #", "\"6.60 m\"  #"),
        ("site.toml", "gate = \"penstock\"", "gate = \"penstok\""),
        ("site.toml", "stroke = \"8 min\"", "stroke = \"8\""),
        ("licence.toml", "from = \"+0:30\"", "from = \"0:30\""),
        (
            "licence.toml",
            "words = \"There shall be a release only",
            "wrods = \"There shall be a release only",
        ),
    ]);
    let report = refused(dir.path());
    let codes: Vec<_> = report.faults.iter().map(|f| f.code).collect();
    assert_eq!(codes, ["S012", "S010", "S014", "S016", "L006", "S005"], "{report}");
    assert!(report.to_string().contains("6 faults; the site is refused whole"));
}

#[test]
fn fault_site_format_must_come_first() {
    let dir = changed(&[
        ("site.toml", "format = 1\n", ""),
        ("site.toml", "zone = \"Europe/London\" ", "zone = \"Europe/London\"\nformat = 1 "),
    ]);
    let report = refused(dir.path());
    assert_eq!(report.faults.len(), 1, "{report}");
    assert_eq!((report.faults[0].code, report.faults[0].value.as_str()), ("S003", "1"));
}

#[test]
fn fault_site_a_current_clause_needs_current_figures() {
    let text = fs::read_to_string(tarrow().join("site.toml")).unwrap();
    let start = text.find("[places.differences.current]").unwrap();
    let end = text[start..].find("# ---").unwrap() + start;
    let dir = changed(&[("site.toml", &text[start..end], "")]);
    let report = refused(dir.path());
    assert_eq!(report.faults.len(), 1, "{report}");
    let fault = &report.faults[0];
    assert_eq!((fault.code, fault.value.as_str()), ("L009", "\"tarrow-outfall\""));
    assert!(fault.file.ends_with("licence.toml"));
}

#[test]
fn fault_site_files_that_are_not_there_or_not_text() {
    let dir = tempfile::tempdir().unwrap();
    let report = refused(dir.path());
    let codes: Vec<_> = report.faults.iter().map(|f| f.code).collect();
    assert_eq!(codes, ["S001", "S001"], "{report}");
    assert!(report.to_string().contains("licence.toml"));

    let half = changed(&[]);
    fs::write(half.path().join("licence.toml"), [0xff, 0xfe, 0x00]).unwrap();
    let report = refused(half.path());
    assert_eq!(report.faults.len(), 1, "{report}");
    assert_eq!((report.faults[0].code, report.faults[0].line), ("S001", 1));

    fs::write(half.path().join("licence.toml"), vec![b'#'; (1 << 18) + 1]).unwrap();
    assert!(refused(half.path()).faults[0].rule.contains("larger than"));
}

#[test]
fn fault_site_no_line_can_be_lost_unnoticed() {
    // Any one line with a key taken out: either the site is refused, or the key is one of the few
    // that are optional.
    let optional = [
        "gauge",
        "rate_max",
        "flow_signal",
        "outer_signal",
        "local",
        "heartbeat_file",
        "segments_for",
        "backup_to",
        "backups",
        "autumn",
        "journal_grace",
        "outage_max",
        "ramp_max_per_min",
        "ammonia",
        "analyser-check-age",
        "sampler-ready",
        "\"Port Ansel CD\"",
        "\"Tarrow gauge\"",
    ];
    let mut tried = 0;
    for file in ["site.toml", "licence.toml"] {
        let text = fs::read_to_string(tarrow().join(file)).unwrap();
        let lines: Vec<&str> = text.lines().collect();
        for (i, line) in lines.iter().enumerate() {
            let Some((key, _)) = line.split_once('=') else { continue };
            if line.starts_with('#') || optional.contains(&key.trim()) || line.starts_with("  {") {
                continue;
            }
            let dir = changed(&[]);
            let mut rest = lines.clone();
            rest.remove(i);
            fs::write(dir.path().join(file), rest.join("\n")).unwrap();
            assert!(site::load(dir.path()).is_err(), "{file} loads without {line:?}");
            tried += 1;
        }
    }
    assert!(tried > 150, "{tried}");
}

#[test]
fn fault_site_a_torn_file_is_refused() {
    for file in ["site.toml", "licence.toml"] {
        let text = fs::read_to_string(tarrow().join(file)).unwrap();
        // What follows the level of the simulation is optional; a licence has no optional end.
        let end = text.find("level_start = ").unwrap_or(text.trim_end().len());
        for cut in (0..end).step_by(61) {
            let dir = changed(&[]);
            fs::write(dir.path().join(file), &text.as_bytes()[..cut]).unwrap();
            let report = refused(dir.path());
            assert!(!report.faults.is_empty() && !report.to_string().is_empty());
        }
    }
}

#[test]
fn fault_site_a_licence_that_lost_whole_clauses_is_refused() {
    let text = fs::read_to_string(tarrow().join("licence.toml")).unwrap();
    let starts: Vec<usize> = text.match_indices("[[clauses]]").map(|m| m.0).collect();
    for (n, start) in starts.iter().enumerate().skip(1) {
        let dir = changed(&[]);
        fs::write(dir.path().join("licence.toml"), &text[..*start]).unwrap();
        let report = refused(dir.path());
        assert_eq!(report.faults.len(), 1, "{report}");
        let fault = &report.faults[0];
        assert_eq!((fault.code, fault.value.as_str()), ("L011", "8"));
        assert!(fault.rule.contains(&format!("has {n}")), "{}", fault.rule);
    }
}

/// A small generator with its seed in the open: xorshift, so that a failure can be repeated.
struct Random(u64);

impl Random {
    fn below(&mut self, n: usize) -> usize {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 % n as u64) as usize
    }
}

#[test]
fn fault_site_random_damage_never_panics_and_every_fault_has_a_place() {
    let mut random = Random(20_270_301);
    let scraps =
        ["\"", "=", "[", "}", "\n", "\u{e9}", "\u{1f30a}", "-", "9", " m", "nan", "'''", "#"];
    let (mut refused, mut loaded) = (0, 0);
    for round in 0..600 {
        let dir = changed(&[]);
        let file = ["site.toml", "licence.toml"][round % 2];
        let mut text: Vec<char> =
            fs::read_to_string(tarrow().join(file)).unwrap().chars().collect();
        for _ in 0..=random.below(3) {
            let at = random.below(text.len());
            let gone = random.below(6).min(text.len() - at);
            let scrap = scraps[random.below(scraps.len())];
            text.splice(at..at + gone, scrap.chars());
        }
        let text: String = text.into_iter().collect();
        fs::write(dir.path().join(file), &text).unwrap();
        let Err(report) = site::load(dir.path()) else {
            loaded += 1;
            continue;
        };
        refused += 1;
        assert!(!report.to_string().is_empty());
        let lines = text.lines().count() + 1;
        for f in &report.faults {
            assert!(!f.file.ends_with(file) || f.line <= lines, "round {round}: {f:?}");
            let empty = f.rule.is_empty() || f.remedy.is_empty() || f.value.is_empty();
            assert!(!empty, "round {round}: {f:?}");
        }
    }
    // Some damage falls into a comment; most does not.
    assert!(refused > 250 && loaded > 20, "{refused} refused, {loaded} loaded");
}

#[test]
fn fault_site_a_file_of_wrong_lines_is_still_reported() {
    let dir = changed(&[]);
    let good = fs::read_to_string(tarrow().join("site.toml")).unwrap();
    let many = "[[assets]]\n".repeat(2_000);
    fs::write(dir.path().join("site.toml"), format!("{good}{many}")).unwrap();
    let report = refused(dir.path());
    assert!(report.faults.len() > 2_000);
    assert!(report.to_string().contains("... and "));
}
