# SPDX-License-Identifier: GPL-3.0-or-later
"""Times all contestants on the same takes, turn by turn, and prints ratios: run.py BUILD WORK"""
import os
import pathlib
import statistics
import subprocess
import sys

import folders

BUILD, WORK = map(pathlib.Path, sys.argv[1:3])
HERE = pathlib.Path(__file__).parent
BENCH, PEER, TOOL = BUILD / "kneeprint_bench", BUILD / "kneeprint_bench_peer", BUILD / "kneeprint"
ROUNDS = 5
# Takes of both two-tone methods are added up.
WORKLOADS = {
    "60 steady takes of a second at 96 kHz: H1..H10, THD, THD+N": ["steady"],
    "80 two-tone takes of a second at 96 kHz: products to order 5": ["smpte", "ccif"],
    "a sweep of 20 s at 96 kHz, three times: responses of ten orders": ["sweep"],
}


def contestants(workload):
    wisdom = WORK / f"{workload}.wisdom"
    return {
        "C, estimated plan": [PEER, "time", WORK, workload, 9],
        "C, stored plan": [PEER, "time", WORK, workload, 9, wisdom],
        "kneeprint": [BENCH, "time", WORK, workload, 9],
        "numpy": [sys.executable, HERE / "peer.py", WORK, workload, 2, "numpy"],
        "scipy": [sys.executable, HERE / "peer.py", WORK, workload, 4, "scipy"],
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
    print(f"\n{title}\n{'':20}{'first call':>13}{'warm':>12}{'figures':>9}   kneeprint / this: first, warm")
    ours = ms["kneeprint"]
    for n in names:
        print(f"{n:20}{ms[n][0]:10.2f} ms{ms[n][1]:9.2f} ms{figures[n][0]:9d}"
              f"{ours[0] / ms[n][0]:14.2f}{ours[1] / ms[n][1]:8.2f}")
    print(f"first call, planning included, over C with an estimated plan: "
          f"{ours[0] / ms['C, estimated plan'][0]:.2f}; warm, over C with a stored plan: "
          f"{ours[1] / ms['C, stored plan'][1]:.2f}, with an estimated one: "
          f"{ours[1] / ms['C, estimated plan'][1]:.2f}", flush=True)


print(f"Processor time on one thread, compute only, medians of {ROUNDS} rounds in turns; Kneeprint with all "
      f"uncertainties. {os.cpu_count()} cores, load {os.getloadavg()[0]:.1f}", flush=True)
run([BENCH, "make", WORK])
for title, workloads in WORKLOADS.items():
    for w in workloads:
        if not (WORK / f"{w}.wisdom").exists():
            print(f"measuring the peer's plan for {w} (once)", flush=True)
            run([PEER, "plan", WORK, w, WORK / f"{w}.wisdom"])
    compare(title, workloads)
folders.grow(TOOL, WORK)
