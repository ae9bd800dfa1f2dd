//! The table behind `explain`: code, title, the longer word.

use crate::codes::*;

pub(crate) const TABLE: &[(Code, &str, &str)] = &[
    (
        READ,
        "a file cannot be read",
        "A site is a folder that holds site.toml and licence.toml, both UTF-8 text of at most 256 KiB. \
      The path may name the folder or its site.toml. Nothing is started from half a site.",
    ),
    (
        SYNTAX,
        "the file is not TOML",
        "The text breaks the grammar of TOML. While it does, nothing else in that file can be checked, \
      so mend these first and check again. The other file is still checked.",
    ),
    (
        FORMAT,
        "the format line",
        "Each file begins with `format = 1`, before any other key, so that a later program knows how \
      to read it and an older one knows that it must not.",
    ),
    (
        FORMAT_NEWER,
        "written for a newer program",
        "The file says a format that this program does not know. Reading it by the old rules could \
      pass over a condition, so it is refused whole.",
    ),
    (
        UNKNOWN_KEY,
        "a key that is not known",
        "A key that nobody reads is either a slip or a condition that would not be kept. Both are \
      dangerous, so nothing is passed over in silence. The nearest known key is offered.",
    ),
    (
        MISSING,
        "something must be said and is not",
        "The key has no default because every default would be somebody's guess about your plant. The \
      remedy shows the form of what to add.",
    ),
    (
        WRONG_KIND,
        "the wrong kind of value",
        "Text stands in quotes, numbers without a unit stand bare, lists in square brackets, tables \
      in braces or under a [heading]. Anything that has a unit is text: \"8 min\".",
    ),
    (
        NAME,
        "a name with the wrong letters",
        "Names stand in commands, file names and the journal for years. They are made of small \
      letters, digits and hyphens, with no hyphen at either end, and at most 64 of them.",
    ),
    (
        DUPLICATE_NAME,
        "a name that is used twice",
        "Two things of one kind with one name cannot be told apart in a command or in the journal. \
      The second one is shown. Lists that must not repeat an entry have the same fault.",
    ),
    (
        UNKNOWN_NAME,
        "a name that refers to nothing",
        "The site file has no asset, signal, adapter, place or storage of this name. If one is named \
      nearly so, it is offered; else all known names are listed.",
    ),
    (
        NOT_A_CHOICE,
        "not one of the words that are known here",
        "Some keys take one word of a few. The rule lists them all. Words are never guessed at, \
      since \"close\" and \"closed\" may have been meant differently.",
    ),
    (
        NO_DATUM,
        "a level without its datum",
        "6.60 m above what? Chart datum at the port, the zero of a gauge and the survey datum differ \
      by metres. Every level says its datum, as in \"6.60 m HD\", and is put on the site datum when \
      the file is read.",
    ),
    (
        UNKNOWN_DATUM,
        "a datum that [datums] does not have",
        "Each datum stands in [datums] with the height of its zero above the site datum. Add the one \
      that is meant, from the survey and not by guess.",
    ),
    (
        UNIT,
        "a unit that is missing or wrong",
        "Each quantity has one unit in these files: m, m3, m3/s, m/s, kW, %, deg, and s, min, h or d \
      for time. A figure in another unit is refused, with the same figure in ours worked out where \
      the other unit is known.",
    ),
    (
        OUT_OF_RANGE,
        "a figure that cannot be right",
        "The figure is negative, not a number, or far outside what such a plant can have. The usual \
      cause is another unit: litres for cubic metres, minutes for hours.",
    ),
    (
        OFFSET,
        "an offset of time without its sign or unit",
        "\"0:30\" could be half an hour before or after. Offsets from high or low water always carry \
      + for after or - for before, and hours:minutes or a unit: \"+0:30\", \"-1:00\", \"+30 min\".",
    ),
    (
        INSTANT,
        "not an instant",
        "Instants are written in UTC as 2027-03-01T06:30:00Z. The date must exist in the calendar. \
      Other offsets than Z are refused: work out the UTC time.",
    ),
    (
        NO_ZONE,
        "a time that does not say its zone",
        "A time without a zone is an hour wrong for half the year. Instants end in Z; a time of day \
      in the site file ends in UTC. Months of the licence are those of the site's zone, and the \
      clause says so.",
    ),
    (
        UNKNOWN_ZONE,
        "a time zone that does not exist",
        "The zone is named as in the IANA time zone database, like Europe/London or UTC. Letters \
      like GMT+1 are refused because their sign is read both ways.",
    ),
    (
        WINDOW_ORDER,
        "an end that is not after its start",
        "A stretch of time begins at its first instant and ends before its second. One that ends \
      before it begins would be empty, which nobody writes on purpose.",
    ),
    (
        CURVE,
        "a storage curve that does not rise",
        "The curve gives the volume at each level. Levels and volumes must both rise from row to row, \
      with at least two rows, from at or below the lowest working level to at or above the spill.",
    ),
    (
        LEVEL_ORDER,
        "levels in the wrong order",
        "The lowest working level lies below the high alarm, and that below the spill. Otherwise the \
      alarm would come after the water, or the plan would have no room.",
    ),
    (
        REST_MISSING,
        "no rest action for a cause",
        "What an asset does when nobody may command it is a decision of the plant's engineer, one for \
      each of four causes: lease_out, input_end, trip, stop. No default is safe everywhere: a shut \
      sluice keeps the sea out but ponds the land.",
    ),
    (
        REST_UNFIT,
        "a rest action that this asset cannot do",
        "A gate can close, open, hold or be handed to local control; a pump can stop, hold or be \
      handed to local control. A pump does not close and a gate has no stop of its own: say hold.",
    ),
    (
        LEASE_HOLDER,
        "nothing ends the lease of a gate",
        "A gate that passes effluent or sea must come to rest by itself when commands cease. With \
      lease_holder \"none\" it would stay open for ever. Fit a timer or heartbeat in the controller \
      (\"device\"), or let the adapter hold it (\"adapter\"), which bars automatic.",
    ),
    (
        LEASE_LENGTH,
        "a lease that is too short or too long",
        "Rest begins within the lease. Over 10 minutes a lost link would leave water running for too \
      long; under 5 seconds a busy network would trip the asset for nothing.",
    ),
    (
        LEASE_FIT,
        "the lease leaves nothing of the window",
        "Closing must start at the latest 1.5 strokes, one lease and the detection (the age limit of \
      the position signal) before the water turns. With the drain-down this must leave something \
      of the window, taken as 3 hours or the clause's own if shorter.",
    ),
    (
        CONSTITUENT,
        "a tidal constituent that is not known",
        "The name is not in the table of constituents. Check the spelling in the list the constants \
      came from. A constituent that is left out shifts every time, so it is never skipped.",
    ),
    (
        CONSTITUENT_TWICE,
        "a tidal constituent that stands twice",
        "Each constituent counts once. Two rows, also under two names for the same one, would double \
      its tide.",
    ),
    (
        PHASE,
        "a phase lag outside the circle",
        "Phase lags are Greenwich phase lags (G) from 0 up to but not including 360 degrees. Local \
      lags (g, kappa) must be turned into G first: G = g + hours of the zone west x speed.",
    ),
    (
        NO_M2,
        "constants without the main lunar tide",
        "Tides are counted by the moon and M2 is its main tide. Without an M2 of some height there is \
      no high water to count from, so such a port is refused.",
    ),
    (
        SIGNAL_USE,
        "a signal that cannot serve here",
        "A use needs its unit: levels in m on the site datum, flows in m3/s, positions in %, switches \
      as flag. A level on another datum is refused because readings are not shifted: let the \
      adapter deliver it on the site datum, or set the transmitter.",
    ),
    (
        OUTLET_PARTS,
        "an outlet that does not hang together",
        "An outlet is one storage, one gate and any pumps, each asset in exactly one outlet. Its gate \
      must be a gate, its pumps must be pumps, and each pump runs only with that gate open.",
    ),
    (
        SIMULATION,
        "the simulation does not fit the adapters",
        "The section [simulation] is for sites with a simulated plant, and such a site needs it. A \
      site with any real adapter must not carry one: its faults and its clock are for rehearsal.",
    ),
    (
        POINT_TWICE,
        "one point of an adapter stands for two things",
        "Each signal and each asset has a point of its own at its adapter. Two that share one would \
      fight over it, or show one reading twice as if it were a second opinion.",
    ),
    (
        NEAP_SPRING,
        "neap and spring in the wrong order",
        "Differences are tabulated at a neap range and a larger spring range of the port, and read \
      between and a little beyond by the range of each tide.",
    ),
    (
        SITE_DATUM,
        "the site datum in [datums]",
        "[datums] lists the site datum itself with \"0 m\", and every other with the height of its \
      zero above it: chart datum at Port Ansel lies 5.40 m below HD, so it stands as \"-5.40 m\".",
    ),
    (
        EMPTY,
        "a list that must not be empty",
        "A site needs at least one place, storage, asset, outlet, signal and adapter, a port its \
      constants and a licence its clauses: without them there is nothing to run, or no condition \
      to run under.",
    ),
    (
        SCHEDULE,
        "a duty whose time cannot be read",
        "A duty recurs by a cron expression of six fields in the site's own time: second, minute, \
      hour, day of month, month, day of week (by name). A time that spring's change of the clock \
      leaves out comes at the change; one that autumn has twice comes once, unless autumn = \"both\".",
    ),
    (
        CLAUSE_TWICE,
        "a clause number that is used twice",
        "Every window edge, hold and return names its clause by the regulator's number. Two clauses \
      of one number could not be told apart.",
    ),
    (
        GOVERNS,
        "a clause that governs nothing, or an asset twice",
        "Each clause lists the assets that it governs, each once. A clause for nothing would look \
      kept without being applied.",
    ),
    (
        ON_STALE,
        "no word on what a stale signal means",
        "When a signal or forecast that the clause needs is not good, each governed asset does what \
      on_stale says: hold, allow, or reduced with a flow. It has no default: the regulator and the \
      operator answer for it.",
    ),
    (
        WINDOW,
        "a tide window that ends before it begins",
        "`from` and `to` are offsets from the same high or low water, and `to` must be the later. A \
      window across the next tide is written from the other turn.",
    ),
    (
        BANDS,
        "range bands that fall or overlap",
        "Bands begin at 0 m and each begins above the one before it; it holds up to the next. So every \
      range has exactly one band. Their edges lie on the rounding step.",
    ),
    (
        WORDS,
        "a clause without its words",
        "The words of the licence stand beside its meaning, so that a person can judge the one by the \
      other. Copy them from the permit; do not shorten what decides.",
    ),
    (
        ROUNDING,
        "rounding that decides nothing",
        "The range is rounded before it is looked up, and a tide on the edge of a band turns on it. \
      The step must be from 0.001 m to 1 m; halves go up.",
    ),
    (
        CONDITION,
        "a condition that is none or two",
        "Each condition of a signal gate says exactly one of at_most or at_least, in the unit of its \
      signal, and a greatest age of the reading.",
    ),
    (
        NO_CURRENT,
        "a current clause at a place without current figures",
        "The clause needs the turn of the current at the outlet's place. Give that place a [current] \
      table of differences, or no window could ever be found.",
    ),
    (
        CLAUSE_NUMBER,
        "a clause number in the wrong form",
        "Numbers are written as the regulator does, in digits, letters and points, like 2.5 or 3.1a, \
      in quotes: bare 2.10 would be read as the number 2.1.",
    ),
    (
        CLAUSE_COUNT,
        "a clause went missing, or one too many",
        "The head of the licence file says how many clauses follow. A copy that was cut off between \
      two clauses would otherwise load and simply not keep the rest of the licence.",
    ),
    (
        NEVER_TOGETHER,
        "two windows that never hold together",
        "Both clauses govern the same asset, and no instant is inside both windows, so the asset could \
      never move water. The site loads, but automatic should not be given until one is mended. Only \
      windows from the same kind of turn at the same place are compared.",
    ),
    (
        UNGOVERNED,
        "an asset that no clause governs",
        "The licence says nothing of this asset here. That may be right for a pump behind a governed \
      gate, but check that it was not forgotten.",
    ),
    (
        LEASE_IN_ADAPTER,
        "the lease lives in the adapter",
        "Automatic needs a lease held by the device for anything that can pass sea or effluent: if the \
      host or the adapter process dies, only the controller can still close the gate. Such an asset \
      can be run in advise.",
    ),
    (
        ALL_NIL,
        "a volume clause that forbids every tide",
        "Every band of the clause is nil, so no tide may be used. If a release was meant to be \
      possible, a band is missing.",
    ),
    (
        NO_HEARTBEAT,
        "nobody is told when the daemon dies",
        "heartbeat_file names a file that is touched at each healthy round, so that telemetry that \
      does not depend on this program can raise an alarm when it stops. Without one, a dead daemon \
      may go unnoticed until a window is missed.",
    ),
];
