//! Volumes by tide, by any rolling span, and by month.

use units::Window;

use crate::Judgement;
use crate::record::{Finding, Rule, Rules, Sample};
use crate::water::released_in;

/// What a sample a minute apart from an edge may hide.
const SLACK_M3: f64 = 1.0;

pub(crate) fn judge(samples: &[Sample], rules: &Rules, j: &mut Judgement) {
    for a in &rules.allowed {
        let m3 = released_in(samples, &a.window);
        if m3 > a.volume_max_m3 + SLACK_M3 {
            let what = format!("{m3:.0} m3 on a tide of {:.0}", a.volume_max_m3);
            j.findings.push(Finding { rule: Rule::TideVolume, at: a.window.start(), what });
        }
    }
    let mut from = 0;
    for s in samples {
        while s.utc - samples[from].utc > rules.rolling {
            from += 1;
        }
        let m3 = s.released_m3 - samples[from].released_m3;
        if m3 > rules.rolling_max_m3 + SLACK_M3 {
            let what = format!("{m3:.0} m3 within {}", rules.rolling);
            j.findings.push(Finding { rule: Rule::RollingVolume, at: s.utc, what });
        }
    }
    months(samples, &rules.months, j);
}

fn months(samples: &[Sample], months: &[(Window, f64)], j: &mut Judgement) {
    for (month, most) in months {
        let m3 = released_in(samples, month);
        if m3 > most + SLACK_M3 {
            let what = format!("{m3:.0} m3 in a month of {most:.0}");
            j.findings.push(Finding { rule: Rule::MonthVolume, at: month.start(), what });
        }
    }
}
