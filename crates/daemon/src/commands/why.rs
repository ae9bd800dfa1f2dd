//! `why`: why an asset is, was or will be as it is, and what would have to change.

use anyhow::Result;
use clap::Args;

use super::from_daemon;
use crate::cli::{Exit, SiteArgs};
use crate::control::Request;
use crate::show::{WhyView, print_why};

#[derive(Args, Debug)]
pub struct WhyArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    /// The asset, by its name in the site file
    pub asset: String,
    /// Then instead of now: a past instant is answered from the record, a future one from the plan
    pub at: Option<String>,
}

pub fn why(args: &WhyArgs) -> Result<Exit> {
    let request = Request::Why { asset: args.asset.clone(), at: args.at.clone() };
    match from_daemon::<WhyView>(&args.site, &request)? {
        Ok(view) if args.site.json => say!("{}", serde_json::to_string_pretty(&view)?),
        Ok(view) => print_why(&view),
        Err(exit) => return Ok(exit),
    }
    Ok(Exit::Done)
}
