//! Good sites load, with the values that their files say, on the site datum and in UTC; and what
//! is lawful to write but worth a look is noted.

use model::{
    Applies, AssetKind, ClauseKind, LeaseHolder, LowLevel, NodalRule, OnStale, RestAction, Sense,
    SimulatedFaultKind, TideAnchor,
};
use units::{Level, Span, Utc};

use super::site::{changed, folder};

fn load(changes: &[(&str, &str, &str)]) -> model::Site {
    let dir = changed(changes);
    site::load(dir.path()).unwrap_or_else(|report| panic!("{report}"))
}

#[test]
fn fault_site_the_good_site_says_what_its_file_says() {
    let site = load(&[]);
    assert_eq!((site.name.as_str(), site.datum.as_str()), ("tarrow-works", "HD"));
    assert_eq!(site.port.nodal, NodalRule::MidYear);
    assert_eq!(site.port.constants.len(), 11);
    assert_eq!(site.port.constants[0].phase_lag_greenwich_deg, 170.0);
    let place = site.place_named("tarrow-outfall").unwrap();
    assert_eq!(place.differences.low_lag.spring, Span::minutes(117));
    assert_eq!(place.differences.low_level.neap, LowLevel::At(Level::of(-2.1)));
    assert_eq!(site.storages[0].inflow.peak_hour_utc, 10.0);
    let gate = site.asset_named("penstock").unwrap();
    assert_eq!((gate.lease, gate.lease_holder), (Span::seconds(120), LeaseHolder::Device));
    assert_eq!(gate.rest.lease_out, RestAction::Close);
    let AssetKind::Gate(kind) = &gate.kind else { panic!("{:?}", gate.kind) };
    assert_eq!(kind.stroke, Span::minutes(8));
    let level = site.signal_named("lagoon-level-a").unwrap();
    assert_eq!((level.unit.as_str(), level.value_max), ("m", 7.2));
    assert!((level.rate_max_per_s.unwrap() - 0.05 / 60.0).abs() < 1e-12);
    assert_eq!(site.settings.horizon, Span::hours(72));
    assert_eq!(site.simulation.as_ref().unwrap().constants.len(), 3);
    assert!(site.all_simulated());
    assert_eq!(site::check_notes(&site), []);
}

#[test]
fn fault_site_the_good_licence_says_what_its_file_says() {
    let site = load(&[]);
    let clauses = &site.licence.clauses;
    let numbers: Vec<_> = clauses.iter().map(|c| c.number.as_str()).collect();
    assert_eq!(numbers, ["2.1", "2.2", "2.3", "2.4", "2.5", "2.6", "2.7", "2.10"]);
    let ClauseKind::TideWindow { anchor, from, to, .. } = clauses[1].kind else {
        panic!("{:?}", clauses[1].kind)
    };
    let window = (anchor, from, to);
    assert_eq!(window, (TideAnchor::HighWater, Span::minutes(30), Span::minutes(210)));
    let ClauseKind::VolumePerTide { rounding, bands } = &clauses[4].kind else {
        panic!("{:?}", clauses[4].kind)
    };
    assert_eq!(rounding.step.get(), 0.1);
    let volumes: Vec<_> = bands.iter().map(|b| b.volume_max.get()).collect();
    assert_eq!(volumes, [0.0, 4800.0, 9000.0]);
    assert_eq!(bands[1].flow_max.map(|f| f.get()), Some(0.9));
    let ClauseKind::SignalGate { conditions, applies } = &clauses[7].kind else {
        panic!("{:?}", clauses[7].kind)
    };
    assert_eq!((conditions[0].limit, conditions[0].sense), (5.0, Sense::AtMost));
    assert_eq!((conditions[1].age_max, *applies), (Span::hours(24), Applies::Throughout));
    assert_eq!(clauses[0].governs.len(), 1);
    assert_eq!(clauses[1].governs.len(), 3);
    assert_eq!(clauses[1].governs[2].on_stale, OnStale::Hold);
}

#[test]
fn fault_site_other_spellings_and_choices_load() {
    let site = load(&[
        // Chart datum lies 5.40 m below HD: 1.80 m above it is -3.60 m HD.
        ("site.toml", "port_centre = \"-3.60 m HD\"", "port_centre = \"1.80 m Port Ansel CD\""),
        ("site.toml", "low_lag   = { neap = \"+0:46\"", "low_lag = { neap = \"-46 min\""),
        (
            "site.toml",
            "low_level = { neap = \"-2.1 m HD\", spring = \"-3.0 m HD\" }",
            "low_rise = { neap = \"+0.2 m\", spring = \"-0.1 m\" }",
        ),
        ("site.toml", "lease = \"120 s\"", "lease = \"2.5 min\""),
        ("site.toml", "valid = [\"2020-01-01T00:00:00Z\",", "valid = [2020-01-01T00:00:00Z,"),
        (
            "site.toml",
            "level_start = \"5.20 m HD\"",
            "level_start = \"5.20 m HD\"\nfaults = [{ kind = \"gate-jam\", subject = \"penstock\", from = \"2027-03-01T06:00:00Z\", to = \"2027-03-01T07:30Z\" }]",
        ),
        (
            "licence.toml",
            "governs = [{ assets = [\"penstock\", \"pump-1\", \"pump-2\"], on_stale = \"hold\" }]",
            "governs = [{ assets = [\"penstock\"], on_stale = \"reduced\", flow = \"0.60 m3/s\" }, { assets = [\"pump-1\", \"pump-2\"], on_stale = \"allow\" }]",
        ),
    ]);
    assert!((site.outlets[0].pipe.port_centre.get() + 3.6).abs() < 1e-12);
    let d = &site.places[0].differences;
    assert_eq!(d.low_lag.neap, Span::minutes(-46));
    assert!(matches!(d.low_level.spring, LowLevel::RiseOverPort(m) if m.get() == -0.1));
    assert_eq!(site.assets[0].lease, Span::seconds(150));
    assert_eq!(site.port.valid.start(), Utc::parse("2020-01-01T00:00:00Z").unwrap());
    let fault = &site.simulation.as_ref().unwrap().faults[0];
    assert_eq!((fault.kind, fault.subject.as_str()), (SimulatedFaultKind::GateJam, "penstock"));
    assert_eq!(fault.window.length(), Span::minutes(90));
    let stale: Vec<_> = site.licence.clauses[1].governs.iter().map(|g| g.on_stale).collect();
    assert!(matches!(stale[0], OnStale::Reduced(f) if f.get() == 0.6));
    assert_eq!(stale[1..], [OnStale::Allow, OnStale::Allow]);
}

