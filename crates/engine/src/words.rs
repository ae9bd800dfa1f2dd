//! Causes in plain words, for people; the record keeps the fields.

use model::{About, By, Cause, Is, MustBe, Site};

/// One line: who says so, the fact, and what it would have to be.
pub fn cause(site: &Site, c: &Cause) -> String {
    format!("{}: {} {}; must be {}", by(site, c.by), about(site, c.fact.about), is(&c.fact.is), {
        must_be(&c.fact.must_be)
    })
}

pub fn by(site: &Site, by: By) -> String {
    match by {
        By::AssetState => "asset state".to_owned(),
        By::Interlock(code) => format!("interlock {code}"),
        By::Latch => "latch".to_owned(),
        By::Clause(c) => format!("clause {}", site.licence.clause(c).number),
        By::Mode => "mode".to_owned(),
        By::Armed => "arming".to_owned(),
        By::Person => "operator".to_owned(),
        By::Plan => "plan".to_owned(),
    }
}

pub fn about(site: &Site, about: About) -> String {
    let asset = |a| &site.asset(a).name;
    match about {
        About::Signal(s) => {
            let s = site.signal(s);
            format!("{} ({})", s.name, s.unit)
        }
        About::Now => "the time".to_owned(),
        About::Mode => "the mode".to_owned(),
        About::Latch => "the latch".to_owned(),
        About::ClockTrust => "the clock".to_owned(),
        About::Journal => "the journal".to_owned(),
        About::Forecast => "the forecast".to_owned(),
        About::Adapter(a) => format!("adapter {}", site.adapters[a.index()].name),
        About::Position(a) => format!("the position of {}", asset(a)),
        About::Lock(a) => format!("the lock on {}", asset(a)),
        About::Selector(a) => format!("the selector of {}", asset(a)),
        About::Hold(a) => format!("the hold on {}", asset(a)),
        About::Confirmation(a) => format!("the yes for {}", asset(a)),
        About::LastMove(a) => format!("the last movement of {}", asset(a)),
        About::VolumeThisTide => "volume this tide (m3)".to_owned(),
        About::VolumeRolling => "volume in the rolling span (m3)".to_owned(),
        About::VolumeMonth => "volume this month (m3)".to_owned(),
        About::MeanFlow => "the mean flow (m3/s)".to_owned(),
        About::Plan => "the plan".to_owned(),
    }
}

pub fn is(is: &Is) -> String {
    match is {
        Is::Number(v) => format!("is {v:.3}"),
        Is::Instant(t) => format!("is {t}"),
        Is::Words(w) => format!("is \"{w}\""),
        Is::Nothing => "is missing".to_owned(),
    }
}

pub fn must_be(must: &MustBe) -> String {
    match must {
        MustBe::AtLeast(v) => format!("{v:.3} or more"),
        MustBe::AtMost(v) => format!("{v:.3} or less"),
        MustBe::Inside(w) => format!("in {w}"),
        MustBe::After(t) => format!("after {t}"),
        MustBe::Words(w) => (*w).to_owned(),
    }
}
