//! Real processes with a fast clock, killed while an asset moves: nothing acknowledged is lost, and
//! the plant's own record shows no rule broken.
//!
//! The short form is two simulated days. With TIDEREEVE_LONG=1 it is thirty, with ten deaths of the
//! daemon, and the figures are written to the file that TIDEREEVE_FIGURES names.

mod rig;

use std::fmt::Write;
use std::thread;
use std::time::{Duration, Instant};

use model::Site;
use oracle::{Line, judge, lost};
use plant::{SplitMix64, Truth};
use serde_json::Value;
use units::{Span, Utc, Window};

use self::rig::Rig;
use crate::scenarios::tarrow::{at, tarrow};
use crate::scenarios::thirty_days::judging::{foresight_m3, rules_for};

const START: &str = "2027-05-01T00:00:00Z";

/// What is done to it, at the first moment from each instant on at which an intent is open.
struct Form {
    days: i64,
    speed: u32,
    daemon_killed: Vec<Utc>,
    adapter_killed: Vec<Utc>,
    /// Adapter and daemon together: only the plant's own lease is left to shut the gate.
    both_killed: Vec<Utc>,
    faults: String,
}

impl Form {
    fn deaths(&self) -> usize {
        self.daemon_killed.len() + self.both_killed.len()
    }
}

/// The frozen level and, in the long form, the two jams.
fn fault(kind: &str, subject: &str, from: Utc, length: Span) -> String {
    let to = from + length;
    format!(
        "\n[[simulation.faults]]\nkind = \"{kind}\"\nsubject = \"{subject}\"\nfrom = \"{from}\"\n\
         to = \"{to}\"\n"
    )
}

fn short() -> Form {
    let start = at(START);
    Form {
        days: 2,
        speed: 600,
        daemon_killed: vec![start + Span::hours(2)],
        adapter_killed: vec![start + Span::hours(12)],
        both_killed: vec![start + Span::hours(26)],
        faults: fault("signal-frozen", "lagoon-level-a", start + Span::hours(20), Span::days(1)),
    }
}

fn long() -> Form {
    let start = at(START);
    let mut random = SplitMix64::new(30);
    let mut any =
        |day: f64| start + Span::from_seconds_f64(random.between(day, day + 1.0) * 86_400.0);
    let frozen = fault("signal-frozen", "lagoon-level-a", start + Span::days(9), Span::days(1));
    let shut = fault("gate-jam", "penstock", start + Span::days(14), Span::hours(4));
    let moving = fault("gate-jam", "penstock", at("2027-05-21T04:00:00Z"), Span::minutes(20));
    Form {
        days: 30,
        speed: 1_200,
        daemon_killed: (0..5).map(|n| any(1.0 + 5.6 * f64::from(n))).collect(),
        both_killed: (0..5).map(|n| any(3.8 + 5.2 * f64::from(n))).collect(),
        adapter_killed: (0..6).map(|n| any(2.0 + 4.5 * f64::from(n))).collect(),
        faults: [frozen, shut, moving].concat(),
    }
}

fn intent_open(now: &Value) -> bool {
    now["assets"].as_array().unwrap().iter().any(|a| a["intent_open"] == true)
}

fn utc(now: &Value) -> Utc {
    Utc::parse(now["utc"].as_str().unwrap()).unwrap()
}

/// A person resets what has tripped, as `now` shows it; refused while its cause is there.
fn look_after(rig: &Rig, now: &Value) {
    let tripped = now["assets"].as_array().unwrap().iter().filter(|a| {
        a["held_by"].as_str().is_some_and(|h| h.contains("trip"))
            && a["position_percent"].as_f64().is_some_and(|p| p < 0.5)
    });
    for a in tripped {
        rig.order(&["reset", a["name"].as_str().unwrap()]);
    }
}

fn person_at_the_start(rig: &Rig, days: i64) {
    let until = (at(START) + Span::days(days + 10)).to_string();
    rig.order(&["authorise", "--until", &until]);
    rig.order(&["mode", "automatic"]);
}

