//! Exports read back, by readers that do not know who wrote them.

#![allow(clippy::unwrap_used, reason = "a test stops where an assumption breaks")]

#[allow(dead_code, reason = "it has tasks that only other tests ask for")]
mod common;

use std::fs;
use std::path::Path;

use common::{Desk, FIRST_DAY, noon};
use journal::{
    EXPORTED, Export, ExportForm, Filter, ViewError, ViewReader, Wanted, export, guarded,
};
use parquet::file::reader::{FileReader, SerializedFileReader};
use parquet::record::Field;
use record::{Draft, kind};
use rusqlite::Connection;
use units::Mono;

const WHY: [&str; 8] = [
    "plain",
    "a, comma",
    "a \"quoted\" word",
    "two\r\nlines\nand more",
    "Größe 水位 🌊",
    "=1+1",
    "",
    "'tis",
];

/// A record whose causes need care, and its view.
fn site(days: i32) -> tempfile::TempDir {
    let dir = tempfile::tempdir().unwrap();
    let desk = Desk::open(dir.path());
    for day in 0..days {
        desk.write(FIRST_DAY + day, 4000, 0);
    }
    desk.handle.close().unwrap();
    let journal = journal::Journal::open(dir.path(), &mut |_| {}).unwrap();
    let (to, replies) = std::sync::mpsc::channel::<journal::Reply>();
    let handle = journal.start(to);
    let text = |t: &str| [&(t.len() as u32).to_le_bytes()[..], t.as_bytes()].concat();
    let drafts = (0..400).map(|no: usize| {
        let why = WHY[no % WHY.len()];
        let (kind, subject, body) = if no.is_multiple_of(2) {
            (kind::REST, "penstock", [text("penstock"), vec![1], text(why)].concat())
        } else if no % 4 == 1 {
            let body = [&text("pump-1")[..], &7_u64.to_le_bytes(), &[1]].concat();
            (kind::OUTCOME, "pump-1", body)
        } else {
            let volume = (no as f64 / 7.0).to_bits().to_le_bytes();
            let at = noon(FIRST_DAY).as_micros() + no as i64 * 300_000_000;
            let body = [7_i64, at, at + 300_000_000].map(i64::to_le_bytes).concat();
            (kind::RELEASED, "site", [&body[..], &volume, &[0]].concat())
        };
        Draft { kind, version: 1, subject: subject.to_owned(), cause: why.to_owned(), body }
    });
    let batch = journal::Batch {
        term: 2,
        utc: noon(FIRST_DAY + days),
        boot: Mono::ZERO,
        drafts: drafts.collect(),
        intents: Vec::new(),
        seen: journal::Seen::default(),
    };
    handle.submit(batch).unwrap();
    assert!(matches!(replies.recv().unwrap(), journal::Reply::Acked(_)));
    handle.close().unwrap();
    journal::rebuild_view(dir.path(), &mut |_, _| {}).unwrap();
    dir
}

fn out<'a>(form: ExportForm, table: &'static str, to: &'a Path) -> Export<'a> {
    Export { form, table, to, replace: false }
}

/// RFC 4180, section 2, rules 1 to 7, and nothing beside them.
fn strict(text: &str) -> Vec<Vec<String>> {
    let (mut records, mut record) = (Vec::new(), Vec::new());
    let mut rest = text;
    loop {
        let field = if let Some(mut quoted) = rest.strip_prefix('"') {
            let mut field = String::new();
            loop {
                let end = quoted.find('"').expect("a quote that is closed");
                field.push_str(&quoted[..end]);
                quoted = &quoted[end + 1..];
                match quoted.strip_prefix('"') {
                    Some(more) => {
                        field.push('"');
                        quoted = more;
                    }
                    None => break,
                }
            }
            rest = quoted;
            field
        } else {
            let end = rest.find([',', '\r', '\n', '"']).unwrap_or(rest.len());
            let field = rest[..end].to_owned();
            rest = &rest[end..];
            field
        };
        record.push(field);
        if let Some(more) = rest.strip_prefix(',') {
            rest = more;
            continue;
        }
        rest = rest.strip_prefix("\r\n").unwrap_or_else(|| panic!("no CRLF: {:.20}", rest));
        records.push(std::mem::take(&mut record));
        if rest.is_empty() {
            return records;
        }
    }
}

fn unguarded(cell: &str) -> &str {
    cell.strip_prefix('\'').unwrap_or(cell)
}

