"""SIGKILL at each call that touches the state folder, then again while the next start puts it right.

What a killed process wrote stays in the page cache, so the controls here are those that speak too
early (`early`), not those that do not sync.
"""

import random

import rig
import tracer

PART = "kills"
# Of each mode, in the short form.
SHORT_POINTS = 40


def run(r):
    lack = tracer.missing()
    if lack:
        raise rig.NotRun(lack)
    tally = rig.Tally(PART)
    tally.expect("early")
    tasks = list(_tasks(r))
    for task, why in r.each(PART, one, tasks):
        _, f = rig.fields(task)
        tally.take(task, why, None if f["durability"] == "full" else f["durability"])
    return tally.end()


def _tasks(r):
    seeds = range(r.seed, r.seed + (6 if r.long else 1))
    place = r.here()
    draw = random.Random(r.seed)
    for mode in rig.MODES:
        for seed in seeds:
            calls = _count(place, mode, seed, "full")
            points = list(range(1, calls + 1))
            if not r.long and len(points) > SHORT_POINTS:
                points = sorted(draw.sample(points, SHORT_POINTS))
            for at in points:
                yield rig.words(PART, mode=mode, seed=seed, durability="full", at=at)
            # Killed, and killed again one to four times while it recovers and goes on.
            for _ in range(200 if r.long else 8):
                ats = [draw.randint(1, calls) for _ in range(draw.randint(2, 5))]
                at = ",".join(map(str, ats))
                yield rig.words(PART, mode=mode, seed=seed, durability="full", at=at)
    for at in range(1, _count(place, "append", r.seed, "early") + 1):
        yield rig.words(PART, mode="append", seed=r.seed, durability="early", at=at)


def _count(place, mode, seed, durability):
    place.fresh(mode)
    argv = place.argv(mode, seed, durability=durability)
    ended = tracer.trace(argv, place.root, place.out, lambda _: None)
    if ended.code != 0:
        raise SystemExit(f"{mode} does not run by itself: {ended.code} {ended.said[-1:]}")
    return ended.calls


def one(place, task):
    """None, or what is bad after the kills of this task."""
    _, f = rig.fields(task)
    place.fresh(f["mode"])
    argv = place.argv(f["mode"], f["seed"], durability=f["durability"])
    for at in map(int, f["at"].split(",")):
        decide = lambda call: tracer.KILL if call.no == at else None
        ended = tracer.trace(argv, place.root, place.out, decide)
        # A later run may need fewer calls than the number drawn for it: then it just ends.
        if ended.code not in (0, -9):
            return f"ENDED with {ended.code} {ended.said[-1:]}"
    return place.check()
