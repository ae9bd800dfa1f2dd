//! Opening: state folder, clock, journal, adapters, socket, in that order; nothing runs before all
//! that it needs stands.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::mpsc::{Sender, SyncSender, channel, sync_channel};
use std::time::Duration;

use anyhow::{Context, Result};
use engine::{Carried, Config, PermitLife, State};
use host::{AdapterSpec, Host, HostEvent};
use journal::{Journal, JournalError, Opening, Task};
use model::{Adapter, AdapterProgram, Site, Term};
use record::{Fold, Note};
use units::Utc;

use super::input::Input;
use super::keeping::{self, Keeping};
use super::shell::{Parts, Shell};
use super::so_far::SoFar;
use super::{view, workers};
use crate::cli::RunArgs;
use crate::clock::{Clock, Watch};
use crate::{control, paths};

/// Host events that may wait for the loop before the adapters are held back.
const HOST_EVENTS: usize = 1024;
/// Real time that an adapter has for an answer.
const ANSWER_WITHIN: Duration = Duration::from_secs(5);

pub fn open(args: &RunArgs, site: Site) -> Result<Shell> {
    logging();
    let state_dir = args.site.state_dir();
    fs::create_dir_all(&state_dir)
        .with_context(|| format!("making the state folder {}", state_dir.display()))?;
    let clock = clock(args, &site, &state_dir)?;
    let (journal, fold, walked_from) = record_so_far(&state_dir, &site)
        .with_context(|| format!("opening the journal in {}", state_dir.display()))?;
    let mut carried: Carried = fold.clone().finish();
    let heartbeat = state_dir.join(site.settings.heartbeat_file.as_deref().unwrap_or("heartbeat"));
    carried.last_seen = carried.last_seen.max(last_beat(&heartbeat));
    let term = Term(journal.next_term());
    let rows = journal.rows();
    tracing::info!(
        term = term.0,
        rows,
        "journal verified{}",
        if walked_from == 0 { "" } else { ", the rest follows" }
    );
    let lifted = journal.lifted_from();
    let (to, inbox) = channel::<Input>();
    let (tokens_to, tokens) = sync_channel(HOST_EVENTS);
    let site = Arc::new(site);
    let parts = Parts {
        state: State::new(site.clone(), config(&clock)?),
        journal: journal.start(to.clone()),
        view: view::start(&state_dir, rows, to.clone())?,
        host: start_host(&site, args, &state_dir, term, clock, &to, tokens_to)?,
        jobs: workers::start(site.clone(), to.clone())?,
        watch: Watch::new(None),
        heartbeat,
        rows: args.rows,
        site_arg: args.site.site.display().to_string(),
        site,
        clock,
        term,
        inbox,
        tokens,
    };
    control::listen(&paths::socket(&state_dir), to.clone())?;
    signals(to)?;
    let keeping = Keeping::new(&parts.site, &args.site.site, state_dir, clock.utc())?;
    let so_far = SoFar::new(fold, walked_from, rows);
    let mut shell = Shell::new(parts, carried, keeping, so_far);
    if let Some(from) = lifted {
        shell.submit_alone(vec![Note::Migrated { from, to: journal::FORM }])?;
    }
    if walked_from > 0 {
        keeping::start(&shell, Task::Verify)?;
    }
    Ok(shell)
}

/// The journal, what its rows add up to, and the row after which they were verified: that of the last
/// snapshot, if there is one that reads, and else 0.
fn record_so_far(dir: &Path, site: &Site) -> Result<(Journal, Fold, u64), JournalError> {
    let opening = Opening::begin(dir)?;
    let kept = opening.last_of_kind(record::kind::SNAPSHOT)?.and_then(|row| {
        match record::decode_note(&row).ok()? {
            Note::Snapshot { of_seq, bytes } => Some((of_seq, Fold::restore(site, &bytes).ok()?)),
            _ => None,
        }
    });
    let (after, mut fold) = kept.unwrap_or_else(|| (0, Fold::new(site)));
    let journal = opening.walk(after, &mut |row| fold.push(&row))?;
    Ok((journal, fold, after))
}

/// When the last life of the daemon was last well: an outage is counted from here, since a quiet
/// hour leaves no row.
fn last_beat(heartbeat: &Path) -> Option<Utc> {
    Utc::parse(fs::read_to_string(heartbeat).ok()?.trim()).ok()
}

fn logging() {
    // A second daemon in one process (a test) finds it set already.
    let _ = tracing_subscriber::fmt().with_writer(std::io::stderr).with_target(false).try_init();
}

