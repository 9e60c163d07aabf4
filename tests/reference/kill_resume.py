# SPDX-License-Identifier: GPL-3.0-or-later
"""kill -9 at ten moments of a measurement, then --resume: the CSVs equal those of an undisturbed run."""
import random
import signal
import subprocess
import time

from kneeprint_tool import TOOL, WORK, check, run, write_plan

plan = write_plan(WORK / "kill-plan.json")
arguments = ["--plan", plan, "--rig", "virtual:triode", "--seed", "9"]
undisturbed = WORK / "undisturbed"
started = time.monotonic()
run("measure", "--into", undisturbed, *arguments)
whole = time.monotonic() - started

cut = WORK / "cut"
moments = random.Random(20260101)
kills = 0
resume = []
for _ in range(40):
    command = [TOOL, "measure", "--into", str(cut), *map(str, arguments), *resume]
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    try:
        # Anywhere in a run; a fraction of its length, so that slow machines are cut as well.
        process.wait(timeout=moments.uniform(0.05, 0.6) * whole)
        check(process.returncode == 0, "a run that was left alone ends well")
        break
    except subprocess.TimeoutExpired:
        process.send_signal(signal.SIGKILL)
        process.wait()
        kills += 1
    resume = ["--resume"] if (cut / "plan.json").exists() else []
    if kills == 10:
        run("measure", "--into", cut, *arguments, *resume)
        break
print(f"{kills} kills")
check(kills == 10, "ten runs were cut")
for name in ("levels", "harmonics", "intermod", "response"):
    check((cut / "curves" / f"{name}.csv").read_bytes() ==
          (undisturbed / "curves" / f"{name}.csv").read_bytes(), f"{name}.csv is the same, byte for byte")
check((cut / "model.json").read_bytes() == (undisturbed / "model.json").read_bytes(),
      "model.json is the same, byte for byte")
