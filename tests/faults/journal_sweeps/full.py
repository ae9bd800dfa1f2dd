"""A disk that fills up while the journal is written to, and has room again.

The loss is told; nothing that was acknowledged is gone, not even when the process is killed there;
the file opens with not a block left; and with room again it comes back by itself.
"""

import os
import random
import select
import signal
import subprocess
import time

import mounts
import rig

PART = "full"
KINDS = ["ext4-ordered-1024", "ext4-ordered-4096", "tmpfs"]
# From the moment at which not a block is left; the goals are 1 s and 10 s.
TOLD_WITHIN_S, BACK_WITHIN_S = 1.0, 10.0
BATCHES = 400


def run(r):
    lack = mounts.missing(r.base, cuts=False)
    if lack:
        raise rig.NotRun(lack)
    tally = rig.Tally(PART)
    tally.expect("deaf")
    told, back = [0.0], [0.0]
    for task, (why, told_s, back_s) in r.each(PART, one, _tasks(r), jobs=r.jobs * 2):
        _, f = rig.fields(task)
        tally.take(task, why, None if f["durability"] == "full" else f["durability"])
        told.append(told_s)
        back.append(back_s)
    tally.note("told_s_max", round(max(told), 3))
    tally.note("back_s_max", round(max(back), 3))
    return tally.end()


def _tasks(r):
    draw = random.Random(r.seed)
    for kind in KINDS:
        for n in range(100 if r.long else 2):
            then = ("killed", "room")[n % 2]
            yield _task(kind, r.seed + n, "full", then, draw.randint(5, 150))
    yield _task("ext4-ordered-4096", r.seed, "deaf", "killed", 20)


def _task(kind, seed, durability, then, acks):
    return rig.words(PART, kind=kind, seed=seed, durability=durability, then=then, acks=acks)


def one(place, task):
    """(None or what is bad, seconds until told, seconds until back)."""
    _, f = rig.fields(task)
    with mounts.Mounted(place.base, f["kind"]) as m:
        place.root = os.path.join(m.point, "root")
        place.state = os.path.join(place.root, "state")
        place.fresh("stop")
        disk = _Filling(place, m, f)
        why = disk.go()
        return why, disk.told_s, disk.back_s


class _Filling:
    def __init__(self, place, mounted, f):
        self.place, self.mounted, self.f = place, mounted, f
        self.told_s = self.back_s = 0.0
        self.lines = []

    def go(self):
        argv = self.place.argv(
            "stop", self.f["seed"], BATCHES, self.f["durability"], patience_ms=30_000
        )
        self.process = subprocess.Popen(argv, stdout=subprocess.PIPE)
        try:
            return self.filled() or self.after()
        finally:
            self.process.kill()
            self.process.wait()
            self.process.stdout.close()

    def filled(self):
        for _ in range(int(self.f["acks"])):
            if self.until("ACK ", 30) is None:
                return "QUIET before the disk was full"
        # It stands still meanwhile, so that it cannot come to its end before the disk is full.
        self.process.send_signal(signal.SIGSTOP)
        self.mounted.fill()
        self.process.send_signal(signal.SIGCONT)
        if self.f["durability"] != "full":
            self.until("DONE ", 30)
            return None
        begin = time.monotonic()
        if self.until("LOST ", 30) is None:
            return f"NOT-TOLD that the disk is full, {self.lines[-1:]}"
        self.told_s = time.monotonic() - begin
        if self.told_s > TOLD_WITHIN_S:
            return f"LATE the loss was told after {self.told_s:.2f} s"
        return None

    def after(self):
        if self.f["then"] == "killed":
            self.process.send_signal(signal.SIGKILL)
            self.until("nothing", 30)
            return self.check("--full") or self.emptied() or self.check()
        self.emptied()
        begin = time.monotonic()
        if self.until("BACK", 30) is None:
            return "NO-BACK although there is room"
        self.back_s = time.monotonic() - begin
        if self.back_s > BACK_WITHIN_S:
            return f"LATE it was back after {self.back_s:.1f} s"
        if self.until("DONE ", 60) is None or self.process.wait(30) != 0:
            return f"ENDED otherwise than done: {self.lines[-2:]}"
        return self.check()

    def emptied(self):
        self.mounted.empty()

    def check(self, *how):
        with open(self.place.out, "w", encoding="utf-8") as out:
            out.writelines(line for line in self.lines if line.endswith("\n"))
        argv = [self.place.hammer, "check", self.place.state, "--heard", self.place.out, *how]
        run = subprocess.run(argv, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True)
        return None if run.returncode == 0 else f"{' '.join(how)} {run.stdout.strip()}"

    def until(self, begins, seconds):
        """Reads lines until one begins so; None at the end of them or of the time."""
        end = time.monotonic() + seconds
        while True:
            left = end - time.monotonic()
            ready, _, _ = select.select([self.process.stdout], [], [], max(0, left))
            line = _line(self.process.stdout) if ready else ""
            if line:
                self.lines.append(line)
            if not line or line.startswith(begins):
                return line or None


def _line(pipe):
    """One line, byte by byte, so that none waits in a buffer that `select` cannot see."""
    line = b""
    while not line.endswith(b"\n"):
        byte = os.read(pipe.fileno(), 1)
        if not byte:
            break
        line += byte
    return line.decode()
