//! The views. Their field names are a promise to programs that read `--json`.

use serde::{Deserialize, Serialize};

#[derive(Serialize, Deserialize, Debug)]
pub struct NowView {
    pub site: String,
    pub title: String,
    pub zone: String,
    pub utc: String,
    pub term: u64,
    pub mode: String,
    pub armed: bool,
    pub not_armed_because: Vec<String>,
    pub safe_latch: Option<String>,
    pub clock_trusted: bool,
    pub simulated: bool,
    pub authorisation: Option<String>,
    pub wrong: Vec<String>,
    pub storages: Vec<StorageView>,
    pub assets: Vec<AssetView>,
    pub signals: Vec<SignalView>,
    pub adapters: Vec<AdapterView>,
    pub next: Vec<NextView>,
    pub type_next: Vec<String>,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct StorageView {
    pub name: String,
    pub level_m: Option<f64>,
    pub high_alarm_m: f64,
    pub spill_m: f64,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct AssetView {
    pub name: String,
    pub position_percent: Option<f64>,
    pub commanded: String,
    /// True while a command is under way or holds a lease.
    pub intent_open: bool,
    pub held_by: Option<String>,
    pub why: Vec<String>,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct SignalView {
    pub name: String,
    pub value: Option<f64>,
    pub unit: String,
    pub quality: String,
    pub age_s: Option<f64>,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct AdapterView {
    pub name: String,
    pub up: bool,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct NextView {
    pub what: String,
    pub from: String,
    pub to: Option<String>,
    pub from_site_time: String,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct PlanView {
    pub plan: u64,
    pub parent: Option<u64>,
    pub as_of: String,
    pub from: String,
    pub to: String,
    pub request_digest: String,
    pub released_m3: f64,
    pub energy_kwh: f64,
    pub cost: f64,
    pub releases: Vec<ReleaseView>,
    pub shortfalls: Vec<ShortfallView>,
    pub assets: Vec<AssetPlanView>,
    /// (instant, storage level) each half hour.
    pub level_m: Vec<(String, f64)>,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct ReleaseView {
    pub tide: i64,
    pub from: String,
    pub to: String,
    pub volume_m3: f64,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct ShortfallView {
    pub from: String,
    pub to: String,
    pub volume_m3: f64,
    pub clauses: Vec<String>,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct AssetPlanView {
    pub asset: String,
    pub slots: Vec<SlotView>,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct SlotView {
    pub from: String,
    pub to: String,
    pub setpoint: String,
    pub why: String,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct WhyView {
    pub asset: String,
    pub at: String,
    pub active: bool,
    pub asked_for: String,
    pub causes: Vec<CauseView>,
    pub in_words: String,
}

#[derive(Serialize, Deserialize, Debug)]
pub struct CauseView {
    pub by: String,
    pub about: String,
    pub is: String,
    pub must_be: String,
}

impl WhyView {
    /// From a row of the record.
    pub fn recorded(asset: &str, at: units::Utc, seq: u64, words: &str) -> Self {
        Self {
            asset: asset.to_owned(),
            at: at.to_string(),
            active: words.contains("open to") || words.contains(": run"),
            asked_for: String::new(),
            causes: Vec::new(),
            in_words: format!("row {seq} of the record: {words}"),
        }
    }
}
