"""Every state that a power cut may leave: a run is recorded call by call, and after each call the
states of the model in `image.py` are built and checked with what was acknowledged by then.

`depth` 2 and more: a state is drawn, a run is started on it and recorded in its turn, so that the cut
falls into the recovery. `fault`: a sync fails (`times` times in succession), and what it covered may
be gone for good.
"""

import errno
import os
import random
import shutil

import image
import rig
import tracer

PART = "states"
# With up to so many open calls every subset is taken; drawn ones above.
SUBSETS_OF = 4
CONTROLS = ["normal", "off"]
# Calls from which the next sync fails, where that once lost what was promised: of the switch to WAL,
# of a commit, of a backup's folder of segments.
FOUND = [("append", 4), ("append", 8), ("append", 49), ("append", 56), ("backup", 150)]
UNBORN = "file is not a database"


def run(r):
    lack = tracer.missing()
    if lack:
        raise rig.NotRun(lack)
    tally = rig.Tally(PART)
    for control in CONTROLS:
        tally.expect(control)
    distinct = set()
    for task, (checked, digests, bad) in r.each(PART, explore, _tasks(r)):
        _, f = rig.fields(task)
        control = None if f["durability"] == "full" else f["durability"]
        for _ in range(checked - len(bad)):
            tally.take(task, None, control)
        for which, why in bad:
            tally.take(f"{task} {which}", why, control)
        if control is None:
            distinct.update(digests)
    tally.note("distinct", len(distinct))
    return tally.end()


