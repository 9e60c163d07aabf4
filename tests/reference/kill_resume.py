# SPDX-License-Identifier: GPL-3.0-or-later
"""kill -9 at ten moments of a measurement, then --resume: the CSVs equal those of an undisturbed run."""
import random
import shutil
import signal
import subprocess
import time

from kneeprint_tool import TOOL, WORK, check, run, write_plan

plan = write_plan(WORK / "kill-plan.json", ladder={"from": -30, "to": -10, "step_db": 5, "unit": "dBFS"},
                  steps=[{"method": "steady", "frequencies_hz": [997]}, {"method": "smpte"}])
arguments = ["--plan", plan, "--rig", "virtual:triode", "--seed", "9"]
undisturbed = WORK / "undisturbed"
started = time.monotonic()
run("measure", "--into", undisturbed, *arguments)
whole = time.monotonic() - started

moments = random.Random(20260101)
kills = 0
while kills < 10:
    cut = WORK / f"cut-{kills}"
    command = [TOOL, "measure", "--into", str(cut), *map(str, arguments)]
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    try:
        # Anywhere in a run: a fraction of its length, so that slow machines are cut as well.
        process.wait(timeout=moments.uniform(0.0, 0.95) * whole)
        check(process.returncode == 0, "a run that ended before its kill ended well")
        shutil.rmtree(cut)
        continue
    except subprocess.TimeoutExpired:
        process.send_signal(signal.SIGKILL)
        process.wait()
    kills += 1
    kept = len(list((cut / "takes").glob("*.wav"))) if cut.exists() else 0
    run("measure", "--into", cut, *arguments, "--resume")
    for name in ("curves/levels.csv", "curves/harmonics.csv", "curves/intermod.csv",
                 "curves/response.csv", "model.json"):
        check((cut / name).read_bytes() == (undisturbed / name).read_bytes(),
              f"kill {kills} ({kept} takes were kept): {name} is the same, byte for byte")
check(kills == 10, "ten runs were cut")
