//! Numbers of the kinds of row. A number is never reused, and a kind that is dropped keeps its line.

pub const STARTED: u16 = 1;
pub const ACT: u16 = 2;
pub const MODE_CHANGED: u16 = 3;
pub const ARMED: u16 = 4;
pub const CLOCK: u16 = 5;
pub const PLAN_ADOPTED: u16 = 6;
pub const DECISION: u16 = 7;
pub const INTENT: u16 = 8;
pub const OUTCOME: u16 = 9;
pub const CONFIRMED: u16 = 10;
pub const REST: u16 = 11;
pub const DISCREPANCY: u16 = 12;
pub const LATCHED: u16 = 13;
pub const RESET: u16 = 14;
pub const RELEASED: u16 = 15;
pub const WINDOW_MISSED: u16 = 16;
pub const SPILL_FORECAST: u16 = 17;
pub const ADAPTER_UP: u16 = 18;
pub const ADAPTER_DOWN: u16 = 19;
pub const STOPPING: u16 = 20;
// From here on: what the record says of itself.
pub const SEALED: u16 = 21;
pub const SEGMENT_DELETED: u16 = 22;
pub const SNAPSHOT: u16 = 23;
pub const ANCHORED: u16 = 24;
pub const BACKED_UP: u16 = 25;
pub const LEGAL_HOLD: u16 = 26;
pub const HOLD_LIFTED: u16 = 27;
pub const MIGRATED: u16 = 28;
pub const SUMMARY: u16 = 29;
pub const JOURNAL_BACK: u16 = 30;

const NAMES: [(u16, &str); 30] = [
    (STARTED, "started"),
    (ACT, "act"),
    (MODE_CHANGED, "mode-changed"),
    (ARMED, "armed"),
    (CLOCK, "clock"),
    (PLAN_ADOPTED, "plan-adopted"),
    (DECISION, "decision"),
    (INTENT, "intent"),
    (OUTCOME, "outcome"),
    (CONFIRMED, "confirmed"),
    (REST, "rest"),
    (DISCREPANCY, "discrepancy"),
    (LATCHED, "latched"),
    (RESET, "reset"),
    (RELEASED, "released"),
    (WINDOW_MISSED, "window-missed"),
    (SPILL_FORECAST, "spill-forecast"),
    (ADAPTER_UP, "adapter-up"),
    (ADAPTER_DOWN, "adapter-down"),
    (STOPPING, "stopping"),
    (SEALED, "sealed"),
    (SEGMENT_DELETED, "segment-deleted"),
    (SNAPSHOT, "snapshot"),
    (ANCHORED, "anchored"),
    (BACKED_UP, "backed-up"),
    (LEGAL_HOLD, "legal-hold"),
    (HOLD_LIFTED, "hold-lifted"),
    (MIGRATED, "migrated"),
    (SUMMARY, "summary"),
    (JOURNAL_BACK, "journal-back"),
];

/// Every kind that this version writes.
pub fn all() -> impl Iterator<Item = u16> {
    NAMES.iter().map(|(kind, _)| *kind)
}

/// The name that a person types or reads; `None` for a kind of another version.
pub fn name(kind: u16) -> Option<&'static str> {
    NAMES.iter().find(|(k, _)| *k == kind).map(|(_, name)| *name)
}

/// The kind of that name.
pub fn named(name: &str) -> Option<u16> {
    NAMES.iter().find(|(_, n)| *n == name).map(|(kind, _)| *kind)
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    #[test]
    fn kinds_and_names_are_all_different() {
        let kinds: BTreeSet<u16> = super::all().collect();
        assert_eq!(kinds.len(), super::NAMES.len());
        for kind in kinds {
            let name = super::name(kind).unwrap();
            assert_eq!(super::named(name), Some(kind));
        }
        assert_eq!(super::name(0), None);
    }
}
