//! What a finished job gave, as one number: two products have the same digest if, and (but for
//! accidents of 64 bits) only if, every field of them is the same to the bit.

use model::{
    AssetPlan, CurrentTurn, FlowLimit, Forecast, Method, PlaceForecast, Plan, PlanId,
    PlannedRelease, Setpoint, Shortfall, Slot, SlotReason, Tide, Turn, TurnKind,
};
use units::{Digest, Series, Span, Utc, Window};

/// Every field is taken apart by name, so that a new one cannot be forgotten here.
struct Sum(Digest);

pub(crate) fn of_forecast(f: &Forecast) -> u64 {
    let Forecast { as_of, span, digest, port_turns, tides, port_level, places } = f;
    let mut sum = Sum(Digest::new());
    sum.utc(*as_of);
    sum.window(span);
    sum.0.u64(*digest);
    sum.list(port_turns, Sum::turn);
    sum.list(tides, Sum::tide);
    sum.series(port_level);
    sum.list(places, Sum::place);
    sum.0.get()
}

pub(crate) fn of_plan(p: &Plan) -> u64 {
    let Plan {
        id,
        parent,
        as_of,
        span,
        request_digest,
        forecast_digest,
        assets,
        releases,
        level,
        volume_released,
        energy_kwh,
        cost,
        shortfalls,
    } = p;
    let mut sum = Sum(Digest::new());
    sum.0.u64(id.0);
    sum.option(parent.as_ref(), |s, PlanId(n)| s.number(*n));
    sum.utc(*as_of);
    sum.window(span);
    sum.0.u64(*request_digest).u64(*forecast_digest);
    sum.list(assets, Sum::asset_plan);
    sum.list(releases, Sum::release);
    sum.series(level);
    sum.0.f64(volume_released.get()).f64(*energy_kwh).f64(*cost);
    sum.list(shortfalls, Sum::shortfall);
    sum.0.get()
}

impl Sum {
    fn number(&mut self, n: u64) {
        self.0.u64(n);
    }
    fn id(&mut self, n: u16) {
        self.0.u64(u64::from(n));
    }
    fn utc(&mut self, t: Utc) {
        self.0.i64(t.as_micros());
    }
    fn span(&mut self, s: Span) {
        self.0.i64(s.as_micros());
    }
    fn window(&mut self, w: &Window) {
        self.utc(w.start());
        self.utc(w.end());
    }
    fn list<T>(&mut self, items: &[T], mut each: impl FnMut(&mut Self, &T)) {
        self.number(items.len() as u64);
        for item in items {
            each(self, item);
        }
    }
    fn option<T>(&mut self, v: Option<T>, put: impl FnOnce(&mut Self, T)) {
        self.number(u64::from(v.is_some()));
        if let Some(v) = v {
            put(self, v);
        }
    }
    fn series(&mut self, s: &Series) {
        self.utc(s.start());
        self.span(s.step());
        self.list(s.values(), |sum, v| {
            sum.0.f64(*v);
        });
    }

    fn turn(&mut self, t: &Turn) {
        let Turn { number, kind, at, level, time_sd, level_sd } = *t;
        self.0.i64(number);
        self.number(match kind {
            TurnKind::High => 1,
            TurnKind::Low => 2,
        });
        self.utc(at);
        self.0.f64(level.get());
        self.span(time_sd);
        self.0.f64(level_sd.get());
    }

    fn tide(&mut self, t: &Tide) {
        let Tide { number, window, high, ebb_range } = t;
        self.0.i64(*number);
        self.window(window);
        self.turn(high);
        self.0.f64(ebb_range.get());
    }

    fn place(&mut self, p: &PlaceForecast) {
        let PlaceForecast { place, method, turns, level, current, current_turns } = p;
        self.id(place.0);
        self.number(match method {
            Method::Differences => 1,
        });
        self.list(turns, Self::turn);
        self.series(level);
        self.option(current.as_ref(), Self::series);
        self.list(current_turns, |sum, t| {
            let CurrentTurn { number, to_seaward, at, time_sd } = *t;
            sum.0.i64(number).u64(u64::from(to_seaward));
            sum.utc(at);
            sum.span(time_sd);
        });
    }

    fn asset_plan(&mut self, p: &AssetPlan) {
        let AssetPlan { asset, slots } = p;
        self.id(asset.0);
        self.list(slots, Self::slot);
    }

    fn slot(&mut self, s: &Slot) {
        let Slot { window, setpoint, why, tide } = s;
        self.window(window);
        match setpoint {
            Setpoint::Shut => self.number(1),
            Setpoint::Release { target, openings } => {
                self.number(2);
                self.0.f64(target.get());
                for opening in openings {
                    self.0.f64(opening.get());
                }
            }
            Setpoint::Stopped => self.number(3),
            Setpoint::Running => self.number(4),
        }
        self.why(why);
        self.option(*tide, |sum, n| {
            sum.0.i64(n);
        });
    }

    fn why(&mut self, why: &SlotReason) {
        match why {
            SlotReason::OutsideWindow { clause } => {
                self.number(1);
                self.option(*clause, |sum, c| sum.id(c.0));
            }
            SlotReason::EdgeMargin { clause } => {
                self.number(2);
                self.option(*clause, |sum, c| sum.id(c.0));
            }
            SlotReason::Releasing { limited_by } => {
                self.number(3);
                match limited_by {
                    FlowLimit::Clause(c) => {
                        self.number(1);
                        self.id(c.0);
                    }
                    FlowLimit::Head => self.number(2),
                    FlowLimit::Pump => self.number(3),
                    FlowLimit::Ramp => self.number(4),
                }
            }
            SlotReason::CapReached { clause } => {
                self.number(4);
                self.id(clause.0);
            }
            SlotReason::StorageLow => self.number(5),
            SlotReason::NoHead => self.number(6),
            SlotReason::WaitingForHead => self.number(7),
            SlotReason::GravityEnough => self.number(8),
            SlotReason::Assisting => self.number(9),
            SlotReason::Unavailable => self.number(10),
        }
    }

    fn release(&mut self, r: &PlannedRelease) {
        let PlannedRelease { tide, window, volume } = *r;
        self.0.i64(tide);
        self.window(&window);
        self.0.f64(volume.get());
    }

    fn shortfall(&mut self, s: &Shortfall) {
        let Shortfall { spill, volume, clauses } = s;
        self.window(spill);
        self.0.f64(volume.get());
        self.list(clauses, |sum, c| sum.id(c.0));
    }
}
