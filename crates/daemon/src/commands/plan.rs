//! `plan`: the plan, with a reason for every slot. It moves nothing.

use std::sync::Arc;

use anyhow::{Result, bail};
use clap::Args;
use engine::{ClockTrust, Config, Effects, Event, PermitLife, Stamp, State, step};
use model::{Plan, Reading, Site, Term};
use units::{Mono, Utc};

use super::load;
use crate::cli::{Exit, SiteArgs};
use crate::clock::Clock;
use crate::control::{Request, Response, ask};
use crate::paths;
use crate::run::work;
use crate::show::{PlanView, plan_view, print_plan};

#[derive(Args, Debug)]
pub struct PlanArgs {
    #[command(flatten)]
    pub site: SiteArgs,
    /// As if it were this instant [default: the running daemon's plan, else from now]
    #[arg(long)]
    pub at: Option<String>,
    /// With this storage level, m above the site datum [default: the lowest working level]
    #[arg(long)]
    pub level: Option<f64>,
}

pub fn plan(args: &PlanArgs) -> Result<Exit> {
    let Some(site) = load(&args.site.site, args.site.json) else { return Ok(Exit::BadInput) };
    let asked = args.at.is_some() || args.level.is_some();
    let running = if asked { None } else { ask_daemon(args)? };
    let view = match running {
        Some(view) => view,
        None => {
            let at = args.at.as_deref().map(Utc::parse).transpose()?;
            let lowest = site.storages.first().map_or(0.0, |s| s.level_lowest_working.get());
            let level = args.level.unwrap_or(lowest);
            let site = Arc::new(site);
            let made = offline(&site, at.unwrap_or_else(|| Clock::real().utc()), level)?;
            if !args.site.json {
                say!("no daemon asked: with the storage at {level:.2} m, and all available\n");
            }
            plan_view(&site, &made)
        }
    };
    if args.site.json {
        say!("{}", serde_json::to_string_pretty(&view)?);
    } else {
        print_plan(&view);
    }
    Ok(Exit::Done)
}

fn ask_daemon(args: &PlanArgs) -> Result<Option<PlanView>> {
    let state = args.site.state_dir();
    match ask(&paths::socket(&state), &Request::Plan)? {
        Some(Response::Ok(value)) => Ok(Some(serde_json::from_value(value)?)),
        Some(Response::Refused(why)) => bail!("{why}"),
        None => Ok(None),
    }
}

/// The plan that the engine itself would ask for at `at`, with all assets at rest and available.
fn offline(site: &Arc<Site>, at: Utc, level_m: f64) -> Result<Plan> {
    let config = Config { build: String::new(), permit_life: PermitLife::REAL };
    let mut state = State::new(site.clone(), config);
    let mut fx = Effects::default();
    let mut seq = 0;
    let mut feed = |event: Event, fx: &mut Effects, state: &mut State| {
        seq += 1;
        let (term, trust) = (Term(1), ClockTrust::Trusted);
        let stamp = Stamp { seq, term, utc: at, boot: Mono::from_nanos(seq), trust };
        step(state, &stamp, event, fx);
    };
    feed(Event::Started(Box::default()), &mut fx, &mut state);
    let mut jobs = std::mem::take(&mut fx.jobs);
    for adapter in &site.adapters {
        feed(Event::AdapterUp(adapter.id), &mut fx, &mut state);
        jobs.append(&mut fx.jobs);
    }
    feed(Event::Frame(calm(site, at, level_m)), &mut fx, &mut state);
    jobs.append(&mut fx.jobs);
    while let Some(job) = jobs.pop() {
        let product = work(site, &job);
        if let engine::Product::Failed(why) = &product {
            bail!("{why}");
        }
        feed(Event::JobDone { job: job.id, product }, &mut fx, &mut state);
        jobs.append(&mut fx.jobs);
        if let Some(plan) = state.plan(0) {
            return Ok(plan.clone());
        }
    }
    bail!("no plan could be asked for: the storage level {level_m} m is not within its range")
}

/// Readings of a site at rest: the storage at the level given, every other signal at the least that
/// it can be (positions shut, panels on remote).
fn calm(site: &Site, at: Utc, level_m: f64) -> Vec<Reading> {
    let level = |s: &model::Signal| site.storages.iter().any(|o| o.level_signals.contains(&s.id));
    let value = |s: &model::Signal| if level(s) { level_m } else { s.value_min };
    let read = |s: &model::Signal| Reading { signal: s.id, value: value(s), source_good: true, at };
    site.signals.iter().map(read).collect()
}
