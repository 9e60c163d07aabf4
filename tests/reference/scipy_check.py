# SPDX-License-Identifier: GPL-3.0-or-later
"""Harmonics and two-tone products recomputed by SciPy from the saved takes.

An independent route: least-squares fits of sines and cosines (scipy.linalg.lstsq) in place of the tool's
whole-period transforms, on the same steady part, which starts 20 ms and one ramp into the take (README,
"Recompute a figure").
"""
import math

import numpy as np
import scipy.linalg
from scipy.io import wavfile

from kneeprint_tool import WORK, check, journal, run, table, write_plan

TOLERANCE_DB = 0.001
FULL_SCALE_DBU = 24.0
folder = WORK / "scipy"
plan = write_plan(WORK / "scipy-plan.json",
                  steps=[{"method": "steady", "frequencies_hz": [41, 997, 4990]},
                         {"method": "smpte"}, {"method": "ccif"}],
                  ladder={"from": -40, "to": -4, "step_db": 9, "unit": "dBFS"})
run("measure", "--into", folder, "--plan", plan, "--rig", "virtual:sigmoid:family=tanh,bias=0.2",
    "--seed", 5)
harmonics, levels, intermods = (table(folder, n) for n in ("harmonics", "levels", "intermod"))


def steady_part(take, lowest_hz, settled_s):
    rate, x = wavfile.read(folder / take["file"])
    ramp = round(max(0.020, 4 / lowest_hz) * rate)
    first = 2 * round(0.010 * rate) + ramp
    return rate, x[first + round(settled_s * rate):first + round(take["hold_s"] * rate)].astype(float)


def amplitudes(x, rate, frequencies):
    t = np.arange(len(x)) / rate
    columns = [np.ones(len(x))]
    for f in frequencies:
        columns += [np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)]
    solution = scipy.linalg.lstsq(np.stack(columns, axis=1), x)[0]
    return [math.hypot(a, b) for a, b in zip(solution[1::2], solution[2::2])]


def db(x):
    return 20 * math.log10(x)


def at_drive(rows, take):
    return [r for r in rows if abs(float(r["drive"]) - take["send_dbfs"] - FULL_SCALE_DBU) < 0.01]


compared, worst = 0, 0.0


def compare(value, stated):
    global compared, worst
    worst = max(worst, abs(value - float(stated)))
    compared += 1


for take in journal(folder):
    if take["event"] != "take" or take["rung"] < 0:
        continue
    if take["method"] == "steady":
        level = next(r for r in at_drive(levels, take) if float(r["asked_hz"]) == take["frequency_hz"])
        f = float(level["frequency_hz"])
        rate, x = steady_part(take, f, float(level["settled_after_s"]))
        a = amplitudes(x, rate, [n * f for n in range(1, 11) if n * f < rate / 2])
        compare(FULL_SCALE_DBU + db(a[0]), level["output"])
        for row in at_drive(harmonics, take):
            n = int(row["order"])
            if n > 1 and row["frequency_hz"] == level["frequency_hz"] and row["flag"] in ("", "floor"):
                compare(db(a[n - 1] / a[0]), row["relative_db"])
        summed = [r for r in at_drive(harmonics, take) if r["frequency_hz"] == level["frequency_hz"]
                  and 1 < int(r["order"]) <= int(level["thd_orders"]) and r["flag"] in ("", "floor")]
        if summed:
            thd = math.sqrt(sum(a[int(r["order"]) - 1] ** 2 for r in summed)) / a[0]
            compare(db(100 * thd), db(float(level["thd_f_percent"])))
        # THD+N by the residual of the fit of DC and the fundamental, band-limited in the spectrum.
        t = np.arange(len(x)) / rate
        columns = np.stack([np.ones(len(x)), np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)], axis=1)
        rest = np.fft.rfft(x - columns @ scipy.linalg.lstsq(columns, x)[0])
        bins = np.fft.rfftfreq(len(x), 1 / rate)
        band = (bins > 20 - 1e-6) & (bins < 20000 + 1e-6)
        residual = math.sqrt(2 * np.sum(np.abs(rest[band]) ** 2)) / len(x)
        thdn = residual / math.hypot(residual, a[0] / math.sqrt(2))
        # The tool sums each block's own band: the bins at 20 Hz and 20 kHz differ a little in width.
        check(abs(db(100 * thdn) - db(float(level["thdn_percent"]))) < 0.02,
              f"THD+N at {f:g} Hz, {take['send_dbfs']:g} dBFS: {100 * thdn:.5f} %")
        continue
    rows = {r["product"]: r for r in at_drive(intermods, take) if r["method"] == take["method"]}
    settled = float(rows["total"]["settled_after_s"])
    if take["method"] == "smpte":
        rate, x = steady_part(take, 60, settled)
        a = amplitudes(x, rate, [7000, 6940, 7060, 6880, 7120, 60, 120, 180, 6820, 7180])
        found = {"m2": (a[1] + a[2]) / a[0], "m3": (a[3] + a[4]) / a[0]}
    else:
        rate, x = steady_part(take, 19000, settled)
        a = amplitudes(x, rate, [19000, 20000, 1000, 18000, 21000, 2000, 17000, 22000])
        found = {"d2": a[2] / (a[0] + a[1]), "d3": (a[3] + a[4]) / (a[0] + a[1])}
    found["total"] = math.hypot(*found.values())
    for product, value in found.items():
        if rows[product]["flag"] == "":
            compare(db(value), rows[product]["db"])

print(f"{compared} figures compared, largest difference {worst:.7f} dB")
check(compared >= 100, "at least 100 figures could be compared")
check(worst < TOLERANCE_DB, f"SciPy agrees within {TOLERANCE_DB} dB")
