//! Time is an argument: these files read a clock, and no others.

use super::{is_test, sources, without_tests};

/// The daemon's clock; the SDK's and the plant's, as processes of their own; the host's back-off.
const READ_A_CLOCK: &[&str] = &[
    "crates/daemon/src/clock.rs",
    "crates/host/src/supervisor.rs",
    "crates/sdk/src/clock.rs",
    "plugins/simulated-plant/src/clock.rs",
];

const SIGNS: &[&str] = &[
    "SystemTime::now",
    "Instant::now",
    ".elapsed()",
    "clock_gettime",
    "gettimeofday",
    "ClockId::",
    "Clock::now",
    "Utc::now",
    "Local::now",
    "/proc/uptime",
];

fn reads_a_clock(text: &str) -> bool {
    text.lines()
        .filter(|l| !l.trim_start().starts_with("//"))
        .any(|l| SIGNS.iter().any(|s| l.contains(s)))
}

#[test]
fn only_the_clock_files_read_a_clock() {
    let code = sources(&[".rs"]).into_iter().filter(|(p, _)| !is_test(p));
    let found: Vec<String> =
        code.filter(|(_, t)| reads_a_clock(&without_tests(t))).map(|(p, _)| p).collect();
    assert_eq!(found, READ_A_CLOCK);
}

#[test]
fn the_scanner_finds_a_clock_and_not_a_comment() {
    assert!(reads_a_clock("let t = std::time::Instant::now();"));
    assert!(reads_a_clock("if began.elapsed() > limit {"));
    assert!(!reads_a_clock("// never call Instant::now here"));
    for sign in SIGNS {
        assert!(reads_a_clock(&format!("    let t = {sign};")), "{sign}");
    }
}