#[test]
fn csv_goes_out_and_comes_back_by_a_strict_reader() {
    let dir = site(2);
    let to = dir.path().join("entries.csv");
    let mut last = (0, 0);
    let done =
        export(dir.path(), &out(ExportForm::Csv, "entries", &to), &mut |d, of| last = (d, of));
    let done = done.unwrap();
    let rows = journal::rows(dir.path(), &Filter::default()).unwrap();
    assert_eq!((done.rows, done.head.seq, last), (8_400, 8_400, (8_400, 8_400)));
    let bytes = fs::read(&to).unwrap();
    assert_eq!(bytes.len() as u64, done.bytes);
    let records = strict(std::str::from_utf8(&bytes).unwrap());
    assert_eq!(records[0], ["seq", "utc", "utc_us", "term", "kind", "subject", "cause", "words"]);
    assert_eq!(records.len() - 1, rows.len());
    for (record, row) in records[1..].iter().zip(&rows) {
        assert_eq!(record.len(), 8);
        assert_eq!(record[0], row.seq.to_string());
        assert_eq!(record[1], row.utc.to_string());
        assert_eq!(record[2], row.utc.as_micros().to_string());
        assert_eq!(record[3], row.term.to_string());
        assert_eq!(Some(unguarded(&record[4])), kind::name(row.kind));
        assert_eq!(unguarded(&record[5]), row.subject);
        assert_eq!(unguarded(&record[6]), row.cause);
        assert_eq!(unguarded(&record[7]), record::describe(row));
        assert!(!record[6].starts_with(['=', '+', '-', '@']), "{record:?}");
    }
}

#[test]
fn csv_of_numbers_reads_back_to_the_bit_and_is_not_guarded() {
    let dir = site(2);
    let to = dir.path().join("releases.csv");
    let done = export(dir.path(), &out(ExportForm::Csv, "releases", &to), &mut |_, _| {}).unwrap();
    assert_eq!(done.rows, 100);
    let records = strict(&fs::read_to_string(&to).unwrap());
    let at = records[0].iter().position(|n| n == "volume_m3").unwrap();
    for (no, record) in records[1..].iter().enumerate() {
        let wanted = (4 * no + 3) as f64 / 7.0;
        assert_eq!(record[at].parse::<f64>().unwrap().to_bits(), wanted.to_bits());
    }
}

#[test]
fn a_guard_is_taken_off_without_loss() {
    for text in ["=A1", "+1", "-1", "@x", "\tx", "\rx", "'", "''=", "'=1", "x=1", "", "水"] {
        let cell = guarded(text);
        assert!(!cell.starts_with(['=', '+', '-', '@', '\t', '\r']), "{cell:?}");
        assert_eq!(unguarded(&cell), text);
    }
}

#[test]
fn parquet_comes_back_by_its_own_reader() {
    let dir = site(20);
    let to = dir.path().join("entries.parquet");
    let done =
        export(dir.path(), &out(ExportForm::Parquet, "entries", &to), &mut |_, _| {}).unwrap();
    assert_eq!(done.rows, 80_400);
    let reader = SerializedFileReader::new(fs::File::open(&to).unwrap()).unwrap();
    assert_eq!(reader.num_row_groups(), 2);
    let metadata = reader.metadata().file_metadata().key_value_metadata().unwrap();
    assert!(
        metadata
            .iter()
            .any(|m| m.key == "record_head_hash" && m.value.as_deref() == Some(&done.head.hash))
    );
    let view = ViewReader::open(dir.path()).unwrap();
    let entries = view.entries(&Wanted { whole: true, ..Wanted::default() }).unwrap();
    let mut count = 0;
    for (row, entry) in reader.get_row_iter(None).unwrap().zip(entries.iter()) {
        let row = row.unwrap();
        let fields: Vec<Field> = row.get_column_iter().map(|(_, f)| f.clone()).collect();
        let text = |t: &str| Field::Str(t.to_owned());
        let rest = entry.rest.unwrap();
        let wanted = [
            Field::Long(entry.seq as i64),
            text(&entry.utc.to_string()),
            Field::TimestampMicros(entry.utc.as_micros()),
            Field::Long(rest.term as i64),
            text(entry.kind),
            text(entry.subject),
            text(rest.cause),
            text(entry.words),
        ];
        assert_eq!(fields, wanted);
        count += 1;
    }
    assert_eq!(count, 80_400);
}

#[test]
fn every_table_goes_out_in_both_forms_with_what_is_missing_missing() {
    let dir = site(2);
    let db = Connection::open(dir.path().join(journal::VIEW_NAME)).unwrap();
    for table in EXPORTED {
        let rows: i64 =
            db.query_row(&format!("SELECT count(*) FROM {table}"), [], |r| r.get(0)).unwrap();
        let to = dir.path().join(format!("{table}.csv"));
        let done = export(dir.path(), &out(ExportForm::Csv, table, &to), &mut |_, _| {}).unwrap();
        assert_eq!(done.rows as i64, rows, "{table}");
        let records = strict(&fs::read_to_string(&to).unwrap());
        assert_eq!(records.len() as i64 - 1, rows, "{table}");
        let to = dir.path().join(format!("{table}.parquet"));
        export(dir.path(), &out(ExportForm::Parquet, table, &to), &mut |_, _| {}).unwrap();
        let reader = SerializedFileReader::new(fs::File::open(&to).unwrap()).unwrap();
        assert_eq!(reader.metadata().file_metadata().num_rows(), rows, "{table}");
    }
    let column = |table: &str, no: usize| -> Vec<Field> {
        let file = fs::File::open(dir.path().join(format!("{table}.parquet"))).unwrap();
        let reader = SerializedFileReader::new(file).unwrap();
        let rows = reader.get_row_iter(None).unwrap().map(Result::unwrap);
        rows.map(|r| r.get_column_iter().nth(no).unwrap().1.clone()).collect()
    };
    // An empty text is there; the reason of an accepted command is not.
    assert!(column("rests", 4).contains(&Field::Str(String::new())));
    assert_eq!(column("outcomes", 5), vec![Field::Null; 100]);
}

