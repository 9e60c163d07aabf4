# SPDX-License-Identifier: GPL-3.0-or-later
"""Times all contestants on the same takes, turn by turn, and prints ratios: run.py BUILD WORK"""
import os
import pathlib
import statistics
import subprocess
import sys


BUILD, WORK = map(pathlib.Path, sys.argv[1:3])
HERE = pathlib.Path(__file__).parent
BENCH, PEER, TOOL = BUILD / "kneeprint_bench", BUILD / "kneeprint_bench_peer", BUILD / "kneeprint"
ROUNDS, TIMES = 5, 9
# name: what a reading is compared with; takes of both two-tone methods are added up
WORKLOADS = {"steady: H1..H10, THD, THD+N": ["steady"], "two-tone: products": ["smpte", "ccif"]}


def contestants(workload):
    return {
        "C, estimated plan": [PEER, "time", WORK, workload, TIMES],
        "C, stored plan": [PEER, "time", WORK, workload, TIMES, WORK / f"{workload}.wisdom"],
        "kneeprint": [BENCH, "time", WORK, workload, TIMES],
        "numpy": [sys.executable, HERE / "peer.py", WORK, workload, TIMES, "numpy"],
        "scipy": [sys.executable, HERE / "peer.py", WORK, workload, TIMES, "scipy"],
    }


def run(command):
    return subprocess.run([str(c) for c in command], check=True, capture_output=True, text=True).stdout


def one_round(command):
    first, warm, figures = 0.0, [], 0
    for line in run(command).splitlines():
        word, value = line.split()
        if word == "first":
            first = float(value)
        elif word == "warm":
            warm.append(float(value))
        else:
            figures = int(value)
    return first, statistics.median(warm), figures


def compare(title, workloads):
    """Each round starts every contestant once per workload; figures are medians over the rounds."""
    names = list(contestants(workloads[0]))
    first, warm, figures = ({n: [] for n in names} for _ in range(3))
    for _ in range(ROUNDS):
        for name in names:
            parts = [one_round(contestants(w)[name]) for w in workloads]
            for sums, values in zip((first, warm, figures), zip(*parts)):
                sums[name].append(sum(values))
    ms = {n: (1e3 * statistics.median(first[n]), 1e3 * statistics.median(warm[n])) for n in names}
    print(f"\n{title} (one thread, compute only, medians of {ROUNDS} rounds)")
    print(f"{'':20}{'first call':>12}{'warm':>10}{'figures':>9}   kneeprint / this: first, warm")
    ours = ms["kneeprint"]
    for n in names:
        print(f"{n:20}{ms[n][0]:9.2f} ms{ms[n][1]:7.2f} ms{figures[n][0]:9d}"
              f"{ours[0] / ms[n][0]:14.2f}{ours[1] / ms[n][1]:8.2f}")
    print(f"first call: {ours[0] / ms['C, estimated plan'][0]:.2f} x C with estimated plans, planning "
          f"included; warm: {ours[1] / ms['C, stored plan'][1]:.2f} x C with stored plans")


print(f"{os.cpu_count()} cores")
run([BENCH, "make", WORK])
for title, workloads in WORKLOADS.items():
    for w in workloads:
        run([PEER, "plan", WORK, w, WORK / f"{w}.wisdom"])
    compare(title, workloads)