#[test]
fn fault_site_a_real_adapter_has_a_command_and_settings() {
    let text = std::fs::read_to_string(folder("deploy/sites/tarrow-works").join("site.toml"));
    let text = text.unwrap();
    let simulation = text[text.find("[simulation]").unwrap()..].to_owned();
    let site = load(&[
        (
            "site.toml",
            "program = \"simulated-plant\"",
            "command = [\"./adapter\", \"-v\"]\nsettings = { port = \"502\", host = \"plc\" }",
        ),
        ("site.toml", &simulation, ""),
    ]);
    let program = model::AdapterProgram::Command(vec!["./adapter".to_owned(), "-v".to_owned()]);
    assert_eq!(site.adapters[0].program, program);
    let settings: Vec<_> = site.adapters[0].settings.iter().map(|s| s.0.as_str()).collect();
    assert_eq!(settings, ["port", "host"]);
    assert!(!site.all_simulated() && site.simulation.is_none());
}

#[test]
fn fault_site_the_path_may_be_the_file_and_digests_follow_every_byte() {
    let dir = folder("deploy/sites/tarrow-works");
    let by_folder = site::load(&dir).unwrap();
    let by_file = site::load(&dir.join("site.toml")).unwrap();
    assert_eq!(by_folder, by_file);
    assert_eq!(by_folder.site_digest.len(), 64);
    let other = load(&[("licence.toml", "permit to discharge", "Permit to discharge")]);
    assert_eq!(other.site_digest, by_folder.site_digest);
    assert_ne!(other.licence_digest, by_folder.licence_digest);
}

#[test]
fn fault_site_notes_say_what_is_worth_a_look() {
    let second = "[[clauses]]\nnumber = \"2.21\"\nwords = \"There shall be no release before HW +4:00.\"\nkind = \"tide-window\"\nplace = \"tarrow-outfall\"\nanchor = \"high-water\"\nfrom = \"+4:00\"\nto = \"+6:00\"\ngoverns = [{ assets = [\"penstock\"], on_stale = \"hold\" }]\n\n[[clauses]]\nnumber = \"2.3\"";
    let all =
        "governs = [{ assets = [\"penstock\", \"pump-1\", \"pump-2\"], on_stale = \"hold\" }]";
    let one = "governs = [{ assets = [\"penstock\", \"pump-1\"], on_stale = \"hold\" }]";
    let mut changes = vec![
        ("licence.toml", "clause_count = 8", "clause_count = 9"),
        ("licence.toml", "[[clauses]]\nnumber = \"2.3\"", second),
        ("licence.toml", "volume_max = \"4800 m3\"", "volume_max = \"0 m3\""),
        ("licence.toml", "volume_max = \"9000 m3\"", "volume_max = \"0 m3\""),
        ("site.toml", "\nlease_holder = \"device\"", "\nlease_holder = \"adapter\""),
        ("site.toml", "heartbeat_file = \"heartbeat\"", ""),
    ];
    changes.extend([("licence.toml", all, one); 7]);
    let notes = site::check_notes(&load(&changes));
    let found: Vec<_> = notes.iter().map(|n| (n.code, n.subject.as_str())).collect();
    let wanted = [
        ("N003", "asset penstock"),
        ("N001", "clauses 2.2 and 2.21"),
        ("N002", "asset pump-2"),
        ("N004", "clause 2.5"),
        ("N005", "settings"),
    ];
    assert_eq!(found, wanted);
    let bars: Vec<_> = notes.iter().map(|n| n.bars_automatic).collect();
    assert_eq!(bars, [true, true, false, true, false]);
}

#[test]
fn fault_site_the_second_site_loads() {
    let site = site::load(&folder("tests/sites/delaware")).unwrap_or_else(|r| panic!("{r}"));
    assert_eq!((site.port.name.as_str(), site.port.constants.len()), ("Lewes", 34));
    assert_eq!(site.licence.clauses.len(), 8);
    assert_eq!(site.zone.name(), "America/New_York");
    assert_eq!(site::check_notes(&site), []);
}
