//! `order`: a person's act, with a name and a reason.

use anyhow::Result;
use clap::{Args, Subcommand};
use serde_json::Value;

use super::from_daemon;
use crate::cli::{Exit, SiteArgs};
use crate::control::{ActRequest, Request};

#[derive(Args, Debug)]
pub struct OrderArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    /// Who orders it
    #[arg(long, global = true, default_value = "")]
    pub by: String,
    /// Why
    #[arg(long, global = true, default_value = "")]
    pub reason: String,
    #[command(subcommand)]
    pub act: OrderAct,
}

#[derive(Subcommand, Debug)]
pub enum OrderAct {
    /// observe (commands nothing), advise (each release waits for a yes) or automatic
    Mode { mode: String },
    /// Automatic may resume by itself after a restart, until an instant
    Authorise {
        #[arg(long)]
        until: String,
    },
    /// Yes to the whole of the asset's next (or running) release
    Confirm { asset: String },
    /// Keep the asset at rest until an instant
    Hold {
        asset: String,
        #[arg(long)]
        until: String,
    },
    /// Drive the asset by hand until an instant; guard and interlock still hold
    Hand {
        asset: String,
        setting_percent: f64,
        #[arg(long)]
        until: String,
    },
    /// Give the asset back to the program
    Auto { asset: String },
    /// Lock the asset out in your name; --clear gives it back, by the same name only
    OutOfService {
        asset: String,
        #[arg(long)]
        clear: bool,
    },
    /// Clear an asset's trip, or the safe latch, once its cause is gone
    Reset { asset: Option<String> },
    /// Send the asset (or all) to rest now
    Rest { asset: Option<String> },
    /// Vouch for the clock after you have checked it
    TrustClock,
}

pub fn order(args: &OrderArgs) -> Result<Exit> {
    let act = match &args.act {
        OrderAct::Mode { mode } => ActRequest::Mode { mode: mode.clone() },
        OrderAct::Authorise { until } => ActRequest::Authorise { until: until.clone() },
        OrderAct::Confirm { asset } => ActRequest::Confirm { asset: asset.clone() },
        OrderAct::Hold { asset, until } => {
            ActRequest::Hold { asset: asset.clone(), until: until.clone() }
        }
        OrderAct::Hand { asset, setting_percent, until } => ActRequest::Hand {
            asset: asset.clone(),
            setting_percent: *setting_percent,
            until: until.clone(),
        },
        OrderAct::Auto { asset } => ActRequest::Auto { asset: asset.clone() },
        OrderAct::OutOfService { asset, clear } => {
            ActRequest::OutOfService { asset: asset.clone(), clear: *clear }
        }
        OrderAct::Reset { asset } => ActRequest::Reset { asset: asset.clone() },
        OrderAct::Rest { asset } => ActRequest::Rest { asset: asset.clone() },
        OrderAct::TrustClock => ActRequest::TrustClock,
    };
    let request = Request::Act { by: args.by.clone(), reason: args.reason.clone(), act };
    match from_daemon::<Value>(&args.site, &request)? {
        Ok(answer) if args.site.json => say!("{answer}"),
        Ok(answer) => say!("{}", answer.as_str().unwrap_or_default()),
        Err(exit) => return Ok(exit),
    }
    Ok(Exit::Done)
}
