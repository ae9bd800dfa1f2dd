//! `now`: what is happening, what comes next, is anything wrong.

use anyhow::Result;

use super::from_daemon;
use crate::cli::{Exit, SiteArgs};
use crate::control::Request;
use crate::show::{NowView, print_now};

pub fn now(args: &SiteArgs) -> Result<Exit> {
    match from_daemon::<NowView>(args, &Request::Now)? {
        Ok(view) if args.json => say!("{}", serde_json::to_string_pretty(&view)?),
        Ok(view) => print_now(&view),
        Err(exit) => return Ok(exit),
    }
    Ok(Exit::Done)
}
