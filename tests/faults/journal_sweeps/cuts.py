"""Power cuts on a real ext4: the file system is shut down at a counted line, the writer killed, the
file system mounted anew, and the files held to what had been heard before the cut.

Cuts follow each other on the same files, some of them before anything has put right what the one
before did.
"""

import os
import random
import shutil
import subprocess
import time

import mounts
import rig

PART = "cuts"
KINDS = ["ext4-ordered-1024", "ext4-ordered-4096", "ext4-writeback-1024", "ext4-writeback-4096"]
MODES = ["append", "checkpoint", "seal", "retain", "backup", "pack", "migrate", "stop"]
CONTROLS = ["normal", "off"]
# So many cuts on the same files; then new ones.
CUTS_EACH = 12


def run(r):
    lack = mounts.missing(r.base, cuts=True)
    if lack:
        raise rig.NotRun(lack)
    tally = rig.Tally(PART)
    for control in CONTROLS:
        tally.expect(control)
    heard = 0
    for task, (cuts, lines, why) in r.each(PART, series, _tasks(r)):
        _, f = rig.fields(task)
        control = None if f["durability"] == "full" else f["durability"]
        for _ in range(cuts - (why is not None)):
            tally.take(task, None, control)
        if why is not None:
            tally.take(task, why, control)
        heard += lines if control is None else 0
    tally.note("acks_heard", heard)
    return tally.end()


def _tasks(r):
    for control in CONTROLS:
        yield _task("ext4-ordered-4096", r.seed, "append", control)
    rounds = 60 if r.long else 1
    for n in range(rounds):
        for i, kind in enumerate(KINDS):
            modes = MODES if r.long else MODES[i::4]
            for mode in modes:
                yield _task(kind, r.seed + n, mode, "full")


def _task(kind, seed, mode, durability):
    return rig.words(PART, kind=kind, seed=seed, mode=mode, durability=durability)


def one(place, task):
    return series(place, task)[2]


def series(place, task):
    """(cuts, lines heard before them, None or what was bad after the last)."""
    _, f = rig.fields(task)
    draw = random.Random(task)
    with mounts.Mounted(place.base, f["kind"]) as m:
        place.root = os.path.join(m.point, "root")
        place.state = os.path.join(place.root, "state")
        place.fresh(f["mode"])
        # What a mode begins with was there long before.
        os.sync()
        lines = 0
        for cut in range(1, CUTS_EACH + 1):
            lines += _cut(place, m, f, draw, cut)
            if draw.random() < 0.7 or cut == CUTS_EACH:
                why = place.check()
                if why:
                    return cut, lines, f"{why} (cut {cut})"
        return CUTS_EACH, lines, None


def _cut(place, mounted, f, draw, cut):
    """Cuts a run after some of its lines, or some time after those; gives how many were heard."""
    argv = place.argv(f["mode"], int(f["seed"]) * 100 + cut, 6, f["durability"])
    after = draw.randint(0, 30)
    heard = 0
    with open(place.out, "a", encoding="utf-8") as out:
        process = subprocess.Popen(argv, stdout=subprocess.PIPE, text=True)
        while heard < after:
            line = process.stdout.readline()
            if not line.endswith("\n"):
                break
            out.write(line)
            heard += 1
        time.sleep(draw.choice((0, 0, 0.001, 0.004)) if after else draw.random() * 0.04)
        mounted.cut()
        process.kill()
        # Promises count that were heard before the cut; what may go by then, may go.
        out.writelines(line for line in process.stdout if line == "MAY-GO\n")
        process.stdout.close()
        process.wait()
    mounted.again()
    return heard
