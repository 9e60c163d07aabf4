# SPDX-License-Identifier: GPL-3.0-or-later
"""Wrong inputs: the documented exit code, a sentence that names what and where, and nothing lost."""
import json
import os
import shutil
import struct
import wave

from kneeprint_tool import WORK, check, run, write_plan


def refuses(code, words, *arguments, **options):
    done = run(*arguments, expect=code, **options)
    for word in words:
        check(word in done.stderr, f"exit {code}, and the message names {word!r}: {done.stderr.strip()}")
    check(done.stdout == "", "nothing on stdout")


# Usage
refuses(2, ["--into"], "measure")
refuses(2, ["unknown-unit"], "measure", "--into", WORK / "u", "--rig", "virtual:unknown-unit")
refuses(2, ["frobnicate"], "frobnicate")

# Plans
refuses(3, ["missing-plan.json"], "measure", "--into", WORK / "a", "--plan", WORK / "missing-plan.json")
method = write_plan(WORK / "method.json", steps=[{"method": "ouija"}])
refuses(3, ["method.json", "ouija", "steady"], "measure", "--into", WORK / "a", "--plan", method)
negative = write_plan(WORK / "negative.json",
                      ladder={"from": -0.5, "to": 1, "step_db": 3, "unit": "V"})
refuses(3, ["negative.json", "ladder.from", "-0.5"], "measure", "--into", WORK / "a", "--plan", negative)
broken = WORK / "broken.json"
broken.write_text('{"format": "kneeprint-plan",')
refuses(3, ["broken.json"], "measure", "--into", WORK / "a", "--plan", broken)
check(not (WORK / "a").exists(), "a refused plan leaves no folder")

# Folders
blocked = WORK / "blocked"
blocked.write_text("a file where a folder should be")
refuses(3, ["blocked"], "measure", "--into", blocked / "inner", "--plan", "glance")
refuses(3, ["nowhere"], "analyse", WORK / "nowhere")

# Reels
plan = write_plan(WORK / "plan.json", steps=[{"method": "steady", "frequencies_hz": [997]}],
                  ladder={"from": -30, "to": -20, "step_db": 5, "unit": "dBFS"})
other = write_plan(WORK / "other.json", steps=[{"method": "steady", "frequencies_hz": [500]}],
                   ladder={"from": -30, "to": -20, "step_db": 5, "unit": "dBFS"})
ours, theirs = WORK / "ours", WORK / "theirs"
run("reel", "--into", ours, "--plan", plan)
run("reel", "--into", theirs, "--plan", other)
reel = ours / "reel.wav"
refuses(3, ["plan"], "ingest", ours, theirs / "reel.wav")
truncated = WORK / "truncated.wav"
truncated.write_bytes(reel.read_bytes()[:200000])
refuses(3, ["truncated.wav"], "ingest", ours, truncated)
spoiled = bytearray(reel.read_bytes())
position = len(spoiled) - 400000
spoiled[position:position + 4] = struct.pack("<f", float("nan"))
(WORK / "nan.wav").write_bytes(spoiled)
refuses(3, ["nan.wav"], "ingest", ours, WORK / "nan.wav")
(WORK / "text.wav").write_text("this is no audio")
refuses(3, ["text.wav"], "ingest", ours, WORK / "text.wav")
refuses(3, ["gone.wav"], "ingest", ours, WORK / "gone.wav")
refuses(3, ["channel"], "ingest", ours, reel, "--channel", "5")
with wave.open(str(WORK / "silent.wav"), "wb") as silent:
    silent.setnchannels(1)
    silent.setsampwidth(2)
    silent.setframerate(48000)
    silent.writeframes(bytes(2 * 48000 * 30))
refuses(3, ["silent.wav"], "ingest", ours, WORK / "silent.wav")
run("ingest", ours, reel)
check((ours / "report.html").exists(), "after all of that the right recording is still read")

# Devices
quiet = dict(os.environ, JACK_NO_START_SERVER="1")
refuses(4, ["no such device"], "measure", "--into", WORK / "d", "--device", "no such device", "--armed",
        env=quiet)
refuses(2, ["--armed"], "measure", "--into", WORK / "d", "--device", "no such device", env=quiet)

# A kneeprint that was tampered with
measured = WORK / "measured"
run("measure", "--into", measured, "--plan", plan, "--rig", "virtual:sigmoid", "--takes-only")
refuses(3, ["measured"], "measure", "--into", measured, "--plan", plan, "--rig", "virtual:sigmoid")
take = sorted((measured / "takes").iterdir())[1]
damaged = WORK / "damaged"
shutil.copytree(measured, damaged)
bytes_ = bytearray((damaged / "takes" / take.name).read_bytes())
bytes_[5000] ^= 1
(damaged / "takes" / take.name).write_bytes(bytes_)
refuses(3, [take.name], "analyse", damaged)
newer = WORK / "newer"
shutil.copytree(measured, newer)
plan_text = json.loads((newer / "plan.json").read_text())
plan_text["version"] = 99
(newer / "plan.json").write_text(json.dumps(plan_text))
refuses(3, ["newer", "99"], "analyse", newer)
run("analyse", measured)

# A rig file with a wrong field
rig = json.loads((measured / "rig.json").read_text())
rig["rate_hz"] = "fast"
(WORK / "bad-rig.json").write_text(json.dumps(rig))
refuses(3, ["bad-rig.json", "rate_hz"], "measure", "--into", WORK / "r", "--rig", WORK / "bad-rig.json",
        "--armed")