#[test]
fn an_sqlite_copy_is_the_view_and_one_file() {
    let dir = site(8);
    let to = dir.path().join("copy.sqlite");
    // Somebody reads and somebody writes meanwhile.
    let other = || Connection::open(dir.path().join(journal::VIEW_NAME)).unwrap();
    let (reader, writer) = (other(), other());
    reader.execute_batch("PRAGMA journal_mode = WAL; BEGIN; SELECT * FROM meta").unwrap();
    let mut steps = 0;
    let done = export(dir.path(), &out(ExportForm::Sqlite, "entries", &to), &mut |_, _| {
        steps += 1;
        writer.execute_batch("UPDATE meta SET format = format + 1").unwrap();
    });
    assert_eq!(done.unwrap().rows, 32_400);
    assert!(steps > 1, "{steps}");
    let copy = Connection::open(&to).unwrap();
    let format: i64 = copy.query_row("SELECT format FROM meta", [], |r| r.get(0)).unwrap();
    assert_eq!(format, journal::VIEW_FORMAT, "it is of the moment at which it began");
    writer.execute("UPDATE meta SET format = ?1", [format]).unwrap();
    copy.execute("ATTACH ?1 AS view", [dir.path().join(journal::VIEW_NAME).display().to_string()])
        .unwrap();
    for table in EXPORTED {
        let differ = format!(
            "SELECT (SELECT count(*) FROM (SELECT * FROM main.{table} EXCEPT SELECT * FROM view.{table})) \
             + (SELECT count(*) FROM view.{table}) - (SELECT count(*) FROM main.{table})"
        );
        let differ: i64 = copy.query_row(&differ, [], |r| r.get(0)).unwrap();
        assert_eq!(differ, 0, "{table}");
    }
    let mode: String = copy.pragma_query_value(None, "journal_mode", |r| r.get(0)).unwrap();
    assert_eq!(mode, "delete");
}

#[test]
fn fault_what_is_there_is_kept_and_nothing_half_written_stays() {
    let dir = site(2);
    let to = dir.path().join("out.csv");
    let wanted = out(ExportForm::Csv, "acts", &to);
    let go = |e: &Export<'_>| export(dir.path(), e, &mut |_, _| {});
    fs::write(&to, "mine").unwrap();
    let why = go(&wanted).unwrap_err();
    assert!(matches!(why, ViewError::Refused { field: "to", .. }), "{why}");
    assert!(why.to_string().contains("--replace"), "{why}");
    assert_eq!(fs::read_to_string(&to).unwrap(), "mine");
    // What a killed export left behind is no hindrance.
    fs::write(dir.path().join("out.csv.part"), "half").unwrap();
    go(&Export { replace: true, ..wanted }).unwrap();
    assert!(fs::read_to_string(&to).unwrap().starts_with("seq,utc,who"));
    let why = go(&Export { table: "acts; DROP TABLE meta", replace: true, ..wanted }).unwrap_err();
    assert!(matches!(why, ViewError::Refused { field: "table", .. }), "{why}");
    let nowhere = dir.path().join("none/out.csv");
    assert!(matches!(go(&Export { to: &nowhere, ..wanted }), Err(ViewError::Io { .. })));
    let folder = dir.path().join("folder");
    fs::create_dir_all(folder.join("full")).unwrap();
    for form in [ExportForm::Sqlite, ExportForm::Csv, ExportForm::Parquet] {
        let to_a_folder = Export { to: &folder, form, replace: true, ..wanted };
        assert!(matches!(go(&to_a_folder), Err(ViewError::Io { .. })));
    }
    let left = fs::read_dir(dir.path()).unwrap().map(|e| e.unwrap().file_name());
    let left: Vec<_> = left.filter(|n| n.to_string_lossy().contains(".part")).collect();
    assert!(left.is_empty(), "{left:?}");
}

#[test]
fn regress_a_name_without_a_folder_is_in_this_one() {
    let dir = site(0);
    let here = Path::new("regress-export.csv");
    let done = export(dir.path(), &out(ExportForm::Csv, "acts", here), &mut |_, _| {});
    let text = fs::read_to_string(here);
    let _not_there = fs::remove_file(here);
    assert_eq!(done.unwrap().bytes, text.unwrap().len() as u64);
}
