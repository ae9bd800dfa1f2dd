"""A system error at each call that touches the state folder: once, and from then on.

Afterwards nothing that was acknowledged may be gone; an error that reaches the journal is told
within 2 s; it comes back by itself when the fault ends; and the file verifies. In `once` the fault
is one call. In `stay` all calls of that name fail from then on, in `all` every call does, until 2.5 s
after the loss was told, so that one attempt to come back fails too.
"""

import collections
import errno
import os
import random
import time

import rig
import tracer

PART = "errors"
FAULTS = ["EIO", "ENOSPC", "EDQUOT", "EROFS", "EMFILE", "ENOMEM", "EINTR", "SHORT"]
HOW = ["once", "stay", "all"]
TOLD_WITHIN_S = 2.0
# One retry comes 2 s after the loss, and is to fail.
STAYS_S = 2.5
# Of each mode, once and longer, in the short form.
SHORT_RUNS = 30
# An interrupted call is one that a signal met; signals do not come for ever.
INTERRUPTIONS = 4
# Calls that may fail without a word. SQLite syncs the folder beside our own sync of it. A WAL whose
# removal failed is copied once more by the next start.
QUIET = {("openat", "state"), ("fsync", "state"), ("unlink", "evidence.sqlite-wal")}


def run(r):
    lack = tracer.missing()
    if lack:
        raise rig.NotRun(lack)
    tally = rig.Tally(PART)
    tally.expect("deaf")
    ways = collections.Counter()
    # They wait for the retry most of the time.
    for task, result in r.each(PART, one, _tasks(r), jobs=r.jobs * 24):
        why, way = result
        _, f = rig.fields(task)
        control = None if f["durability"] == "full" else f["durability"]
        tally.take(task, why, control)
        if control is None:
            ways[way] += 1
    tally.note("ways", dict(sorted(ways.items())))
    return tally.end()


def _tasks(r):
    place = r.here()
    draw = random.Random(r.seed)
    for mode in rig.MODES:
        all_of_mode = list(_faults(mode, r.seed, "full", _calls(place, mode, r.seed, "full")))
        once = [t for t in all_of_mode if "how=once" in t]
        longer = [t for t in all_of_mode if "how=once" not in t]
        # Every call with every fault; of a large file, and of faults that stay, a sample.
        most = 1000 if mode in rig.SHARE else len(once)
        yield from draw.sample(once, min(len(once), most if r.long else SHORT_RUNS))
        yield from draw.sample(longer, min(len(longer), 1000 if r.long else SHORT_RUNS))
    control = list(_faults("append", r.seed, "deaf", _calls(place, "append", r.seed, "deaf")))
    yield from draw.sample(control, min(len(control), 60))


def _faults(mode, seed, durability, calls):
    for at, (name, short) in enumerate(calls, 1):
        for fault in FAULTS:
            if fault == "SHORT" and not short:
                continue
            if name in tracer.READS and fault not in ("EIO", "EINTR", "ENOMEM"):
                continue
            for how in HOW:
                yield rig.words(
                    PART, mode=mode, seed=seed, durability=durability, fault=fault, how=how, at=at
                )


def _calls(place, mode, seed, durability):
    place.fresh(mode)
    calls = []
    note = lambda call: calls.append((call.name, tracer.can_be_short(call)))
    argv = place.argv(mode, seed, durability=durability)
    ended = tracer.trace(argv, place.root, place.out, note, reads=True)
    if ended.code != 0:
        raise SystemExit(f"{mode} does not run by itself: {ended.code} {ended.said[-1:]}")
    return calls


class _Fault:
    def __init__(self, f):
        self.at, self.how, self.fault = int(f["at"]), f["how"], f["fault"]
        self.first = self.where = self.name = self.file = self.lost_at = None
        self.times = 0

    def decide(self, call):
        if call.no < self.at or not self.meant(call):
            return None
        if self.fault == "SHORT" and not tracer.can_be_short(call):
            return None
        if self.first is None:
            self.first, self.name = call.at, call.name
            self.file = os.path.basename(call.path)
            self.where = f"{call.name} {self.file}"
        self.times += 1
        return tracer.SHORT if self.fault == "SHORT" else getattr(errno, self.fault)

    def meant(self, call):
        if call.no == self.at:
            return True
        if self.how == "once" or self.lost_at and time.monotonic() > self.lost_at + STAYS_S:
            return False
        if self.fault == "EINTR" and self.times >= INTERRUPTIONS:
            return False
        return self.how == "all" or call.name == self.name

    def hear(self, text):
        if text.startswith("LOST ") and self.lost_at is None:
            self.lost_at = time.monotonic()


def one(place, task):
    """(None or what is bad, which way it went)."""
    _, f = rig.fields(task)
    place.fresh(f["mode"])
    argv = place.argv(f["mode"], f["seed"], durability=f["durability"])
    fault = _Fault(f)
    ended = tracer.trace(
        argv, place.root, place.out, fault.decide, hear=fault.hear, reads=True, seconds=60
    )
    if fault.first is None:
        return "NO-FAULT the call did not come this time", "none"
    way, why = _way(ended, fault)
    return why or place.check(), way


def _way(ended, fault):
    """Which way it went, and what is wrong about that."""
    said = "".join(text for _, text in ended.said)
    if ended.hung:
        return "hung", f"HUNG after {fault.where}"
    if fault.lost_at is not None:
        took = fault.lost_at - fault.first
        if took > TOLD_WITHIN_S and fault.how == "once":
            return "lost", f"LATE the loss was told {took:.1f} s after {fault.where}"
    if ended.code == 0 and fault.lost_at is None:
        if "FAILED " in said:
            return "a task failed", None
        if fault.fault in ("EINTR", "SHORT"):
            return "done again", None
        if fault.times == 1 and (fault.name, fault.file) in QUIET:
            return "silent", None
        return "silent", f"SILENT nobody was told of {fault.times} x {fault.where}"
    if ended.code == 0:
        return "lost and back", None if "BACK" in said else "NO-BACK done without coming back"
    if ended.code == 4:
        return "refused", "REFUSED after an acknowledgement" if "ACK" in said else None
    if ended.code == 6:
        return "unclosed", None
    return f"ended {ended.code}", f"ENDED with {ended.code} after {fault.where}: {said[-200:]!r}"
