//! The messages' contents.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// Method names.
pub mod method {
    pub const INTRODUCE: &str = "introduce";
    pub const DRIVE: &str = "drive";
    pub const RENEW: &str = "renew";
    pub const REST: &str = "rest";
    pub const SENSE: &str = "sense";
    pub const FINISH: &str = "finish";
    /// A notification to those adapters that named the feature.
    pub const ANCHOR: &str = "anchor";
    /// Notifications from the adapter.
    pub const READING: &str = "reading";
    pub const SERIES: &str = "series";
    pub const TROUBLE: &str = "trouble";
}

/// Feature names: what one side may do if the other knows of it.
pub mod feature {
    /// The adapter wants to be told where the record's chain ends, to keep it elsewhere.
    pub const ANCHORS: &str = "anchors";
}

/// First message, from the daemon.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Introduce {
    pub version: u32,
    pub features: Vec<String>,
    pub site: String,
    pub term: u64,
    /// Differs with every start of the adapter.
    pub session: String,
    pub line_max_bytes: u64,
    /// From the site file, as text.
    pub settings: BTreeMap<String, String>,
}

/// The adapter's answer.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Introduced {
    pub name: String,
    pub version: String,
    pub points: Vec<Point>,
    /// Of [`feature`]; none unless it says so.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub features: Vec<String>,
}

/// Where the chain of the record ended.
#[derive(Serialize, Deserialize, Clone, PartialEq, Eq, Debug)]
pub struct Anchor {
    pub site: String,
    /// `1234:` and 64 hexadecimal digits, as `journal verify --anchor` takes it.
    pub anchor: String,
}

/// Something that can be read or driven.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Point {
    pub id: String,
    pub kind: PointKind,
    pub unit: String,
    pub min: f64,
    pub max: f64,
    pub readable: bool,
    pub drivable: bool,
    /// For a drivable point: who ends its lease, the shortest lease it can keep, and what it does
    /// by itself for each cause.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub lease_holder: Option<LeaseHolder>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub lease_shortest_ms: Option<u64>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub rest: Option<RestSet>,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum PointKind {
    Level,
    Flow,
    Position,
    Run,
    Flag,
    Value,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum LeaseHolder {
    Device,
    Adapter,
    None,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum RestAction {
    Close,
    Open,
    Stop,
    Hold,
    HandToLocal,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum RestCause {
    LeaseOut,
    InputEnd,
    Trip,
    Stop,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
pub struct RestSet {
    pub lease_out: RestAction,
    pub input_end: RestAction,
    pub trip: RestAction,
    pub stop: RestAction,
}

/// Set a point. Refused if past, or if the term is older than the highest seen; the same command
/// twice has the same answer and is done once.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Drive {
    pub point: String,
    pub setpoint: f64,
    pub command: u64,
    pub term: u64,
    pub sequence: u64,
    /// When the lease ends, absolute, on the boot clock that one host shares.
    pub expires_boottime_ns: u64,
}

#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Renew {
    pub commands: Vec<RenewOne>,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Debug)]
pub struct RenewOne {
    pub command: u64,
    pub expires_boottime_ns: u64,
}

/// Go to rest now.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Rest {
    pub points: Vec<RestOne>,
    pub cause: RestCause,
    /// For people.
    #[serde(default)]
    pub words: String,
}

#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct RestOne {
    pub point: String,
    pub action: RestAction,
}

#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Sense {
    pub points: Vec<String>,
}

#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Sensed {
    pub readings: Vec<Reading>,
}

#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Reading {
    pub point: String,
    pub value: f64,
    pub quality: Quality,
    /// When it was true, microseconds since 1970 UTC.
    pub time_utc_us: i64,
    #[serde(default)]
    pub sequence: u64,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum Quality {
    Good,
    Uncertain,
    Bad,
}

/// Forecast values for a signal.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Series {
    pub point: String,
    pub start_utc_us: i64,
    pub step_s: u64,
    pub values: Vec<f64>,
}

/// A fault that the adapter knows of.
#[derive(Serialize, Deserialize, Clone, PartialEq, Debug)]
pub struct Trouble {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub point: Option<String>,
    pub severity: Severity,
    pub words: String,
}

#[derive(Serialize, Deserialize, Clone, Copy, PartialEq, Eq, Debug)]
#[serde(rename_all = "kebab-case")]
pub enum Severity {
    Info,
    Warning,
    Alarm,
}
