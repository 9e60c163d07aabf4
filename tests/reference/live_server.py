# SPDX-License-Identifier: GPL-3.0-or-later
"""A third-party processor behind a real audio server, measured live, against the same processor offline.

Starts its own JACK server (dummy driver) and an ecasound client with a LADSPA valve saturator, ends both
by their process ids. Without either it fails: nothing here is skipped.
"""
import json
import math
import os
import subprocess
import time

from kneeprint_tool import WORK, check, model, run, table, write_plan

SERVER = f"kneeprint-test-{os.getpid()}"
ENVIRONMENT = dict(os.environ, JACK_DEFAULT_SERVER=SERVER, JACK_NO_AUDIO_RESERVATION="1",
                   JACK_NO_START_SERVER="1", LADSPA_PATH="/usr/lib/ladspa")
PLUGIN = "-eli:1209,0.8,0.6"


def start(command, log):
    return subprocess.Popen(command, env=ENVIRONMENT, stdin=subprocess.DEVNULL,
                            stdout=open(WORK / log, "w"), stderr=subprocess.STDOUT)


def wait_for(sentence, ready, processes):
    deadline = time.monotonic() + 30
    while not ready():
        for p in processes:
            check(p.poll() is None, f"{p.args[0]} is still running while we wait for {sentence}")
        check(time.monotonic() < deadline, f"{sentence} within 30 s")
        time.sleep(0.1)


def ports():
    listed = subprocess.run(["jack_lsp"], env=ENVIRONMENT, capture_output=True, text=True)
    return listed.stdout if listed.returncode == 0 else ""


plan = write_plan(WORK / "live-plan.json", ladder={"from": -44, "to": -8, "step_db": 6, "unit": "dBFS"},
                  steps=[{"method": "steady", "frequencies_hz": [997]}, {"method": "smpte"},
                         {"method": "ccif"}])
processes = []
try:
    server = start(["jackd", "--no-realtime", "-n", SERVER, "-d", "dummy", "-r", "48000", "-p", "1024"],
                   "jackd.log")
    processes.append(server)
    wait_for("the audio server", lambda: "system:capture_1" in ports(), processes)
    processor = start(["ecasound", "-q", "-f:32,2,48000", "-i:jack", "-o:jack", PLUGIN], "ecasound.log")
    processes.append(processor)
    wait_for("the processor's ports",
             lambda: "ecasound:in_1" in ports() and "ecasound:out_1" in ports(), processes)

    listing = run("devices", env=ENVIRONMENT)
    check("ecasound" in listing.stdout, "the processor is listed as a device")
    check(listing.stderr == "", "and the drivers' chatter is not")
    devices = json.loads(run("devices", "--json", env=ENVIRONMENT).stdout)["devices"]
    check(any(d["name"] == "ecasound" for d in devices), "in JSON too")

    refused = run("measure", "--into", WORK / "unarmed", "--device", "ecasound", "--plan", plan,
                  expect=2, env=ENVIRONMENT)
    check("--armed" in refused.stderr, "a live rig does not play unarmed, and says how")
    run("measure", "--into", WORK / "nobody", "--device", "no such device", "--armed", "--plan", plan,
        expect=4, env=ENVIRONMENT)

    quiet = WORK / "live-quiet"
    run("measure", "--into", quiet, "--device", "ecasound", "--armed", "--plan", plan, env=ENVIRONMENT)
    check(max(float(r["drive"]) for r in table(quiet, "levels")) <= -20,
          "no rung above -20 dBFS until another ceiling is named")

    live = WORK / "live"
    run("measure", "--into", live, "--device", "ecasound", "--armed", "--ceiling", "-6", "--plan", plan,
        env=ENVIRONMENT)
    reference = WORK / "live-reference"
    run("measure", "--into", reference, "--device", "ecasound", "--armed", "--ceiling", "-6", "--plan",
        plan, "--reference", "2", env=ENVIRONMENT, expect=6)
finally:
    for p in reversed(processes):
        p.terminate()
        try:
            p.wait(timeout=10)
        except subprocess.TimeoutExpired:
            p.kill()
            p.wait()

offline = WORK / "offline"
run("reel", "--into", offline, "--plan", plan, "--rate", "48000")
subprocess.run(["ecasound", "-q", "-f:f32_le,1,48000", f"-i:{offline}/reel.wav", f"-o:{offline}/response.wav",
                PLUGIN], env=ENVIRONMENT, check=True, stdin=subprocess.DEVNULL, capture_output=True)
run("ingest", offline, offline / "response.wav")


def rows(folder, name, key):
    return {tuple(r[k] for k in key) if "drive" not in key else
            tuple(round(float(r[k]), 3) if k == "drive" else r[k] for k in key): r
            for r in table(folder, name)}


worst, compared = 0.0, 0
a, b = (rows(f, "harmonics", ("drive", "order")) for f in (live, offline))
for key, row in a.items():
    other = b.get(key)
    if key[1] == "1" or not other or row["flag"] or other["flag"] or float(row["relative_db"]) < -100:
        continue
    worst = max(worst, abs(float(row["relative_db"]) - float(other["relative_db"])))
    compared += 1
check(compared >= 20, f"{compared} harmonics down to -100 dB are in both")
check(worst < 0.01, f"live and offline agree within {worst:.5f} dB")
worst = 0.0
a, b = (rows(f, "intermod", ("method", "product", "drive")) for f in (live, offline))
for key, row in a.items():
    if not row["flag"] and not b[key]["flag"] and float(row["db"]) > -100:
        worst = max(worst, abs(float(row["db"]) - float(b[key]["db"])))
check(worst < 0.01, f"two-tone products agree within {worst:.5f} dB")
families = model(live)["best"]["family"], model(offline)["best"]["family"]
check(families[0] == families[1], f"both fits choose the same family: {families[0]}")
