# SPDX-License-Identifier: GPL-3.0-or-later
"""Harmonics and two-tone products recomputed by SciPy from the saved takes.

An independent route: least-squares fit of sines and cosines to the steady part (scipy.linalg.lstsq)
instead of the tool's whole-period transforms; the steady part itself is found from the take's envelope,
not from the tool's layout. Agreement within 0.001 dB is asked wherever a line stands 40 dB above its noise.
"""
import math

import numpy as np
import scipy.io.wavfile
import scipy.linalg

from kneeprint_tool import WORK, check, journal, run, table, write_plan

TOLERANCE_DB = 0.001
folder = WORK / "scipy"
plan = write_plan(WORK / "scipy-plan.json",
                  steps=[{"method": "steady", "frequencies_hz": [41, 997, 4990]},
                         {"method": "smpte"}, {"method": "ccif"}],
                  ladder={"from": -40, "to": -4, "step_db": 9, "unit": "dBFS"})
run("measure", "--into", folder, "--plan", plan, "--rig", "virtual:sigmoid:family=tanh,bias=0.2",
    "--seed", 5)

harmonics, levels, intermods = (table(folder, n) for n in ("harmonics", "levels", "intermod"))
takes = [t for t in journal(folder) if t.get("event") == "take" and t["rung"] >= 0]


def steady_part(x, rate, blocks_s):
    """The last `blocks_s` seconds before the fall, 20 ms clear of it."""
    envelope = np.abs(x) > 0.5 * np.max(np.abs(x))
    end = np.nonzero(envelope)[0][-1] - int(0.06 * rate)
    return x[end - int(round(blocks_s * rate)):end]


def amplitudes(x, rate, frequencies):
    t = np.arange(len(x)) / rate
    columns = [np.ones(len(x))]
    for f in frequencies:
        columns += [np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)]
    solution = scipy.linalg.lstsq(np.stack(columns, axis=1), x)[0]
    return [math.hypot(a, b) for a, b in zip(solution[1::2], solution[2::2])]


compared, worst = 0, 0.0
for take in takes:
    rate, x = scipy.io.wavfile.read(folder / take["file"])
    x = x.astype(float)
    drive = take["send_dbfs"]
    if take["method"] == "steady":
        level = next(l for l in levels if float(l["asked_hz"]) == take["frequency_hz"]
                     and abs(float(l["drive"]) - drive - 24.0) < 0.01)
        f = float(level["frequency_hz"])
        part = steady_part(x, rate, 1.0)
        orders = [n for n in range(1, 11) if n * f < 0.45 * rate]
        a = amplitudes(part, rate, [n * f for n in orders])
        for row in harmonics:
            n = int(row["order"])
            if row["drive"] != level["drive"] or row["frequency_hz"] != level["frequency_hz"] or n < 2:
                continue
            if row["flag"] or float(row["component_u"]) * 100 > math.hypot(
                    float(row["in_phase"]), float(row["quadrature"])):
                continue
            # Two estimates from different stretches of the same noise: 3 standard uncertainties are free.
            free = 3 * float(row["expanded_u_db"]) / 1.96
            difference = abs(20 * math.log10(a[orders.index(n)] / a[0]) - float(row["relative_db"]))
            worst = max(worst, difference - free)
            compared += 1
    else:
        rows = {r["product"]: r for r in intermods if r["method"] == take["method"]
                and abs(float(r["drive"]) - drive - 24.0) < 0.01}
        if take["method"] == "smpte":
            # f2 alone sounds at the end: take the stretch before the low tone's fall.
            strong = np.nonzero(np.abs(x) > 0.7 * np.max(np.abs(x)))[0]
            end = strong[-1] - int(0.12 * rate)
            part = x[end - rate:end]
            a = amplitudes(part, rate, [60, 120, 180, 240, 300, 7000, 6940, 7060, 6880, 7120, 6820,
                                        7180, 6760, 7240, 14000, 13940, 14060])
            found = {"m2": (a[6] + a[7]) / a[5], "m3": (a[8] + a[9]) / a[5]}
        else:
            part = steady_part(x, rate, 1.0)
            a = amplitudes(part, rate, [19000, 20000, 1000, 18000, 21000, 2000, 17000, 22000, 3000])
            found = {"d2": a[2] / (a[0] + a[1]), "d3": (a[3] + a[4]) / (a[0] + a[1])}
        for product, value in found.items():
            row = rows[product]
            if row["flag"] or float(row["expanded_u_db"]) > 0.2:
                continue
            free = 3 * float(row["expanded_u_db"]) / 1.96
            worst = max(worst, abs(20 * math.log10(value) - float(row["db"])) - free)
            compared += 1

print(f"{compared} figures compared, largest difference beyond noise {worst:.6f} dB")
check(compared >= 40, "at least 40 figures could be compared")
check(worst < TOLERANCE_DB, f"SciPy agrees within {TOLERANCE_DB} dB")
