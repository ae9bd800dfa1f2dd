//! Wrong site files: each is the good Tarrow Works with one change, and what must be said of it.

/// One wrong site: in `file`, `find` (which stands there once) becomes `replace`.
pub struct Wrong {
    pub name: &'static str,
    pub file: &'static str,
    pub find: &'static str,
    pub replace: &'static str,
    /// The code that must be given, and no other.
    pub code: &'static str,
    /// How the line of the fault begins, after the change.
    pub line: &'static str,
    /// The value as it must be shown.
    pub value: &'static str,
    /// Words that the rule and the remedy must have in them.
    pub rule: &'static str,
    pub remedy: &'static str,
}

const SITE: &str = "site.toml";
const LICENCE: &str = "licence.toml";

macro_rules! wrong {
    ($($name:literal $file:ident: $find:literal => $replace:literal;
       $code:literal at $line:literal, $value:literal; $rule:literal; $remedy:literal)*) => {
        &[$(Wrong { name: $name, file: $file, find: $find, replace: $replace, code: $code,
            line: $line, value: $value, rule: $rule, remedy: $remedy }),*]
    };
}

#[rustfmt::skip]
pub const ROWS: &[Wrong] = wrong! {
    // The form of the files.
    "a quote is missing" SITE: "title = \"Tarrow Works, River Harl (invented)\"" => "title = \"Tarrow Works, River Harl (invented)";
        "S002" at "title =", "title = \"Tarrow Works, River Harl (invented)"; "must be TOML"; "quotes"
    "format is missing" SITE: "format = 1\n" => "";
        "S006" at "", "(nothing)"; "must say `format`"; "`format = 1` as the first line"
    "the reference is missing" LICENCE: "reference = \"HARL/T/1\"\n" => "";
        "S006" at "format = 1", "(nothing)"; "must say `reference`"; "reference = \"HARL/T/1\""
    "format is newer" SITE: "format = 1\n" => "format = 2\n";
        "S004" at "format = 2", "2"; "newer"; "format 1"
    "format is text" LICENCE: "format = 1\n" => "format = \"1\"\n";
        "S003" at "format =", "\"1\""; "whole number 1"; "format = 1"
    "an unknown key" SITE: "level_sd  = \"0.10 m\"" => "level_sd = \"0.10 m\"\nshift = \"0.10 m\"";
        "S005" at "shift", "shift"; "no key `shift`"; "known here"
    "a misspelt optional key" SITE: "gauge = \"port-gauge\"" => "guage = \"port-gauge\"";
        "S005" at "guage", "guage"; "no key `guage`"; "did you mean `gauge`"
    "an unknown key in a clause" LICENCE: "speed_min = \"0.10 m/s\"" => "speed_min = \"0.10 m/s\"\nspeed_max = \"1 m/s\"";
        "S005" at "speed_max", "speed_max"; "no key `speed_max` in clause 2.3"; "speed_min"
    "text where a number belongs" SITE: "loss_k = 3.5" => "loss_k = \"3.5\"";
        "S007" at "loss_k", "\"3.5\""; "number without quotes"; "0.95"

    // Names.
    "a name with a space" SITE: "name = \"tarrow-works\"" => "name = \"Tarrow Works\"";
        "S008" at "name =", "\"Tarrow Works\""; "small letters"; "\"tarrow-works\""
    "two adapters of one name" SITE: "program = \"simulated-plant\"" => "program = \"simulated-plant\"\n[[adapters]]\nname = \"plant\"\nprogram = \"simulated-plant\"";
        "S009" at "name = \"plant\"", "\"plant\""; "two adapters must not"; "rename"
    "a pump named twice in its outlet" SITE: "pumps = [\"pump-1\", \"pump-2\"]" => "pumps = [\"pump-1\", \"pump-2\", \"pump-1\"]";
        "S009" at "pumps", "\"pump-1\""; "must not be listed twice"; "take the second one out"
    "an unknown asset" SITE: "gate = \"penstock\"" => "gate = \"penstok\"";
        "S010" at "gate =", "\"penstok\""; "must be an asset"; "did you mean `penstock`?"
    "an unknown signal" SITE: "flow_signal = \"outfall-flow\"" => "flow_signal = \"flow-meter\"";
        "S010" at "flow_signal", "\"flow-meter\""; "must be a signal"; "known signals: lagoon-level-a"
    "an unknown adapter" SITE: "adapter = \"plant\"\npoint = \"ammonia\"" => "adapter = \"plamt\"\npoint = \"ammonia\"";
        "S010" at "adapter = \"plamt\"", "\"plamt\""; "must be an adapter"; "did you mean `plant`?"
    "an unknown place" SITE: "place = \"tarrow-outfall\"" => "place = \"tarow-outfall\"";
        "S010" at "place =", "\"tarow-outfall\""; "must be a place"; "did you mean `tarrow-outfall`?"
    "a fault of the simulation for no signal" SITE: "level_start = \"5.20 m HD\"" => "level_start = \"5.20 m HD\"\nfaults = [{ kind = \"signal-frozen\", subject = \"lagoon-level-c\", from = \"2027-03-01T00:00:00Z\", to = \"2027-03-02T00:00:00Z\" }]";
        "S010" at "faults =", "\"lagoon-level-c\""; "must be a signal"; "did you mean `lagoon-level-a`?"
    "an unknown kind of clause" LICENCE: "kind = \"rolling-volume\"" => "kind = \"roling-volume\"";
        "S011" at "kind =", "\"roling-volume\""; "one of"; "did you mean \"rolling-volume\"?"

    // Quantities.
    "a level without a datum" SITE: "spill          = \"6.60 m HD\"" => "spill          = \"6.60 m\"";
        "S012" at "spill", "\"6.60 m\""; "must name the datum"; "\"6.6 m DATUM\" with one of: HD"
    "a level on an unknown datum" SITE: "port_centre = \"-3.60 m HD\"" => "port_centre = \"-3.60 m OD\"";
        "S013" at "port_centre", "\"-3.60 m OD\""; "datum of [datums]"; "did you mean \"HD\"?"
    "litres for cubic metres" LICENCE: "flow_max = \"1.20 m3/s\"" => "flow_max = \"1200 l/s\"";
        "S014" at "flow_max", "\"1200 l/s\""; "must be in `m3/s`"; "write \"1.2 m3/s\""
    "litres by their figure alone" LICENCE: "flow_max = \"1.20 m3/s\"" => "flow_max = \"1200 m3/s\"";
        "S015" at "flow_max", "\"1200 m3/s\""; "from 0.001 to 200 m3/s"; "if litres were meant, write \"1.2 m3/s\""
    "a volume without its unit" LICENCE: "volume_max = \"16500 m3\"" => "volume_max = \"16500\"";
        "S014" at "volume_max", "\"16500\""; "must be in `m3`"; "like \"9000 m3\""
    "a limit in another unit than its signal" LICENCE: "at_most = \"5 mg/l\"" => "at_most = \"5000 ug/l\"";
        "S014" at "  { signal = \"ammonia\"", "\"5000 ug/l\""; "in `mg/l`, the unit of its signal"; "\"5 mg/l\""
    "a thousands separator" LICENCE: "volume_max = \"380000 m3\"" => "volume_max = \"380,000 m3\"";
        "S015" at "volume_max", "\"380,000 m3\""; "one plain number"; "digits and a point"
    "a negative cap" LICENCE: "volume_max = \"16500 m3\"" => "volume_max = \"-16500 m3\"";
        "S015" at "volume_max", "\"-16500 m3\""; "from 1 to"; "check the figure"
    "not a number" SITE: "flow_aim = 0.94" => "flow_aim = nan";
        "S015" at "flow_aim", "nan"; "from 0.5 to 1"; "check the figure"
    "an amplitude that is not a number" SITE: "[\"S2\",  \"1.06 m\", \"215 deg\"]" => "[\"S2\",  \"nan m\", \"215 deg\"]";
        "S015" at "  [\"S2\"", "\"nan m\""; "one plain number"; "digits and a point"

    // Times.
    "an offset without its sign" LICENCE: "from = \"+0:30\"" => "from = \"0:30\"";
        "S016" at "from =", "\"0:30\""; "must carry its sign"; "write \"+0:30\" for after"
    "an offset without sign and unit" LICENCE: "from = \"+0:30\"" => "from = 30";
        "S016" at "from =", "30"; "its sign (+ after, - before) and its unit"; "\"+30 min\""
    "a lag without its unit" SITE: "high_lag  = { neap = \"+0:04\"" => "high_lag  = { neap = \"+4\"";
        "S016" at "high_lag", "\"+4\""; "its unit"; "\"+30 min\""
    "a date that does not exist" SITE: "[\"2020-01-01T00:00:00Z\"," => "[\"2021-02-29T00:00:00Z\",";
        "S017" at "valid", "\"2021-02-29T00:00:00Z\""; "a date of the calendar"; "2027-03-01T06:30:00Z"
    "an instant without its zone" SITE: "[\"2020-01-01T00:00:00Z\"," => "[\"2020-01-01T00:00:00\",";
        "S018" at "valid", "\"2020-01-01T00:00:00\""; "must say its zone"; "\"2020-01-01T00:00:00Z\" if that is UTC"
    "a time of day without its zone" SITE: "peak = \"10:00 UTC\"" => "peak = \"10:00\"";
        "S018" at "inflow", "\"10:00\""; "must say its zone"; "\"10:00 UTC\""
    "no zone at all" SITE: "zone = \"Europe/London\"" => "";
        "S006" at "format = 1", "(nothing)"; "must say `zone`"; "`zone = \"Europe/London\"`"
    "a zone that does not exist" SITE: "zone = \"Europe/London\"" => "zone = \"Europe/Londn\"";
        "S019" at "zone", "\"Europe/Londn\""; "IANA"; "did you mean \"Europe/London\"?"
    "constants that end before they begin" SITE: "\"2036-01-01T00:00:00Z\"]" => "\"2016-01-01T00:00:00Z\"]";
        "S020" at "valid", "[\"2020-01-01T00:00:00Z\", \"2016-01-01T00:00:00Z\"]"; "must end after it starts"; "put them in order"

    // The plant.
    "a storage curve that falls" SITE: "[\"6.90 m HD\", \"24500 m3\"]" => "[\"6.90 m HD\", \"2450 m3\"]";
        "S021" at "  [\"6.90 m HD\"", "[\"6.90 m HD\", \"2450 m3\"]"; "must both rise"; "mend the figure that falls"
    "a spill below the high alarm" SITE: "high_alarm     = \"6.30 m HD\"" => "high_alarm     = \"6.70 m HD\"";
        "S022" at "spill", "\"6.60 m HD\""; "above the high alarm, 6.70 m"; "check both levels"
    "a rest action is missing" SITE: "trip = \"close\", stop = \"close\"" => "trip = \"close\"";
        "S023" at "rest = {", "(nothing)"; "must say `stop`; there is no default"; "stop = \"close\""
    "a gate that rests by stop" SITE: "trip = \"close\", stop = \"close\"" => "trip = \"stop\", stop = \"close\"";
        "S024" at "rest = {", "\"stop\""; "a gate must rest by"; "hold"
    "nobody holds the lease of the gate" SITE: "local = \"penstock-local\"\nlease = \"120 s\"\nlease_holder = \"device\"" => "local = \"penstock-local\"\nlease = \"120 s\"\nlease_holder = \"none\"";
        "S025" at "lease_holder = \"none\"", "\"none\""; "must end the lease"; "device"
    "a lease of an hour" SITE: "local = \"penstock-local\"\nlease = \"120 s\"" => "local = \"penstock-local\"\nlease = \"1 h\"";
        "S026" at "lease = \"1 h\"", "\"1 h\""; "to 0:10:00"; "120 s"
    "a stroke that leaves nothing of the window" SITE: "stroke = \"8 min\"" => "stroke = \"118 min\"";
        "S027" at "lease = \"120 s\"", "\"120 s\""; "must leave something of a window of 3:00:00"; "shorten the lease"
    "a level signal in litres a second" SITE: "level_signals  = [\"lagoon-level-a\", \"lagoon-level-b\"]" => "level_signals = [\"lagoon-level-a\", \"ammonia\"]";
        "S032" at "level_signals", "\"ammonia\""; "a water level must be read in"; "name another signal"
    "a gauge on another datum" SITE: "point = \"port-gauge\"\nunit = \"m HD\"" => "point = \"port-gauge\"\nunit = \"m Port Ansel CD\"";
        "S032" at "unit = \"m Port Ansel CD\"", "\"m Port Ansel CD\""; "must come on the site datum"; "add -5.4 m"
    "a pump as the gate of the outlet" SITE: "pumps = [\"pump-1\", \"pump-2\"]" => "pumps = [\"pump-1\"]";
        "S033" at "name = \"pump-2\"", "\"pump-2\""; "exactly one outlet"; "a pump of its outlet"
    "a simulation with a real adapter" SITE: "program = \"simulated-plant\"" => "command = [\"./adapter\"]";
        "S034" at "[simulation]", "[simulation]"; "must not have [simulation]"; "take the section out"
    "two sensors that are one" SITE: "point = \"lagoon-level-b\"" => "point = \"lagoon-level-a\"";
        "S035" at "point = \"lagoon-level-a\"", "\"lagoon-level-a\""; "`lagoon-level-a` has it already"; "its own point"
    "a spring range below the neap range" SITE: "spring = \"8.2 m\"" => "spring = \"3.2 m\"";
        "S036" at "range", "{ neap = \"4.0 m\",     spring = \"3.2 m\" }"; "above the neap range"; "check both"
    "a site datum that is not at nought" SITE: "\"HD\" = \"0 m\"" => "\"HD\" = \"0.10 m\"";
        "S037" at "\"HD\"", "\"0.10 m\""; "must lie 0 m above itself"; "write \"0 m\""
    "no level signal" SITE: "level_signals  = [\"lagoon-level-a\", \"lagoon-level-b\"]" => "level_signals = []";
        "S038" at "level_signals", "[]"; "at least one signal of its level"; "lagoon-level-a"

    // The port.
    "an unknown constituent" SITE: "[\"MU2\", \"0.12 m\", \"150 deg\"]" => "[\"MV2\", \"0.12 m\", \"150 deg\"]";
        "S028" at "  [\"MV2\"", "\"MV2\""; "must be a constituent"; "did you mean"
    "a constituent twice" SITE: "[\"NU2\", \"0.05 m\", \"180 deg\"]" => "[\"N2\", \"0.05 m\", \"180 deg\"]";
        "S029" at "  [\"N2\", \"0.05 m\"", "\"N2\""; "N2 must stand once"; "take one of its rows out"
    "a constituent twice under two names" SITE: "[\"NU2\", \"0.05 m\", \"180 deg\"]" => "[\"LAM2\", \"0.05 m\", \"180 deg\"], [\"LAMBDA2\", \"0.05 m\", \"180 deg\"]";
        "S029" at "  [\"LAM2\"", "\"LAMBDA2\""; "must stand once in the constants"; "take one of its rows out"
    "a phase lag beyond the circle" SITE: "[\"O1\",  \"0.07 m\", \"350 deg\"]" => "[\"O1\",  \"0.07 m\", \"-10 deg\"]";
        "S030" at "  [\"O1\"", "\"-10 deg\""; "from 0 up to but not including 360"; "\"350 deg\""
    "no M2" SITE: "  [\"M2\",  \"3.05 m\", \"170 deg\"],\n" => "";
        "S031" at "constants", "["; "must have an M2"; "M2"
    "the nodal rule is not said" SITE: "nodal = \"mid-year\"\n" => "";
        "S006" at "[port]", "(nothing)"; "must say `nodal`; there is no default"; "mid-year"

    // The record.
    "a crontab line of five fields" SITE: "when = \"0 30 5 * * *\"" => "when = \"30 5 * * *\"";
        "S039" at "when = \"30 5", "\"30 5 * * *\""; "it has 5 fields instead of six"; "second, minute, hour"
    "a duty each second" SITE: "when = \"0 30 5 * * *\"" => "when = \"* * * * * *\"";
        "S039" at "when = \"* *", "\"* * * * * *\""; "more than once a minute"; "0 30 2 * * MON"
    "a day that never comes" SITE: "when = \"0 30 5 * * *\"" => "when = \"0 30 5 31 6 *\"";
        "S039" at "when = \"0 30 5 31", "\"0 30 5 31 6 *\""; "no day fits it"; "weekday"
    "an unknown duty" SITE: "duty = \"summary\"" => "duty = \"sumary\"";
        "S011" at "duty = \"sumary", "\"sumary\""; "one of"; "did you mean \"summary\""
    "segments kept for a day" SITE: "segments_for = \"2200 d\"" => "segments_for = \"1 d\"";
        "S015" at "segments_for", "\"1 d\""; "from 168:00:00"; "its unit"

    // The licence.
    "a clause number twice" LICENCE: "number = \"2.6\"" => "number = \"2.5\"";
        "L001" at "number = \"2.5\"", "\"2.5\""; "clause 2.5 must stand once"; "as the regulator does"
    "a clause went missing" LICENCE: "clause_count = 8" => "clause_count = 9";
        "L011" at "clause_count = 9", "9"; "the file has 8"; "find the clause"
    "a clause that governs nothing" LICENCE: "governs = [{ assets = [\"penstock\"], on_stale = \"hold\" }]" => "governs = []";
        "L002" at "governs = []", "[]"; "at least one asset"; "penstock"
    "no word on a stale signal" LICENCE: "governs = [{ assets = [\"penstock\"], on_stale = \"hold\" }]" => "governs = [{ assets = [\"penstock\"] }]";
        "L003" at "governs", "(nothing)"; "must say `on_stale`; there is no default"; "on_stale = \"hold\""
    "a window that ends before it begins" LICENCE: "to = \"+3:30\"" => "to = \"-3:30\"";
        "L004" at "to = \"-3:30\"", "\"-3:30\""; "must end after it begins"; "check both signs"
    "range bands that overlap" LICENCE: "range_min = \"4.0 m\"" => "range_min = \"2.2 m\"";
        "L005" at "  { range_min = \"2.2 m\", volume_max = \"9000 m3\" }", "{ range_min = \"2.2 m\", volume_max = \"9000 m3\" }"; "above the one before it"; "in order"
    "ranges without a band" LICENCE: "  { range_min = \"0 m\",   volume_max = \"0 m3\" },\n" => "";
        "L005" at "bands = [", "["; "must begin at 0 m"; "add it"
    "a band edge between two steps" LICENCE: "range_min = \"2.2 m\"" => "range_min = \"2.25 m\"";
        "L005" at "  { range_min = \"2.25 m\"", "{ range_min = \"2.25 m\", volume_max = \"4800 m3\", flow_max = \"0.90 m3/s\" }"; "on a step of the rounding"; "rounded range"
    "a clause without its words" LICENCE: "words = \"The volume shall be at most 16,500 m3 in any 24 hours.\"" => "words = \"\"";
        "L006" at "words = \"\"", "\"\""; "the words of the licence"; "copy them"
    "rounding to nothing" LICENCE: "step = \"0.1 m\"" => "step = \"0 m\"";
        "L007" at "rounding", "\"0 m\""; "from 0.001 to 1 m"; "what the permit says"
    "a condition both ways" LICENCE: "at_most = \"5 mg/l\"" => "at_most = \"5 mg/l\", at_least = \"1 mg/l\"";
        "L008" at "  { signal = \"ammonia\"", "{ signal = \"ammonia\", at_most = \"5 mg/l\", at_least = \"1 mg/l\", age_max = \"30 min\" }"; "exactly one of"; "at_most"
    "a clause number without quotes" LICENCE: "number = \"2.10\"" => "number = 2.10";
        "L010" at "number = 2.10", "2.10"; "in quotes"; "bare 2.10 is 2.1"
};
