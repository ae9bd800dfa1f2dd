//! A simulated day at Tarrow Works: every entry reads back, a snapshot after any row will do, and how
//! many bytes it all takes.

use std::collections::BTreeMap;
use std::sync::LazyLock;

use engine::{Carried, Event};
use model::Site;
use record::{Draft, Fold, Row, describe, kind};
use units::Span;
use world::{Run, World};

use crate::scenarios::tarrow::{at, setup, tarrow};

static SITE: LazyLock<Site> = LazyLock::new(tarrow);
static DAY: LazyLock<Run> =
    LazyLock::new(|| World::new(setup(SITE.clone(), at("2027-05-02T00:00:00Z"), 1)).run().unwrap());

fn rows(run: &Run) -> Vec<Row> {
    let row = |(seq, (stamp, entry)): (u64, &(engine::Stamp, engine::Entry))| {
        let Draft { kind, version, subject, cause, body } = record::encode(entry, &SITE);
        let (term, utc, boot) = (stamp.term.0, stamp.utc, stamp.boot);
        Row { seq, term, utc, boot, kind, version, subject, cause, body, hash: [0; 32] }
    };
    (1..).zip(&run.entries).map(row).collect()
}

#[test]
fn compat_v1_every_entry_of_a_day_reads_back_as_it_was() {
    let mut kinds = std::collections::BTreeSet::new();
    for (row, (_, entry)) in rows(&DAY).iter().zip(&DAY.entries) {
        kinds.insert(row.kind);
        assert_eq!(&record::decode(row, &SITE).unwrap(), entry);
        assert!(!describe(row).is_empty());
    }
    assert!(kinds.len() >= 10, "{kinds:?}");
}

fn folded(mut fold: Fold, rows: &[Row]) -> Fold {
    rows.iter().for_each(|row| fold.push(row));
    fold
}

/// For every k: the first k rows, their snapshot, the rest; and the same hand-over.
#[test]
fn prop_a_snapshot_after_any_row_of_a_day_gives_what_all_rows_give() {
    let rows = rows(&DAY);
    let all: Carried = folded(Fold::new(&SITE), &rows).finish();
    assert!(!all.released.is_empty() && all.mode.is_some(), "there is something to carry");
    let mut fold = Fold::new(&SITE);
    let mut longest = 0;
    for k in 0..=rows.len() {
        let bytes = fold.snapshot();
        longest = longest.max(bytes.len());
        let restored = Fold::restore(&SITE, &bytes).unwrap();
        assert_eq!(restored.snapshot(), bytes, "after {k} rows");
        assert_eq!(folded(restored, &rows[k..]).finish(), all, "after {k} rows");
        rows.get(k).into_iter().for_each(|row| fold.push(row));
    }
    println!("{} rows, {} buckets, a snapshot of {longest} bytes", rows.len(), all.released.len());
    assert!(longest < 400 + 12 * all.released.len(), "{longest}");
}

/// (rows, bytes of subject, of cause, of body) by kind.
fn sizes(rows: &[Row]) -> BTreeMap<u16, [usize; 4]> {
    let mut sizes = BTreeMap::<u16, [usize; 4]>::new();
    for row in rows {
        let of = sizes.entry(row.kind).or_default();
        for (sum, n) in of.iter_mut().zip([1, row.subject.len(), row.cause.len(), row.body.len()]) {
            *sum += n;
        }
    }
    sizes
}

#[test]
fn a_row_takes_few_bytes() {
    let sizes = sizes(&rows(&DAY));
    let mut all = [0; 4];
    println!(
        "{:>16} {:>6} {:>8} {:>8} {:>8} {:>8}",
        "kind", "rows", "subject", "cause", "body", "sum"
    );
    let mean = |sum: usize, n: usize| sum as f64 / n as f64;
    let line = |name: &str, [n, subject, cause, body]: [usize; 4]| {
        let [s, c, b] = [subject, cause, body].map(|sum| mean(sum, n));
        println!("{name:>16} {n:>6} {s:>8.1} {c:>8.1} {b:>8.1} {:>8.1}", s + c + b);
    };
    for (kind, of) in &sizes {
        line(kind::name(*kind).unwrap(), *of);
        all.iter_mut().zip(of).for_each(|(sum, n)| *sum += n);
    }
    line("all", all);
    let of = |[n, subject, cause, body]: [usize; 4]| mean(subject + cause + body, n);
    // Before the journal packs them: the words of a decision's causes are half of it.
    assert!(of(all) < 70.0 && of(sizes[&kind::DECISION]) < 180.0);
}

#[test]
fn a_frame_takes_few_bytes() {
    let mut world = World::new(setup(SITE.clone(), at("2027-05-02T00:00:00Z"), 1));
    let (mut frames, mut bytes, mut signals, mut rounded) = (0, 0, 0, 0);
    while world.advance().unwrap() && frames < 1_000 {
        let (_, stamp) = world.state();
        let mut readings = world.frame();
        frames += 1;
        signals = readings.len();
        bytes += record::encode_event(&stamp, &Event::Frame(readings.clone()), &SITE).len();
        // As an instrument would give them, and a little late.
        for r in &mut readings {
            r.value = format!("{:.3}", r.value).parse().unwrap();
            r.at = r.at - Span::millis(40);
        }
        rounded += record::encode_event(&stamp, &Event::Frame(readings), &SITE).len();
    }
    let (whole, rounded) = (bytes as f64 / f64::from(frames), rounded as f64 / f64::from(frames));
    println!("a frame of {signals} signals: {whole:.1} bytes, to three decimals {rounded:.1}");
    assert!(whole < 30.0 + 10.0 * signals as f64 && rounded < 30.0 + 6.0 * signals as f64);
}