def _tasks(r):
    draw = random.Random(r.seed)
    place = r.here()
    # Runs of each mode and recoveries, states drawn after a call, failed syncs.
    runs, recoveries, drawn, faults = (10, 10, 8, 30) if r.long else (1, 1, 1, 2)
    few = max(1, drawn // 3)
    tasks = []
    for mode in rig.MODES:
        # In a mode with a large file, only after each so many calls.
        stride = rig.SHARE.get(mode, 1) * (1 if r.long else 3)
        for n in range(runs):
            tasks.append(_task(mode, r.seed + n, "full", drawn, stride))
        for n in range(recoveries):
            tasks.append(_task(mode, r.seed + n, "full", few, stride, depth=draw.randint(2, 5)))
        syncs = _syncs(place, mode, r.seed)
        choices = [(at, times) for at in syncs for times in (2, 3, 4)]
        choices = draw.sample(choices, min(len(choices), faults // rig.SHARE.get(mode, 1)))
        if r.long:
            choices += [(at, 1) for at in syncs]
        for at, times in choices:
            more = {"fault": at, "times": times, "depth": draw.choice((1, 1, 2))}
            tasks.append(_task(mode, r.seed, "full", few, stride, **more))
    draw.shuffle(tasks)
    # What was found once is looked for each time: see the README.
    found = [_task(mode, 1, "full", 1, 1, fault=at, times=1) for mode, at in FOUND]
    controls = [_task("append", r.seed, control, 2, 1) for control in CONTROLS]
    return found + tasks + controls


def _task(mode, seed, durability, drawn, stride, **more):
    f = {"mode": mode, "seed": seed, "durability": durability, "drawn": drawn, "stride": stride}
    return rig.words(PART, **f, **more)


def _syncs(place, mode, seed):
    place.fresh(mode)
    syncs = []
    note = lambda c: syncs.append(c.no) if c.name in tracer.SYNCS else None
    tracer.trace(place.argv(mode, seed), place.root, place.out, note)
    return syncs


def explore(place, task):
    """(states checked, their digests, [(which, what is bad)])."""
    _, f = rig.fields(task)
    explorer = _Explorer(place, task, f)
    explorer.go()
    return explorer.checked, explorer.digests, explorer.bad


def one(place, task):
    """One state again, by `op` and `n`."""
    _, f = rig.fields(task)
    explorer = _Explorer(place, task, f)
    explorer.only = (int(f["op"]), int(f["n"]))
    explorer.go()
    return explorer.bad[0][1] if explorer.bad else None


class _Explorer:
    """Records a run and explores its states while it stands still at each call."""

    def __init__(self, place, task, f):
        self.place, self.f = place, f
        self.checked, self.digests, self.bad = 0, set(), []
        self.seen, self.only = {}, None
        self.drawn, self.stride = int(f["drawn"]), int(f.get("stride", 1))
        self.draw = None
        self.image = os.path.join(place.base, "image")

    def go(self):
        mode, seed = self.f["mode"], int(self.f["seed"])
        self.place.fresh(mode)
        depth = int(self.f.get("depth", 1))
        for level in range(depth - 1):
            self.draw = random.Random(f"{seed} {mode} {depth} {level}")
            moment = _Moment(self.draw)
            recorder = _Recorder(self.place, moment.take, None, 0)
            recorder.run(self.f)
            moment.leave(self.place)
        fault = self.f.get("fault")
        recorder = _Recorder(
            self.place, self.explore, fault and int(fault), int(self.f.get("times", 0))
        )
        ended = recorder.run(self.f)
        if ended.code != 0 and not fault:
            self.bad.append(("op=0 n=0", f"ENDED with {ended.code} {ended.said[-1:]}"))
        shutil.rmtree(self.image, ignore_errors=True)

    def explore(self, disk, lines, op):
        if self.only and self.only[0] != op or op % self.stride != int(self.f["seed"]) % self.stride:
            return
        self.draw = random.Random(f"{self.f['seed']} {self.f['mode']} {op}")
        for n, (lasting, torn) in enumerate(self.choices(disk.open_calls())):
            if self.only and self.only[1] != n:
                continue
            self.check(disk.state(lasting, torn), lines, f"op={op} n={n}")

    def choices(self, calls):
        """(calls that last, calls that are torn)."""
        everything = frozenset(calls)
        if len(calls) <= SUBSETS_OF:
            for mask in range(2 ** len(calls)):
                yield {c for i, c in enumerate(calls) if mask >> i & 1}, {}
        else:
            yield frozenset(), {}
            yield everything, {}
            for last in calls[-3:]:
                yield everything - {last}, {}
            for _ in range(self.drawn):
                share = self.draw.choice((0.2, 0.5, 0.8))
                yield {c for c in calls if self.draw.random() < share}, {}
        for _ in range(self.drawn if calls else 0):
            share = self.draw.choice((0.5, 0.9, 1.0))
            lasting = {c for c in calls if self.draw.random() < share}
            torn = {c: self.tear() for c in lasting if self.draw.random() < 0.4}
            yield lasting, torn

    def tear(self):
        mask = self.draw.getrandbits(64)
        return lambda sector: mask >> (sector % 64) & 1

    def check(self, state, lines, which):
        digest = image.digest(state, self.place.root)
        # The same image, but with more acknowledged, is another question.
        if self.seen.get(digest, -1) >= lines:
            return
        self.seen[digest] = lines
        self.digests.add(digest)
        self.checked += 1
        put(state, self.place.root, self.image)
        state, heard = os.path.join(self.image, "state"), heard_in(self.place)
        why = self.place.check(state=state, heard=heard, lines=lines)
        if why and self.f.get("fault") and why.endswith(UNBORN) and not self.acknowledged(lines):
            # Its very first sync failed, which was told, and it was torn: nothing was ever written,
            # and the file is refused. To take it for an empty one would be to guess.
            return
        if why:
            self.bad.append((which, why))

    def acknowledged(self, lines):
        with open(heard_in(self.place), encoding="utf-8") as heard:
            return any(line.startswith("ACK ") for line in heard.readlines()[:lines])


class _Moment:
    """One state of a run, any as likely as any other, with what was heard by then."""

    def __init__(self, draw):
        self.draw, self.count, self.state, self.lines = draw, 0, {}, 0

    def take(self, disk, lines, _op):
        self.count += 1
        if self.draw.random() * self.count < 1:
            lasting = {c for c in disk.open_calls() if self.draw.random() < 0.5}
            self.state, self.lines = disk.state(lasting, {}), lines

    def leave(self, place):
        """Makes it the state that the next run begins with."""
        put(self.state, place.root, place.root)
        with open(place.out, encoding="utf-8") as f:
            heard = f.readlines()[: self.lines]
        with open(place.out, "w", encoding="utf-8") as f:
            f.writelines(heard)


def heard_in(place):
    return os.path.join(place.base, "heard")


def put(state, root, to):
    shutil.rmtree(to, ignore_errors=True)
    os.makedirs(os.path.join(to, "state"))
    for path, content in state.items():
        path = to + path[len(root) :]
        os.makedirs(os.path.dirname(path), exist_ok=True)
        with open(path, "wb") as f:
            f.write(content)


class _Recorder:
    """Keeps the model of the disk in step with a run, and calls `each(disk, lines, op)` after every
    change and every line that was said."""

    def __init__(self, place, each, fault, times):
        self.place, self.each = place, each
        self.fault, self.times, self.failed = fault, times, 0
        self.disk = image.Disk(place.root, rig.RESERVE)
        # What is heard is written down here first: the run's own file has it a moment later.
        shutil.copy(place.out, heard_in(place))
        with open(place.out, encoding="utf-8") as f:
            self.lines = len(f.readlines())
        self.op = 0
        self.before = {}

    def run(self, f):
        # The run stands still while states are checked: its patience must be long.
        argv = self.place.argv(f["mode"], f["seed"], durability=f["durability"], patience_ms=10**7)
        return tracer.trace(
            argv, self.place.root, self.place.out, self.decide, self.after, self.hear, seconds=1200
        )

    def decide(self, call):
        self.before[call.pid] = _before(call)
        due = self.fault and call.no >= self.fault and self.failed < self.times
        if due and call.name in tracer.SYNCS:
            self.failed += 1
            return errno.EIO
        return None

    def hear(self, text):
        self.lines += text.count("\n")
        with open(heard_in(self.place), "a", encoding="utf-8") as f:
            f.write(text)
        self.step()

    def step(self):
        self.op += 1
        self.each(self.disk, self.lines, self.op)

    def after(self, call, result):
        before = self.before.pop(call.pid)
        if call.path.endswith(rig.RESERVE):
            return
        if call.name in tracer.SYNCS:
            self.synced(call, result >= 0)
        elif result >= 0 and self.changed(call, result, before):
            self.step()

    def synced(self, call, succeeded):
        if os.path.isdir(call.path):
            self.disk.sync_folder(call.path, succeeded)
        else:
            self.disk.sync(_number(call), succeeded)
        self.step()

    def changed(self, call, result, before):
        """Whether anything did. What the model does not know ends the run, so that nothing is
        recorded wrongly."""
        disk, name = self.disk, call.name
        if name in tracer.OPENS:
            number = _stat(call.pid, result)
            flags = call.args[2] if name == "openat" else call.args[1]
            if before is None:
                disk.create(call.path, number)
            elif flags & os.O_TRUNC:
                disk.resize(number, 0)
            return before is None or bool(flags & os.O_TRUNC)
        if name == "pwrite64":
            disk.write(_number(call), call.args[3], call.data()[:result])
        elif name == "write":
            disk.write(_number(call), before, call.data()[:result])
        elif name in ("copy_file_range", "sendfile"):
            disk.write(_number(call), before, _content(call, before, result))
            return result > 0
        elif name == "ftruncate":
            disk.resize(_number(call), call.args[1])
        elif name in ("unlink", "unlinkat"):
            disk.unlink(call.path)
        elif name in ("rename", "renameat", "renameat2"):
            disk.rename(call.path, call.second)
        elif name in ("mkdir", "mkdirat"):
            disk.mkdir(call.path)
        else:
            raise RuntimeError(f"the model does not know {name} on {call.path}")
        return True


def _before(call):
    """What must be known before the call is made: whether a file is there, or where a write goes."""
    if call.name in tracer.OPENS:
        return True if os.path.lexists(call.path) else None
    if call.name in tracer.WRITES and call.name != "pwrite64":
        return _position(call)
    return None


def _stat(pid, fd):
    stat = os.stat(f"/proc/{pid}/fd/{fd}")
    return stat.st_dev, stat.st_ino


def _fd(call):
    """The descriptor that is written to, or synced."""
    return call.args[2 if call.name == "copy_file_range" else 0] & 0xFFFFFFFF


def _number(call):
    return _stat(call.pid, _fd(call))


def _content(call, at, size):
    with open(f"/proc/{call.pid}/fd/{_fd(call)}", "rb") as f:
        f.seek(at)
        return f.read(size)


def _position(call):
    fd = _fd(call)
    with open(f"/proc/{call.pid}/fdinfo/{fd}", encoding="ascii") as f:
        info = dict(line.split(":", 1) for line in f if ":" in line)
    if int(info["flags"], 8) & os.O_APPEND:
        return os.stat(f"/proc/{call.pid}/fd/{fd}").st_size
    return int(info["pos"])
