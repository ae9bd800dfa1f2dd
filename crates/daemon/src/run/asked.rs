//! Questions and acts from the socket.

use std::sync::mpsc::{SyncSender, channel};
use std::thread;

use anyhow::Result;
use engine::{ActKind, Event};
use record::Row;
use serde::Serialize;
use units::Utc;

use super::shell::Shell;
use super::{acts, keeping, view};
use crate::control::{Asked, Request, Response};
use crate::show::{WhyView, now_view, plan_view, why_planned, why_view};

/// Rows that one question may ask for.
const ROWS_MOST: usize = 20_000;

pub fn answer(shell: &mut Shell, asked: Asked) -> Result<()> {
    let Asked { request, peer, reply } = asked;
    match request {
        Request::Now => {
            let view = now_view(&shell.parts.state, &shell.stamp());
            say(&reply, &view);
        }
        Request::Plan => match shell.parts.state.plan(0) {
            Some(plan) => say(&reply, &plan_view(&shell.parts.site, plan)),
            None => refuse(&reply, "there is no plan yet"),
        },
        Request::Why { asset, at } => why(shell, &asset, at.as_deref(), reply),
        Request::Rows { from, limit } => {
            let limit = usize::try_from(limit).unwrap_or(ROWS_MOST).min(ROWS_MOST);
            rows(shell, from, limit, reply, |rows| to_json(&rows));
        }
        Request::View => say(&reply, &view::state(shell)),
        Request::Keep(what) => return keeping::asked(shell, what, reply),
        Request::Act { by, reason, act } => {
            let site = shell.parts.site.clone();
            match acts::checked(&site, by, reason, peer, &act) {
                Ok(act) => {
                    if act.kind == ActKind::TrustClock {
                        shell.parts.watch.vouch();
                    }
                    return shell.feed_for(Event::Act(act), Some(reply));
                }
                Err(e) => refuse(&reply, &format!("{e:#}")),
            }
        }
    }
    Ok(())
}

fn say(reply: &SyncSender<Response>, view: &impl Serialize) {
    let response = match serde_json::to_value(view) {
        Ok(value) => Response::Ok(value),
        Err(e) => Response::Refused(format!("the answer is no JSON: {e}")),
    };
    // Whoever asked may have gone away.
    let _ = reply.send(response);
}

fn refuse(reply: &SyncSender<Response>, why: &str) {
    let _ = reply.send(Response::Refused(why.to_owned()));
}

/// Now from the state, later from the plan, earlier from the record.
fn why(shell: &Shell, asset: &str, at: Option<&str>, reply: SyncSender<Response>) {
    let parts = &shell.parts;
    let id = match acts::asset(&parts.site, asset) {
        Ok(id) => id,
        Err(e) => return refuse(&reply, &format!("{e:#}")),
    };
    let stamp = shell.stamp();
    let at = match at.map(Utc::parse).transpose() {
        Ok(at) => at.unwrap_or(stamp.utc),
        Err(e) => return refuse(&reply, &e.to_string()),
    };
    if at == stamp.utc {
        say(&reply, &why_view(&parts.state, &stamp, id));
    } else if at > stamp.utc {
        match why_planned(&parts.state, id, at) {
            Some(view) => say(&reply, &view),
            None => refuse(&reply, "the plan does not reach that far"),
        }
    } else {
        let name = asset.to_owned();
        rows(shell, 1, usize::MAX, reply, move |rows| past_why(&name, at, &rows));
    }
}

/// The last decision on the asset at or before `at`, as it stands in the record.
fn past_why(asset: &str, at: Utc, rows: &[Row]) -> Response {
    let decided = |r: &&Row| r.kind == record::kind::DECISION && r.subject == asset && r.utc <= at;
    match rows.iter().rfind(decided) {
        Some(row) => {
            let view = WhyView::recorded(asset, row.utc, row.seq, &record::describe(row));
            serde_json::to_value(view)
                .map_or_else(|e| Response::Refused(e.to_string()), Response::Ok)
        }
        None => Response::Refused(format!("the record holds no decision on {asset} before {at}")),
    }
}

/// Reads through the journal in slices, off the loop, and answers when all is there.
fn rows(
    shell: &Shell,
    from: u64,
    limit: usize,
    reply: SyncSender<Response>,
    answer: impl FnOnce(Vec<Row>) -> Response + Send + 'static,
) {
    let (to, slices) = channel();
    if let Err(e) = shell.parts.journal.read(from, limit, to) {
        return refuse(&reply, &e.to_string());
    }
    thread::spawn(move || {
        let rows: Vec<Row> = slices.iter().flatten().collect();
        let _ = reply.send(answer(rows));
    });
}

fn to_json(rows: &[Row]) -> Response {
    Response::Ok(rows.iter().map(crate::show::row_json).collect())
}