fn clock(args: &RunArgs, site: &Site, state_dir: &Path) -> Result<Clock> {
    match &site.simulation {
        Some(simulation) if site.all_simulated() => {
            Clock::simulated(&paths::clock(state_dir), args.speed, simulation.start)
        }
        _ => Ok(Clock::real()),
    }
}

/// The build is the digest of the running binary: a standing authorisation dies with it.
fn config(clock: &Clock) -> Result<Config> {
    let binary = std::env::current_exe().context("finding the running binary")?;
    let bytes = fs::read(&binary).context("reading the running binary")?;
    let permit_life = match clock.speed() {
        1 => PermitLife::REAL,
        speed => PermitLife::simulated(speed),
    };
    Ok(Config { build: blake3::hash(&bytes).to_hex().to_string(), permit_life })
}

fn start_host(
    site: &Arc<Site>,
    args: &RunArgs,
    state_dir: &Path,
    term: Term,
    clock: Clock,
    to: &Sender<Input>,
    tokens: SyncSender<()>,
) -> Result<Host> {
    let specs = site
        .adapters
        .iter()
        .map(|a| spec(a, site, args, state_dir, term, &clock))
        .collect::<Result<Vec<_>>>()?;
    let to = to.clone();
    let events = Arc::new(move |event: HostEvent| {
        // A token a waiting event: past so many, the adapters wait and nothing piles up.
        if tokens.send(()).is_ok() {
            let _ = to.send(Input::Host(event));
        }
    });
    Ok(Host::start(
        specs,
        &(events as host::Events),
        &(Arc::new(move || clock.boot()) as host::Now),
    )?)
}

fn spec(
    adapter: &Adapter,
    site: &Site,
    args: &RunArgs,
    state_dir: &Path,
    term: Term,
    clock: &Clock,
) -> Result<AdapterSpec> {
    let mut settings: BTreeMap<String, String> = adapter.settings.iter().cloned().collect();
    let (program, program_args) = match &adapter.program {
        AdapterProgram::Command(line) => {
            let (program, rest) = line.split_first().context("an adapter without a program")?;
            (PathBuf::from(program), rest.to_vec())
        }
        AdapterProgram::SimulatedPlant => {
            let own = std::env::current_exe().context("finding the running binary")?;
            settings.extend(simulated(args, state_dir, clock, &own)?);
            (own, vec!["simulated-adapter".to_owned()])
        }
    };
    Ok(AdapterSpec {
        id: adapter.id.0,
        name: adapter.name.clone(),
        program,
        args: program_args,
        settings,
        site: site.name.clone(),
        term: term.0,
        answer_within: ANSWER_WITHIN,
    })
}

/// What the simulated adapter needs: the plant's folder, how to start the plant, and the clock.
fn simulated(
    args: &RunArgs,
    state_dir: &Path,
    clock: &Clock,
    own: &Path,
) -> Result<Vec<(String, String)>> {
    let text = |p: &Path| p.display().to_string();
    let absolute = |p: &Path| std::path::absolute(p).context("an absolute path");
    let folder = absolute(&paths::plant(state_dir))?;
    let site = absolute(&args.site.site)?;
    let m = clock.mapping().context("a simulated plant needs the simulated clock")?;
    let plant_args = [
        "simulated-plant".to_owned(),
        format!("--site={}", text(&site)),
        format!("--dir={}", text(&folder)),
        format!("--real-boot-origin-ns={}", m.real_boot_origin_ns),
        format!("--sim-boot-origin-ns={}", m.sim_boot_origin_ns),
        format!("--sim-utc-origin-us={}", m.sim_utc_origin_us),
        format!("--speed={}", m.speed),
    ];
    let pair = |k: &str, v: String| (k.to_owned(), v);
    Ok(vec![
        pair("plant_folder", text(&folder)),
        pair("plant_program", text(own)),
        pair("plant_args", serde_json::to_string(&plant_args)?),
        pair("clock_real_boot_origin_ns", m.real_boot_origin_ns.to_string()),
        pair("clock_sim_boot_origin_ns", m.sim_boot_origin_ns.to_string()),
        pair("clock_sim_utc_origin_us", m.sim_utc_origin_us.to_string()),
        pair("clock_speed", m.speed.to_string()),
    ])
}

/// SIGTERM and SIGINT stop cleanly; a second one does nothing more.
fn signals(to: Sender<Input>) -> Result<()> {
    use signal_hook::consts::{SIGINT, SIGTERM};
    let mut signals = signal_hook::iterator::Signals::new([SIGINT, SIGTERM])?;
    std::thread::Builder::new().name("signals".to_owned()).spawn(move || {
        for _ in signals.forever() {
            if to.send(Input::Stop).is_err() {
                return;
            }
        }
    })?;
    Ok(())
}
