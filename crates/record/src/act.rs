//! Acts of people.

use engine::{Act, ActKind};

use crate::RecordError;
use crate::reader::{Reader, unknown};
use crate::writer::Writer;

pub(crate) fn put(w: &mut Writer<'_>, act: &Act) {
    w.text(&act.by);
    w.text(&act.reason);
    w.text(&act.peer);
    match &act.kind {
        ActKind::Mode(mode) => {
            w.u8(1);
            w.mode(*mode);
        }
        ActKind::Authorise { until } => {
            w.u8(2);
            w.utc(*until);
        }
        ActKind::Confirm { asset } => {
            w.u8(3);
            w.asset(*asset);
        }
        ActKind::Hold { asset, until } => {
            w.u8(4);
            w.asset(*asset);
            w.utc(*until);
        }
        ActKind::Hand { asset, setting, until } => {
            w.u8(5);
            w.asset(*asset);
            w.percent(*setting);
            w.utc(*until);
        }
        ActKind::Auto { asset } => {
            w.u8(6);
            w.asset(*asset);
        }
        ActKind::OutOfService { asset, locked } => {
            w.u8(7);
            w.asset(*asset);
            w.flag(*locked);
        }
        ActKind::Reset { asset } => {
            w.u8(8);
            w.option(*asset, |w, a| w.asset(a));
        }
        ActKind::Rest { asset } => {
            w.u8(9);
            w.option(*asset, |w, a| w.asset(a));
        }
        ActKind::TrustClock => w.u8(10),
    }
}

pub(crate) fn take(r: &mut Reader<'_>) -> Result<Act, RecordError> {
    let (by, reason, peer) = (r.text("by")?, r.text("reason")?, r.text("peer")?);
    let kind = match r.u8("act")? {
        1 => ActKind::Mode(r.mode()?),
        2 => ActKind::Authorise { until: r.utc("until")? },
        3 => ActKind::Confirm { asset: r.asset()? },
        4 => ActKind::Hold { asset: r.asset()?, until: r.utc("until")? },
        5 => ActKind::Hand {
            asset: r.asset()?,
            setting: r.percent("setting")?,
            until: r.utc("until")?,
        },
        6 => ActKind::Auto { asset: r.asset()? },
        7 => ActKind::OutOfService { asset: r.asset()?, locked: r.flag("locked")? },
        8 => ActKind::Reset { asset: r.option("asset", |r| r.asset())? },
        9 => ActKind::Rest { asset: r.option("asset", |r| r.asset())? },
        10 => ActKind::TrustClock,
        n => return Err(unknown("act", n)),
    };
    Ok(Act { by, reason, peer, kind })
}

/// The asset that an act is about, if it is about one.
pub(crate) fn asset(act: &Act) -> Option<model::AssetId> {
    match act.kind {
        ActKind::Confirm { asset }
        | ActKind::Hold { asset, .. }
        | ActKind::Hand { asset, .. }
        | ActKind::Auto { asset }
        | ActKind::OutOfService { asset, .. } => Some(asset),
        ActKind::Reset { asset } | ActKind::Rest { asset } => asset,
        ActKind::Mode(_) | ActKind::Authorise { .. } | ActKind::TrustClock => None,
    }
}
