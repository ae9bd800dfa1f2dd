"""What all parts share: the hammer, scratch folders, the checker, and a pool of workers."""

import json
import multiprocessing
import multiprocessing.util
import os
import shlex
import shutil
import signal
import subprocess
import sys
import tempfile
import time

HERE = os.path.dirname(os.path.abspath(__file__))
REPOSITORY = os.path.normpath(os.path.join(HERE, "../../.."))
GOOD, BAD, USAGE, NOT_RUN = 0, 1, 2, 77

# The modes of the hammer, those of them that do not begin with an empty folder, and what part of the
# usual work (one in so many) a mode with a large file gets.
MODES = ["append", "again", "checkpoint", "seal", "retain", "backup", "pack", "migrate", "stop"]
PREPARED = ["again", "pack", "migrate"]
SHARE = {"checkpoint": 6, "pack": 40}
# Room that is taken and given back: nothing that is in it is ever read.
RESERVE = "/state/reserve"


class NotRun(Exception):
    """A means that this machine does not have."""


def say(text):
    print(text, file=sys.stderr, flush=True)


def hammer():
    """Builds the hammer and gives its path."""
    given = os.environ.get("HAMMER")
    if given:
        return given
    build = ["cargo", "build", "--locked", "-p", "journal", "--example", "hammer"]
    build += ["--message-format=json-render-diagnostics"]
    run = subprocess.run(build, cwd=REPOSITORY, stdout=subprocess.PIPE, text=True)
    if run.returncode != 0:
        raise SystemExit("the hammer does not build")
    for line in run.stdout.splitlines():
        message = json.loads(line)
        if message.get("target", {}).get("name") == "hammer" and message.get("executable"):
            return message["executable"]
    raise SystemExit("cargo does not say where the hammer is")


def scratch():
    """A folder in memory if there is one: what is swept here is the order of calls, not the disk."""
    memory = "/dev/shm"
    there = os.path.isdir(memory) and os.access(memory, os.W_OK)
    return tempfile.mkdtemp(prefix="sweep-", dir=memory if there else None)


def fields(task):
    """A task in words, `part name=value ...`, which is also how it is asked for again."""
    words = task.split()
    return words[0], dict(w.split("=", 1) for w in words[1:])


def words(part, **values):
    return " ".join([part] + [f"{name}={value}" for name, value in values.items()])


def again(task):
    return f"tests/faults/journal_sweeps/sweep.py again {shlex.quote(task)}"


class Place:
    """One worker's folder: `state` in `root`, what was said in `out`, and a checker."""

    def __init__(self, base, hammer_path):
        self.hammer = hammer_path
        self.base = tempfile.mkdtemp(prefix="w", dir=base)
        self.root = os.path.join(self.base, "root")
        self.state = os.path.join(self.root, "state")
        self.out = os.path.join(self.base, "out")
        self._checker = None

    def fresh(self, mode):
        """What the mode begins with: an empty state folder, or a copy of a prepared one with what was
        heard of it."""
        shutil.rmtree(self.root, ignore_errors=True)
        if mode in PREPARED:
            made = self._prepared(mode)
            shutil.copytree(os.path.join(made, "root"), self.root)
            shutil.copy(os.path.join(made, "out"), self.out)
        else:
            os.makedirs(self.state)
            open(self.out, "w").close()

    def _prepared(self, mode):
        """Made once by each worker."""
        made = os.path.join(self.base, "prepared", mode)
        state = os.path.join(made, "root", "state")
        if not os.path.isdir(state):
            os.makedirs(state)
            # `again` goes on where an `append` was killed: there is a WAL.
            how = ["run", "append"] if mode == "again" else ["prepare", mode]
            with open(os.path.join(made, "out"), "wb") as out:
                subprocess.run([self.hammer, *how, state], stdout=out, check=True)
        return made

    def close(self):
        if self._checker is not None:
            self._checker.stdin.close()
            self._checker.wait()

    def argv(self, mode, seed=1, batches=6, durability="full", patience_ms=10_000):
        return [
            self.hammer, "run", mode, self.state, "--seed", str(seed), "--batches", str(batches),
            "--durability", durability, "--patience-ms", str(patience_ms),
        ]

    def check(self, state=None, acked=0, heard=None, lines=2**62):
        """None if it is good, else what is bad."""
        if self._checker is None or self._checker.poll() is not None:
            self._checker = subprocess.Popen(
                [self.hammer, "check", "--batch"], text=True,
                stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL,
            )
        checker = self._checker
        line = f"{state or self.state}\t{acked}\t{heard or self.out}\t{lines}\n"
        try:
            checker.stdin.write(line)
            checker.stdin.flush()
            answer = checker.stdout.readline().strip()
        except BrokenPipeError:
            answer = ""
        if answer.startswith("OK"):
            return None
        if answer.startswith("BAD "):
            return answer[4:]
        code = checker.wait()
        self._checker = None
        return f"DIED the check itself ended with {code}"


