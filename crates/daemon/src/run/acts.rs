//! A request from the socket, checked into an act on this site.

use anyhow::{Context, Result, bail};
use engine::{Act, ActKind, Mode};
use model::{AssetId, Site};
use units::{Percent, Utc};

use crate::control::ActRequest;

pub fn checked(
    site: &Site,
    by: String,
    reason: String,
    peer: String,
    r: &ActRequest,
) -> Result<Act> {
    Ok(Act { by, reason, peer, kind: kind(site, r)? })
}

pub fn asset(site: &Site, name: &str) -> Result<AssetId> {
    match site.asset_named(name) {
        Some(asset) => Ok(asset.id),
        None => {
            let names: Vec<&str> = site.assets.iter().map(|a| a.name.as_str()).collect();
            bail!("{name:?} is no asset of this site; it has: {}", names.join(", "))
        }
    }
}

fn kind(site: &Site, r: &ActRequest) -> Result<ActKind> {
    let one = |name: &str| asset(site, name);
    let until = |text: &str| Utc::parse(text).context("until when?");
    let maybe = |name: &Option<String>| name.as_deref().map(one).transpose();
    Ok(match r {
        ActRequest::Mode { mode } => ActKind::Mode(mode_named(mode)?),
        ActRequest::Authorise { until: t } => ActKind::Authorise { until: until(t)? },
        ActRequest::Confirm { asset } => ActKind::Confirm { asset: one(asset)? },
        ActRequest::Hold { asset, until: t } => {
            ActKind::Hold { asset: one(asset)?, until: until(t)? }
        }
        ActRequest::Hand { asset, setting_percent, until: t } => ActKind::Hand {
            asset: one(asset)?,
            setting: setting(*setting_percent)?,
            until: until(t)?,
        },
        ActRequest::Auto { asset } => ActKind::Auto { asset: one(asset)? },
        ActRequest::OutOfService { asset, clear } => {
            ActKind::OutOfService { asset: one(asset)?, locked: !clear }
        }
        ActRequest::Reset { asset } => ActKind::Reset { asset: maybe(asset)? },
        ActRequest::Rest { asset } => ActKind::Rest { asset: maybe(asset)? },
        ActRequest::TrustClock => ActKind::TrustClock,
    })
}

fn mode_named(name: &str) -> Result<Mode> {
    match name {
        "observe" => Ok(Mode::Observe),
        "advise" => Ok(Mode::Advise),
        "automatic" => Ok(Mode::Automatic),
        other => bail!("{other:?} is no mode; the modes are observe, advise and automatic"),
    }
}

fn setting(percent: f64) -> Result<Percent> {
    if !(0.0..=100.0).contains(&percent) {
        bail!("{percent} is no setting: it must be 0 to 100 percent");
    }
    Ok(Percent::clamped(percent))
}
