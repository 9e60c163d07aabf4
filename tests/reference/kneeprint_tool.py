# SPDX-License-Identifier: GPL-3.0-or-later
"""What the reference scripts share: running the tool, reading its folder."""
import csv
import json
import pathlib
import subprocess
import sys

TOOL = sys.argv[1]
WORK = pathlib.Path(sys.argv[2])


def run(*arguments, expect=0, **options):
    """Runs the tool; fails the script when the exit code is not the expected one."""
    done = subprocess.run([TOOL, *map(str, arguments)], capture_output=True, text=True, timeout=600,
                          **options)
    if done.returncode != expect:
        sys.exit(f"kneeprint {' '.join(map(str, arguments))}: exit {done.returncode}, expected {expect}\n"
                 f"{done.stdout}\n{done.stderr}")
    return done


def write_plan(path, **changes):
    """A plan small enough for a test; `changes` replace its fields."""
    plan = {
        "format": "kneeprint-plan", "version": 1, "name": "test",
        "ladder": {"from": -40, "to": -10, "step_db": 5, "unit": "dBFS"},
        "steps": [{"method": "steady", "frequencies_hz": [997]}, {"method": "smpte"},
                  {"method": "ccif"}],
        "orders": 10, "block_s": 0.5, "blocks": 3,
    }
    plan.update(changes)
    path = pathlib.Path(path)
    path.write_text(json.dumps(plan))
    return path


def table(folder, name):
    with open(pathlib.Path(folder) / "curves" / f"{name}.csv", newline="") as file:
        return list(csv.DictReader(file))


def model(folder):
    return json.loads((pathlib.Path(folder) / "model.json").read_text())


def journal(folder):
    lines = (pathlib.Path(folder) / "journal.jsonl").read_text().splitlines()
    return [json.loads(line) for line in lines]


def check(condition, sentence):
    print(("ok: " if condition else "FAILED: ") + sentence)
    if not condition:
        sys.exit(1)