_place = None


def _begin(base, hammer_path):
    global _place
    signal.signal(signal.SIGTERM, signal.SIG_DFL)
    _place = Place(base, hammer_path)
    multiprocessing.util.Finalize(None, _place.close, exitpriority=10)


def _work(job):
    function, task = job
    return task, function(_place, task)


class Rig:
    """Runs tasks in workers and keeps count."""

    def __init__(self, jobs, seed, long):
        self.jobs, self.seed, self.long = jobs, seed, long
        self.hammer = hammer()
        self.base = scratch()

    def close(self):
        shutil.rmtree(self.base, ignore_errors=True)

    def each(self, name, function, tasks, jobs=None):
        """Yields (task, result) as they end, with progress."""
        tasks = list(tasks)
        jobs = min(jobs or self.jobs, max(1, len(tasks)))
        begin = shown = time.monotonic()
        with multiprocessing.Pool(jobs, _begin, (self.base, self.hammer)) as pool:
            # Ends at once if something breaks in the loop, and in good order otherwise.
            chunk = max(1, min(16, len(tasks) // (jobs * 8)))
            jobs_list = ((function, task) for task in tasks)
            ended = pool.imap_unordered(_work, jobs_list, chunksize=chunk)
            for n, (task, result) in enumerate(ended, 1):
                yield task, result
                if time.monotonic() - shown > 10 or n == len(tasks):
                    shown = time.monotonic()
                    say(f"{name}: {n} of {len(tasks)}, {shown - begin:.0f} s")
            pool.close()
            pool.join()

    def here(self):
        """A place for this process."""
        return Place(self.base, self.hammer)


class Tally:
    """Runs and what was bad, apart for each control; a control in which nothing is bad is bad."""

    def __init__(self, part):
        self.part, self.runs, self.bad, self.controls, self.more = part, 0, 0, {}, {}
        self.begin = time.monotonic()
        self.shown = 0

    def take(self, task, why, control=None):
        if control:
            counts = self.controls.setdefault(control, {"runs": 0, "bad": 0})
            counts["runs"] += 1
            counts["bad"] += why is not None
            return
        self.runs += 1
        if why is not None:
            self.bad += 1
            self.shown += 1
            if self.shown <= 20:
                say(f"BAD {why}\n    {again(task)}")

    def expect(self, control):
        self.controls.setdefault(control, {"runs": 0, "bad": 0})

    def note(self, name, value):
        self.more[name] = value

    def end(self):
        """Prints the line of results and gives the exit code."""
        blind = [name for name, c in self.controls.items() if c["bad"] == 0]
        for name in blind:
            say(f"BAD {self.part}: the control {name} did not fail, so this sweep sees nothing")
        line = {"part": self.part, "runs": self.runs, "bad": self.bad, "controls": self.controls}
        line.update(self.more)
        line["seconds"] = round(time.monotonic() - self.begin, 1)
        print(json.dumps(line), flush=True)
        return BAD if self.bad or blind or self.runs == 0 else GOOD
