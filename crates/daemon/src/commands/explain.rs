//! `explain`: what a code means and what to do.

use anyhow::Result;
use clap::Args;

use crate::cli::Exit;

#[derive(Args, Debug)]
pub struct ExplainArgs {
    /// A code as an error shows it, e.g. S012
    pub code: String,
}

pub fn explain(args: &ExplainArgs) -> Result<Exit> {
    match site::explain(&args.code) {
        Some(e) => {
            say!("{}: {}\n\n{}", e.code, e.title, e.text);
            Ok(Exit::Done)
        }
        None => {
            eprintln!("there is no code {:?}; codes look like S012 or L003", args.code);
            Ok(Exit::BadInput)
        }
    }
}
