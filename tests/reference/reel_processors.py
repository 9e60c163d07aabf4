# SPDX-License-Identifier: GPL-3.0-or-later
"""A reel through ordinary file processors comes back with the right curves.

The unit is ffmpeg's soft clipper with its public curve tanh(x); then sox adds what recordings suffer:
0.37 s of leading silence, -7.3 dB, inverted polarity, 44.1 kHz as 24-bit FLAC, 120 ppm of drift.
"""
import math
import subprocess

import numpy as np

from kneeprint_tool import WORK, check, model, run, table, write_plan


def shell(*command):
    subprocess.run([*map(str, command)], check=True, stdin=subprocess.DEVNULL, capture_output=True)


plan = write_plan(WORK / "reel-plan.json", ladder={"from": -40, "to": 0, "step_db": 5, "unit": "dBFS"},
                  steps=[{"method": "steady", "frequencies_hz": [41, 997]}, {"method": "smpte"},
                         {"method": "ccif"}])
straight, worn = WORK / "reel-straight", WORK / "reel-worn"
for folder in (straight, worn):
    run("reel", "--into", folder, "--plan", plan, "--unit", "soft clipper")
check((straight / "reel.wav").read_bytes() == (worn / "reel.wav").read_bytes(),
      "the same plan gives the same reel")

shell("ffmpeg", "-y", "-i", straight / "reel.wav", "-af", "asoftclip=type=tanh", "-c:a", "pcm_f32le",
      WORK / "clipped.wav")
run("ingest", straight, WORK / "clipped.wav")
shell("sox", WORK / "clipped.wav", "-b", "24", WORK / "worn.flac", "vol", "-7.3dB", "vol", "-1", "pad",
      "0.37", "speed", "1.00012", "rate", "-v", "44100")
run("ingest", worn, WORK / "worn.flac")

theta = (np.arange(4096) + 0.5) * 2 * np.pi / 4096
worst, compared = 0.0, 0
for folder in (straight, worn):
    for row in table(folder, "harmonics"):
        n = int(row["order"])
        if n == 1 or row["flag"]:
            continue
        h = lambda k: 2 * np.mean(np.tanh(10 ** (float(row["drive"]) / 20) * np.cos(theta)) *
                                  np.cos(k * theta))
        if float(row["relative_db"]) < -100:
            continue
        error = abs(float(row["relative_db"]) - 20 * math.log10(abs(h(n) / h(1))))
        worst = max(worst, error - 3 * float(row["expanded_u_db"]) / 1.96)
        compared += 1
        # Upright curve: odd orders of tanh alternate in sign.
        expected = 0.0 if n % 4 == 1 else 180.0
        # Below -100 dB the clipper's own single-precision arithmetic shows.
        if n % 2 == 1 and float(row["relative_db"]) > -100 and float(row["expanded_u_db"]) < 0.1:
            off = abs((float(row["phase_deg"]) - expected + 180) % 360 - 180)
            check(off < 2.0, f"order {n} at {row['drive']} dBFS: phase off by {off:.3f} degrees")
check(compared >= 40, f"{compared} harmonics compared with quadrature of tanh")
check(worst < 0.01, f"they agree within {worst:.5f} dB after three standard uncertainties")

for a, b in zip(table(straight, "intermod"), table(worn, "intermod")):
    if a["flag"] or b["flag"]:
        continue
    u = math.hypot(float(a["expanded_u_db"]), float(b["expanded_u_db"])) / 1.96
    check(abs(float(a["db"]) - float(b["db"])) < 0.01 + 3 * u,
          f"{a['method']} {a['product']} at {float(a['drive']):g} dBFS survives the recording")

for row in table(worn, "levels"):
    check(row["gain_db"] == "", "an undeclared reel states no gain")
lowest = min((r for r in table(worn, "levels") if r["asked_hz"] == "997"),
             key=lambda r: float(r["drive"]))
check(abs(float(lowest["output"])) < 1e-9, "output is relative to the lowest usable rung")
best, inverted = model(straight)["best"], model(worn)["best"]
for name, m in (("straight", best), ("worn", inverted)):
    check(m["family"] == "tanh", f"{name}: family {m['family']}")
    check(abs(m["parameters"]["drive"]["value"] - 1) < 0.005,
          f"{name}: drive {m['parameters']['drive']['value']:.5f}, truth 1")
    check(abs(m["parameters"]["bias"]["value"]) < 0.005,
          f"{name}: bias {m['parameters']['bias']['value']:.5f}, truth 0")
check(best["polarity"] == 1 and inverted["polarity"] == -1, "the inversion is reported")

# Other containers, depths and channel counts: AIFF, 16 bits, the unit on the second of two channels.
stereo = WORK / "reel-stereo"
run("reel", "--into", stereo, "--plan", plan)
shell("sox", WORK / "clipped.wav", "-b", "16", WORK / "stereo.aiff", "vol", "-0.1dB", "remix", "0", "1")
run("ingest", stereo, WORK / "stereo.aiff", expect=3)
run("ingest", stereo, WORK / "stereo.aiff", "--channel", "2")
best = model(stereo)["best"]
check(best["family"] == "tanh" and abs(best["parameters"]["drive"]["value"] - 1) < 0.005,
      f"AIFF, 16 bits, channel 2: {best['family']}, drive {best['parameters']['drive']['value']:.5f}")
