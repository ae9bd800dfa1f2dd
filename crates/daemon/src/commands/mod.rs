//! The commands, one a file.

pub mod check;
pub mod explain;
pub mod journal;
pub mod keep;
pub mod now;
pub mod order;
pub mod plan;
pub mod simulated;
pub mod tides;
pub mod why;
pub mod windows;

use std::path::Path;

use anyhow::{Result, bail};
use indicatif::{ProgressBar, ProgressStyle};
use model::{Forecast, Site};
use serde::de::DeserializeOwned;
use units::{Span, Utc, Window};

use crate::cli::{Exit, SiteArgs, SpanArgs};
use crate::clock::Clock;
use crate::control::{Request, Response, ask};
use crate::paths;

/// Loads the site, or prints every fault of its files and says so.
pub fn load(path: &Path, json: bool) -> Option<Site> {
    match site::load(path) {
        Ok(site) => Some(site),
        Err(report) => {
            check::print_report(&report, json);
            None
        }
    }
}

/// The span that a reading command looks at: from `--at` (or now) for `--days`.
pub fn span(args: &SpanArgs) -> Result<Window> {
    let from = match &args.at {
        Some(text) => Utc::parse(text)?,
        None => Clock::real().utc(),
    };
    Ok(Window::new(from, from + Span::days(i64::from(args.days.max(1))))?)
}

/// A forecast that covers `span` with whole tides round it.
pub fn forecast(site: &Site, span: &Window) -> Result<Forecast> {
    let grid = Span::minutes(5);
    let as_of = span.start().floor_to(grid);
    let wide = Window::new(as_of - Span::hours(30), span.end().ceil_to(grid) + Span::hours(1))?;
    let Some(wide) = wide.intersect(&site.port.valid) else {
        bail!(
            "{span} lies outside the span of the tide constants ({}); \
             give newer constants in site.toml, [port] valid",
            site.port.valid
        );
    };
    Ok(nowcast::forecast(site, as_of, wide)?)
}

/// A bar on a terminal, nothing elsewhere.
pub fn progress(what: &'static str) -> ProgressBar {
    let bar = ProgressBar::no_length();
    let style = ProgressStyle::with_template("{msg} {wide_bar} {human_pos}/{human_len} {eta}");
    bar.set_style(style.expect("the template is one"));
    bar.with_message(what)
}

/// Asks the running daemon; without one, says how to start it.
pub fn from_daemon<V: DeserializeOwned>(
    args: &SiteArgs,
    request: &Request,
) -> Result<std::result::Result<V, Exit>> {
    let state = args.state_dir();
    match ask(&paths::socket(&state), request)? {
        Some(Response::Ok(value)) => Ok(Ok(serde_json::from_value(value)?)),
        Some(Response::Refused(why)) => {
            eprintln!("refused: {why}");
            Ok(Err(Exit::Refused))
        }
        None => {
            eprintln!(
                "no daemon runs this site (no answer at {}); start one: tidereeve run {}",
                paths::socket(&state).display(),
                args.site.display()
            );
            Ok(Err(Exit::Environment))
        }
    }
}
