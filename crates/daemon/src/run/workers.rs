//! The worker: forecasts and plans, one at a time, off the loop's thread. How long they take
//! changes nothing but when the result arrives.

use std::sync::Arc;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::thread;

use anyhow::Result;
use engine::{Job, JobKind, Product};
use model::{JobId, Site};

/// A finished job on its way to the loop.
#[derive(Debug)]
pub struct Done {
    pub job: JobId,
    pub product: Product,
}

/// Does one job. Pure: the same job gives the same product.
pub fn work(site: &Site, job: &Job) -> Product {
    match &job.kind {
        JobKind::Forecast(request) => match nowcast::forecast(site, request.as_of, request.span) {
            Ok(forecast) => Product::Forecast(Box::new(forecast)),
            Err(e) => Product::Failed(e.to_string()),
        },
        JobKind::Plan(request) => match planner::plan(site, request) {
            Ok(plan) => audited(site, request, plan),
            Err(e) => Product::Failed(e.to_string()),
        },
    }
}

/// A plan that an independent reader finds fault with is not used.
fn audited(site: &Site, request: &model::PlanRequest, plan: model::Plan) -> Product {
    let findings = planner::audit(site, request, &plan);
    match findings.first() {
        None => Product::Plan(Box::new(plan)),
        Some(first) => Product::Failed(format!("the plan does not pass its audit: {first}")),
    }
}

/// Starts the worker; jobs go in by the sender, products come out to `to`.
pub fn start<T: From<Done> + Send + 'static>(
    site: Arc<Site>,
    to: Sender<T>,
) -> Result<Sender<Job>> {
    let (jobs, queue): (Sender<Job>, Receiver<Job>) = channel();
    thread::Builder::new().name("worker".to_owned()).spawn(move || {
        for job in queue {
            let product = work(&site, &job);
            if to.send(T::from(Done { job: job.id, product })).is_err() {
                return;
            }
        }
    })?;
    Ok(jobs)
}
