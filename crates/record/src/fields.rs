//! What a row says, field by field, under plain names with their units: for people's tables, without
//! the site file.

use engine::{Act, Entry, Outcome};
use interlock::Action;
use model::{By, Cause, RestAction};
use units::Window;

use crate::decode::read;
use crate::describe::ordered;
use crate::names::{Gathered, Named};
use crate::{RecordError, Row};

/// One value.
#[derive(Clone, PartialEq, Debug)]
pub enum Field {
    Text(String),
    Whole(i64),
    Number(f64),
    /// Not there, or does not apply.
    Nothing,
}

/// Who or what stood against a movement.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Objection {
    /// `clause`, `interlock`, `latch`, `mode`, `armed`, `person`, `plan` or `asset`.
    pub by: &'static str,
    /// The clause's number or the interlock's code; empty where there is only one.
    pub name: String,
}

/// The fields of a row, and the objections of a decision.
#[derive(Clone, PartialEq, Debug, Default)]
pub struct Fields {
    pub named: Vec<(&'static str, Field)>,
    pub objections: Vec<Objection>,
}

impl Fields {
    fn of<const N: usize>(named: [(&'static str, Field); N]) -> Self {
        Self { named: named.into(), objections: Vec::new() }
    }

    /// [`Field::Nothing`] for a name that the kind does not have.
    pub fn get(&self, name: &str) -> &Field {
        self.named.iter().find(|(n, _)| *n == name).map_or(&Field::Nothing, |(_, field)| field)
    }
}

/// Names and values of decisions, intents, outcomes, confirmations, rests, discrepancies, released
/// volumes, missed windows, forecast spills, plans and acts; empty for the other kinds, which
/// [`describe`](crate::describe) and the row's own columns say in full. Instants are microseconds
/// from 1970 (`_us`); digests are 16 hexadecimal digits.
///
/// Refuses, without panicking, what [`decode`](crate::decode) refuses, but for names: any is good.
pub fn fields(row: &Row) -> Result<Fields, RecordError> {
    use crate::kind;
    const TOLD: [u16; 11] = [
        kind::ACT,
        kind::PLAN_ADOPTED,
        kind::DECISION,
        kind::INTENT,
        kind::OUTCOME,
        kind::CONFIRMED,
        kind::REST,
        kind::DISCREPANCY,
        kind::RELEASED,
        kind::WINDOW_MISSED,
        kind::SPILL_FORECAST,
    ];
    if !TOLD.contains(&row.kind) {
        return Ok(Fields::default());
    }
    let mut names = Gathered::default();
    let entry = read(row.kind, row.version, &row.body, &mut names)?;
    Ok(water(&entry, &names).or_else(|| command(&entry, &names)).unwrap_or_default())
}

fn water(entry: &Entry, names: &Gathered) -> Option<Fields> {
    Some(match entry {
        Entry::PlanAdopted { plan, parent, request_digest, forecast_digest, released, spill } => {
            Fields::of([
                ("plan", whole(plan.0)),
                ("parent", parent.map_or(Field::Nothing, |p| whole(p.0))),
                ("release_m3", Field::Number(released.get())),
                ("spill_m3", Field::Number(spill.get())),
                ("request_digest", hex(*request_digest)),
                ("forecast_digest", hex(*forecast_digest)),
            ])
        }
        Entry::Released { tide, bucket, volume, estimated } => Fields::of([
            ("tide", Field::Whole(*tide)),
            begins(bucket),
            ends(bucket),
            ("volume_m3", Field::Number(volume.get())),
            ("estimated", Field::Whole(i64::from(*estimated))),
        ]),
        Entry::WindowMissed { tide, window, cause } => Fields::of([
            ("tide", Field::Whole(*tide)),
            begins(window),
            ends(window),
            ("cause", text(cause)),
        ]),
        Entry::SpillForecast { window, volume, clauses } => {
            let numbers: Vec<&str> = clauses.iter().map(|c| names.clause_number(*c)).collect();
            Fields::of([
                begins(window),
                ends(window),
                ("volume_m3", Field::Number(volume.get())),
                ("clauses", text(&numbers.join(", "))),
            ])
        }
        Entry::Act { act, refused } => act_fields(act, refused.as_deref(), names),
        _ => return None,
    })
}

fn act_fields(act: &Act, refused: Option<&str>, names: &Gathered) -> Fields {
    Fields::of([
        ("ordered", text(&ordered(act, names))),
        ("who", text(&act.by)),
        ("reason", text(&act.reason)),
        ("peer", text(&act.peer)),
        ("refused", refused.map_or(Field::Nothing, text)),
    ])
}

fn command(entry: &Entry, names: &Gathered) -> Option<Fields> {
    Some(match entry {
        Entry::Decision { action, plan, causes, .. } => {
            let plan = plan.map_or(Field::Nothing, |p| whole(p.0));
            let (does, opening) = action_fields(*action);
            let objections = causes.iter().map(|c| objection(c, names)).collect();
            let named = vec![("action", does), ("opening_percent", opening), ("plan", plan)];
            Fields { named, objections }
        }
        Entry::Intent { action, command, lease_end, state_seq, readings, .. } => {
            let (does, opening) = action_fields(*action);
            Fields::of([
                ("action", does),
                ("opening_percent", opening),
                ("command", whole(*command)),
                ("lease_end_ns", whole(lease_end.as_nanos())),
                ("state_seq", whole(*state_seq)),
                ("readings", hex(*readings)),
            ])
        }
        Entry::Outcome { command, outcome, .. } => {
            let (outcome, why) = match outcome {
                Outcome::Accepted => ("accepted", Field::Nothing),
                Outcome::Refused(why) => ("refused", text(why)),
                Outcome::Unknown(why) => ("unknown", text(why)),
            };
            Fields::of([("command", whole(*command)), ("outcome", text(outcome)), ("why", why)])
        }
        Entry::Confirmed { command, position, .. } => Fields::of([
            ("command", whole(*command)),
            ("position_percent", Field::Number(*position)),
        ]),
        Entry::Discrepancy { command, wanted, found, .. } => Fields::of([
            ("command", whole(*command)),
            ("wanted_percent", Field::Number(*wanted)),
            ("found_percent", found.map_or(Field::Nothing, Field::Number)),
        ]),
        Entry::Rest { action, cause, .. } => {
            Fields::of([("action", text(rest_name(*action))), ("cause", text(cause))])
        }
        _ => return None,
    })
}

fn objection(cause: &Cause, names: &Gathered) -> Objection {
    let (by, name) = match cause.by {
        By::AssetState => ("asset", ""),
        By::Interlock(code) => ("interlock", code),
        By::Latch => ("latch", ""),
        By::Clause(id) => ("clause", names.clause_number(id)),
        By::Mode => ("mode", ""),
        By::Armed => ("armed", ""),
        By::Person => ("person", ""),
        By::Plan => ("plan", ""),
    };
    Objection { by, name: name.to_owned() }
}

fn action_fields(action: Action) -> (Field, Field) {
    match action {
        Action::Open(p) => (text("open"), Field::Number(p.get())),
        Action::Shut => (text("shut"), Field::Nothing),
        Action::Run => (text("run"), Field::Nothing),
        Action::Stop => (text("stop"), Field::Nothing),
    }
}

const fn rest_name(action: RestAction) -> &'static str {
    match action {
        RestAction::Close => "close",
        RestAction::Open => "open",
        RestAction::Stop => "stop",
        RestAction::Hold => "hold",
        RestAction::HandToLocal => "hand to local",
    }
}

fn text(text: &str) -> Field {
    Field::Text(text.to_owned())
}

/// Numbers that SQL can hold; a greater one, which no site reaches, is the greatest.
fn whole(number: u64) -> Field {
    Field::Whole(i64::try_from(number).unwrap_or(i64::MAX))
}

fn hex(digest: u64) -> Field {
    Field::Text(format!("{digest:016x}"))
}

fn begins(window: &Window) -> (&'static str, Field) {
    ("begins_us", Field::Whole(window.start().as_micros()))
}

fn ends(window: &Window) -> (&'static str, Field) {
    ("ends_us", Field::Whole(window.end().as_micros()))
}
