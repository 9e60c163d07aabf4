# SPDX-License-Identifier: GPL-3.0-or-later
"""Kneeprint folders of any number of takes, and what `kneeprint analyse` spends on them.

A few takes are measured on the virtual rig; the folders link them over and over, under journals as valid as a
measurement's own."""
import json
import os
import pathlib
import resource
import shutil
import statistics
import subprocess
import time
import zlib

TONES = [(250 + 100 * k) * 1.01 for k in range(25)]  # 25 takes to a rung
MOST_RUNGS = 400


def plan(rungs):
    return json.dumps({
        "format": "kneeprint-plan", "version": 1, "name": "bench",
        "ladder": {"from": -40, "to": -40 + 0.1 * (rungs - 1), "step_db": 0.1, "unit": "dBFS"},
        "steps": [{"method": "steady", "frequencies_hz": TONES}],
        "orders": 10, "block_s": 0.1, "blocks": 3})


def sealed(event):
    """A journal line: the object and, as its last field, the checksum of the object without it."""
    text = json.dumps(event, separators=(",", ":"), ensure_ascii=False)
    return f'{text[:-1]},"line_crc32":"{zlib.crc32(text.encode()):08x}"}}\n'


def measured(tool, work):
    folder = work / "measured"
    shutil.rmtree(folder, ignore_errors=True)
    (work / "plan.json").write_text(plan(1))
    subprocess.run([tool, "measure", "--into", folder, "--plan", work / "plan.json", "--rig", "virtual:sigmoid",
                    "--seed", "1", "--takes-only"], check=True, capture_output=True)
    return folder


def grown(tool, source, work, takes):
    """`source` with its rung played `takes` / 25 times at rising drive (the same files throughout)."""
    rungs = takes // len(TONES)
    assert takes % len(TONES) == 0 and rungs <= MOST_RUNGS
    folder = work / f"takes-{takes}"
    shutil.rmtree(folder, ignore_errors=True)
    (folder / "takes").mkdir(parents=True)
    shutil.copy(source / "rig.json", folder)
    (folder / "plan.json").write_text(plan(rungs))
    lines = [json.loads(line) for line in (source / "journal.jsonl").read_text().splitlines()]
    begin, kept = lines[0], [l for l in lines if l["event"] == "take" and l["rung"] == 0]
    with open(folder / "journal.jsonl", "w") as journal:
        for event in [begin] + [
                {**take, "number": take["number"] + rung * len(TONES), "rung": rung, "send_dbfs": -40 + 0.1 * rung,
                 "file": f"takes/{take['number'] + rung * len(TONES):05d}.wav"}
                for rung in range(rungs) for take in kept]:
            event.pop("line_crc32", None)
            journal.write(sealed(event))
            if event["event"] == "take":
                number = (event["number"] - 1) % len(TONES)
                os.link(source / kept[number]["file"], folder / event["file"])
    return folder


def analyse(tool, folder, cores):
    """Seconds, processor seconds and peak MiB of one run on so many cores."""
    code = ("import os,resource,subprocess,sys,time\n"
            f"os.sched_setaffinity(0, sorted(os.sched_getaffinity(0))[:{cores}])\n"
            "b=time.perf_counter(); subprocess.run(sys.argv[1:], check=True, stdout=subprocess.DEVNULL)\n"
            "e=time.perf_counter(); u=resource.getrusage(resource.RUSAGE_CHILDREN)\n"
            "print(e-b, u.ru_utime+u.ru_stime, u.ru_maxrss/1024)")
    out = subprocess.run(["/usr/bin/python3", "-c", code, str(tool), "analyse", str(folder)], check=True,
                         capture_output=True, text=True).stdout
    return tuple(map(float, out.split()))


def grow(tool, work, counts=(100, 1000, 10000), rounds=3):
    cores = len(os.sched_getaffinity(0))
    source = measured(tool, work)
    folders = {n: grown(tool, source, work, n) for n in counts}
    seconds = {}
    print("\nkneeprint analyse (whole runs: files, checksums, readings, tables), medians of "
          f"{rounds} rounds\n{'takes':>8}{'cores':>7}{'ms per take':>13}{'processor':>11}{'peak MiB':>10}")
    results = {(n, c): [] for n in counts for c in (1, cores)}
    for _ in range(rounds):
        for n, c in results:
            results[n, c].append(analyse(tool, folders[n], c))
    for (n, c), runs in results.items():
        wall, spent, peak = (statistics.median(r[k] for r in runs) for k in range(3))
        seconds[n, c] = wall
        print(f"{n:8d}{c:7d}{1e3 * wall / n:13.3f}{1e3 * spent / n:11.3f}{peak:10.1f}")
    a, b = sorted(counts)[-2:]
    growth = seconds[b, cores] / seconds[a, cores] / (b / a)
    print(f"{b} takes cost {growth:.2f} times what {b // a} times {a} do (1: linear); "
          f"{cores} cores are {seconds[b, 1] / seconds[b, cores]:.2f} times as fast as one")
    for folder in folders.values():
        shutil.rmtree(folder)
