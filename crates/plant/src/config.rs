//! What the plant is built from: the figures of its plate, before the truth is drawn over them.

use structures::{Friction, Outfall, Pipe, StorageCurve, Stroke};
use units::{Mono, Span, Utc, Window};

use crate::water::Water;
use crate::{PlantError, Totals, Truth};

/// Assets are numbered: 0 is the gate, 1 and up are the pumps in order.
///
/// `drain_down` is how flow dies away at the ports: it falls at most as fast as from the release's
/// greatest flow to zero in this time, so that after the gate has shut the last of it is gone
/// within `drain_down`. What leaves meanwhile comes out of the storage, at most half of greatest
/// flow x `drain_down`; a real works holds it in the shaft below the gate.
#[derive(Clone, PartialEq, Debug)]
pub struct PlantConfig {
    pub start: Utc,
    pub boot: Mono,
    pub beginning: Beginning,
    pub truth: Truth,
    pub storage: StorageCurve,
    pub spill: SpillWeir,
    pub outfall: OutfallFigures,
    pub drain_down: Span,
    pub gate: GateConfig,
    pub pumps: Vec<PumpConfig>,
    pub inflow: InflowProfile,
    pub water: Water,
    /// Constant readings (ammonia, UV dose, sampler ready), by place in this list.
    pub constants: Vec<f64>,
    pub faults: Vec<Fault>,
    pub record_every: Span,
}

/// How things stand when it begins: all at rest but for where the gate was left.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Beginning {
    pub level_m: f64,
    pub gate_percent: f64,
    pub totals: Totals,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct SpillWeir {
    pub crest_level_m: f64,
    pub crest_length_m: f64,
    pub discharge: f64,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct OutfallFigures {
    pub diameter_m: f64,
    pub length_m: f64,
    pub friction_f: f64,
    pub loss_k: f64,
    pub port_centre_m: f64,
    pub density_excess: f64,
}

/// What the controller does by itself when a lease runs out.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum RestDo {
    Close,
    Open,
    Stop,
    /// Stay as it is.
    Hold,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct GateConfig {
    pub stroke: Span,
    pub rest: RestDo,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct PumpConfig {
    pub flow_m3_s: f64,
    pub power_kw: f64,
    pub rest: RestDo,
}

/// See [`structures::daily_inflow_m3_s`]; `max_m3_s` is all that can arrive, storms included.
#[derive(Clone, Copy, PartialEq, Debug)]
pub struct InflowProfile {
    pub mean_m3_s: f64,
    pub swing: f64,
    pub peak_hour_utc: f64,
    pub max_m3_s: f64,
}

#[derive(Clone, Copy, PartialEq, Debug)]
pub struct Fault {
    pub kind: FaultKind,
    pub window: Window,
}

#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum FaultKind {
    /// The gate stops where it is and does nothing until the fault ends; then it goes on to where
    /// the controller wants it.
    GateJam,
    /// The reading repeats the value it had, with fresh times.
    SignalFrozen(crate::Point),
    /// No reading comes.
    SignalMissing(crate::Point),
}

/// Pump and motor together (common practice for axial and mixed-flow units of this size).
const PUMP_EFFICIENCY: f64 = 0.70;
const FRESH_KN_M3: f64 = 9.81;

impl PumpConfig {
    /// Greatest lift that its power gives at its rated flow, m.
    pub(crate) fn lift_m(&self) -> f64 {
        PUMP_EFFICIENCY * self.power_kw / (FRESH_KN_M3 * self.flow_m3_s)
    }
}

impl PlantConfig {
    /// The outfall as it really is: plate figures times the drawn factors.
    pub(crate) fn true_outfall(&self) -> Result<Outfall, PlantError> {
        let of = |source| PlantError::Structure { part: "outfall", source };
        let (o, t) = (&self.outfall, &self.truth);
        let friction = Friction::Darcy(o.friction_f * t.friction_factor);
        let loss_k = o.loss_k * t.loss_factor;
        let pipe = Pipe::new(o.diameter_m, o.length_m, friction, loss_k).map_err(of)?;
        Outfall::new(pipe, o.port_centre_m, o.density_excess).map_err(of)
    }
    pub(crate) fn stroke(&self) -> Result<Stroke, PlantError> {
        let of = |source| PlantError::Structure { part: "gate", source };
        Stroke::new(self.gate.stroke.as_seconds()).map_err(of)
    }
    /// Refuses figures that would put a NaN or an endless loop into the state.
    pub(crate) fn check(&self) -> Result<(), PlantError> {
        let b = &self.beginning;
        let least = |what, value: f64, min: f64| {
            if value.is_finite() && value >= min {
                Ok(())
            } else {
                Err(PlantError::BadFigure { what, value })
            }
        };
        least("level at the beginning", b.level_m, f64::MIN)?;
        least("gate position at the beginning", b.gate_percent, 0.0)?;
        least("room left to open at the beginning", 100.0 - b.gate_percent, 0.0)?;
        least("spill level", self.spill.crest_level_m, f64::MIN)?;
        least("spill crest length", self.spill.crest_length_m, 0.0)?;
        least("spill discharge coefficient", self.spill.discharge, 0.0)?;
        least("drain-down", self.drain_down.as_seconds(), 0.0)?;
        least("recording interval", self.record_every.as_seconds(), 1.0)?;
        least("mean inflow", self.inflow.mean_m3_s, 0.0)?;
        least("swing of the inflow", self.inflow.swing, f64::MIN)?;
        least("peak hour of the inflow", self.inflow.peak_hour_utc, f64::MIN)?;
        least("greatest inflow", self.inflow.max_m3_s, 0.0)?;
        for p in &self.pumps {
            least("pump flow", p.flow_m3_s, 1e-6)?;
            least("pump power", p.power_kw, 0.0)?;
        }
        self.constants.iter().try_for_each(|c| least("a constant reading", *c, f64::MIN))
    }
}