/// Runs the form to its end; how many rows had been printed at each death, and what was open.
fn drive(form: &Form, rig: &mut Rig) -> usize {
    person_at_the_start(rig, form.days);
    let end = at(START) + Span::days(form.days);
    let mut daemon = form.daemon_killed.iter().copied().peekable();
    let mut adapter = form.adapter_killed.iter().copied().peekable();
    let mut both = form.both_killed.iter().copied().peekable();
    let mut killed_with_intent = 0;
    let real_end = Instant::now() + Duration::from_secs(form.days as u64 * 86_400 * 2);
    while Instant::now() < real_end {
        let now = rig.now().unwrap_or_else(|| panic!("no answer:\n{}", rig.log()));
        let t = utc(&now);
        if t >= end {
            break;
        }
        let together = intent_open(&now) && both.next_if(|k| *k <= t).is_some();
        if together {
            rig.kill_adapter();
        }
        if together || intent_open(&now) && daemon.next_if(|k| *k <= t).is_some() {
            rig.kill_daemon();
            killed_with_intent += 1;
            // Past the lease of 120 s of simulated time, and back within the outage limit of 15 min.
            thread::sleep(Duration::from_secs(300) / form.speed);
            rig.start();
        } else if intent_open(&now) && adapter.next_if(|k| *k <= t).is_some() {
            rig.kill_adapter();
        }
        look_after(rig, &now);
        thread::sleep(Duration::from_millis(50));
    }
    let left = daemon.count() + adapter.count() + both.count();
    assert_eq!(left, 0, "every death found its moment");
    rig.stop();
    killed_with_intent
}

#[test]
fn fault_killed_daemon_adapter_and_a_frozen_level_break_no_rule_and_lose_no_row() {
    let is_long = std::env::var("TIDEREEVE_LONG").is_ok_and(|v| v == "1");
    let form = if is_long { long() } else { short() };
    let site: Site = tarrow();
    let mut rig = Rig::new(START, &form.faults, form.speed);
    let killed = drive(&form, &mut rig);
    rig.verify();
    without_gap(&rig.seen(&site), form.deaths() as u64 + 1);
    let outlet = &site.outlets[0];
    let order = std::iter::once(&outlet.gate).chain(&outlet.pumps);
    let assets: Vec<String> = order.map(|a| site.asset(*a).name.clone()).collect();
    let recorded = rig::recorded(&rig.plant_record(), &assets);
    let first = recorded.run.samples[0].utc;
    let span = Window::new(first, at(START) + Span::days(form.days)).unwrap();
    let rules = rules_for(&site, &span, &recorded.current);
    let report = judge(&recorded.run, &rules);
    let truth = Truth::drawn(site.simulation.as_ref().unwrap().seed);
    let most_m3 = foresight_m3(&site, &truth, &recorded.run, &rules);
    let share = report.totals.released_m3 / most_m3;
    let printed = rig.printed.lock().unwrap();
    let rows = rig.rows();
    let lost = lost(&lines(&printed), &lines(&rows));
    let mut figures = String::new();
    writeln!(figures, "{} simulated days at {} times real time", form.days, form.speed).unwrap();
    writeln!(figures, "daemon killed with an intent open {killed}").unwrap();
    writeln!(figures, "rows printed {}, in the journal {}", printed.len(), rows.len()).unwrap();
    writeln!(figures, "acknowledged rows lost {}", lost.len()).unwrap();
    writeln!(figures, "{report}").unwrap();
    writeln!(figures, "perfect foresight {most_m3:.0} m3, of which {:.2} %", share * 100.0)
        .unwrap();
    println!("{figures}");
    if let Ok(path) = std::env::var("TIDEREEVE_FIGURES") {
        std::fs::write(path, &figures).unwrap();
    }
    assert_eq!(lost, Vec::<u64>::new());
    assert!(printed.len() > 20 && killed == form.deaths());
    assert!(report.totals.leases_run_out > 0, "a lease had to run out");
    let known = 4 * form.days as usize;
    assert_eq!(tests::but_for_the_ramp(&report.findings, known.max(16)), Vec::<String>::new());
    assert!(report.totals.releases >= form.days as usize, "{} releases", report.totals.releases);
    if is_long {
        assert!(report.totals.releases >= 50 && share >= 0.95, "{share}");
    }
}

/// Every term's events were kept from its first on without a gap; a kill may take the last second's.
fn without_gap(seen: &[(u64, u64)], terms: u64) {
    let (mut term, mut last) = (0, 0);
    for &(t, seq) in seen {
        if t != term {
            assert_eq!((t, seq), (term + 1, 1), "after event {last} of term {term}");
        } else {
            assert_eq!(seq, last + 1, "in term {t}");
        }
        (term, last) = (t, seq);
    }
    assert_eq!(term, terms, "every life was seen");
}

fn lines(rows: &[(u64, String)]) -> Vec<Line<'_>> {
    rows.iter().map(|(seq, text)| Line { seq: *seq, text }).collect()
}
