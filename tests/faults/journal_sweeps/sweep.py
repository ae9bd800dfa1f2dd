#!/usr/bin/env python3
"""The journal under kills, errors, crashes, full disks and power cuts.

    sweep.py PART [--short|--long] [--jobs N] [--seed N]     kills errors states full cuts, or all
    sweep.py again 'TASK'                                    one run once more, as a failure named it
    sweep.py build                                           builds the hammer, says where it is

One line of JSON a part on standard output, progress on standard error. Ends with 0 good, 1 something
bad or a control that did not fail, 2 usage, 77 a part could not be run here.
"""

import argparse
import importlib
import json
import os
import signal
import sys

sys.dont_write_bytecode = True

import rig  # noqa: E402

PARTS = ["kills", "errors", "states", "full", "cuts"]


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("part", choices=PARTS + ["all", "again", "build"])
    parser.add_argument("task", nargs="?", help="for `again`: the task in words")
    form = parser.add_mutually_exclusive_group()
    form.add_argument("--short", action="store_true", help="a sample, for each commit (as it is)")
    form.add_argument("--long", action="store_true", help="everything")
    parser.add_argument("--jobs", type=int, default=os.cpu_count())
    parser.add_argument("--seed", type=int, default=1)
    args = parser.parse_args()
    if args.part == "build":
        print(rig.hammer())
        return rig.GOOD
    # So that what is under way is ended and cleared away.
    signal.signal(signal.SIGTERM, lambda *_: sys.exit(rig.BAD))
    r = rig.Rig(args.jobs, args.seed, args.long)
    try:
        if args.part == "again":
            return again(r, args.task or parser.error("which task?"))
        parts = PARTS if args.part == "all" else [args.part]
        return worst([part(r, name) for name in parts])
    finally:
        r.close()


def part(r, name):
    rig.say(f"== {name}")
    try:
        return importlib.import_module(name).run(r)
    except rig.NotRun as lack:
        rig.say(f"NOT RUN {name}: {lack}")
        print(json.dumps({"part": name, "not_run": str(lack)}), flush=True)
        return rig.NOT_RUN


def worst(codes):
    return rig.BAD if rig.BAD in codes else max(codes)


def again(r, task):
    name, _ = rig.fields(task)
    place = r.here()
    result = importlib.import_module(name).one(place, task)
    with open(place.out, encoding="utf-8") as heard:
        sys.stderr.write(heard.read())
    bad = result[0] if isinstance(result, tuple) else result
    print(f"{task}: {bad or 'good'} {result if isinstance(result, tuple) else ''}")
    return rig.BAD if bad else rig.GOOD


if __name__ == "__main__":
    sys.exit(main())
