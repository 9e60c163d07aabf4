# SPDX-License-Identifier: GPL-3.0-or-later
"""The bare sigmoid unit with known parameters comes back: family, limit, drive, bias, harmonics."""
import math

import numpy as np
from scipy.special import erf

from kneeprint_tool import WORK, check, model, run, table, write_plan

CURVES = {
    "tanh": lambda z, p: np.tanh(z),
    "atan": lambda z, p: 2 / np.pi * np.arctan(np.pi * z / 2),
    "erf": lambda z, p: erf(np.sqrt(np.pi) * z / 2),
    "algebraic": lambda z, p: z / (1 + np.abs(z) ** p) ** (1 / p),
}
LIMIT, DRIVE, BIAS = 4.0, 0.4, 0.15
UNITS = [("tanh", 0.0), ("atan", 0.0), ("algebraic", 2.0), ("algebraic", 6.0), ("erf", 0.0)]

plan = write_plan(WORK / "truth-plan.json", blocks=4,
                  ladder={"from": -50, "to": -2, "step_db": 3, "unit": "dBFS"},
                  steps=[{"method": "steady", "frequencies_hz": [997]}, {"method": "smpte"},
                         {"method": "ccif"}])
for seed, (family, sharpness) in enumerate(UNITS, start=1):
    name = family + (f"-{sharpness:g}" if sharpness else "")
    folder = WORK / f"truth-{name}"
    rig = f"virtual:sigmoid:family={family},limit={LIMIT},drive={DRIVE},bias={BIAS}"
    if sharpness:
        rig += f",sharpness={sharpness:g}"
    run("measure", "--into", folder, "--plan", plan, "--rig", rig, "--seed", seed)
    best = model(folder)["best"]
    p = best["parameters"]
    check(best["family"] == family, f"{name}: family is {best['family']}")
    for key, truth, tolerance in (("limit", LIMIT, 0.005 * LIMIT), ("drive", DRIVE, 0.005 * DRIVE),
                                  ("bias", BIAS, 0.005)):
        value, (low, high) = p[key]["value"], p[key]["interval95"]
        check(abs(value - truth) < tolerance, f"{name}: {key} {value:.6g}, truth {truth}")
        check(low <= truth <= high, f"{name}: {key} inside its interval {low:.6g} .. {high:.6g}")
    if sharpness:
        low, high = p["sharpness"]["interval95"]
        check(low <= sharpness <= high, f"{name}: sharpness inside {low:.6g} .. {high:.6g}")

    # H1 .. H7 against quadrature of the known curve at the drive that the table states.
    theta = (np.arange(4096) + 0.5) * 2 * np.pi / 4096

    def harmonics_at(amplitude):
        z = DRIVE * amplitude * np.cos(theta) + BIAS
        y = LIMIT * (CURVES[family](z, sharpness) - CURVES[family](np.array(BIAS), sharpness))
        return [2 * np.mean(y * np.cos(n * theta)) for n in range(8)]

    # The stated full scales are off by hidden errors of 0.01 dB standard uncertainty each: an error of the
    # drive, which shifts every ratio along the curve, and one of the output, which shifts levels.
    SCALE_U = 10 ** (0.01 / 20) - 1
    worst, worst_flat, flat = 0.0, 0.0, 0
    fundamental = 1.0
    for row in table(folder, "harmonics"):
        n = int(row["order"])
        signed, u = float(row["in_phase"]), float(row["component_u"])
        if n == 1:
            fundamental, fundamental_u = signed, u
        if n > 7 or row["flag"]:
            continue
        amplitude = math.sqrt(0.6) * 10 ** (float(row["drive"]) / 20) * math.sqrt(2)
        h, nudged = harmonics_at(amplitude), harmonics_at(amplitude * (1 + SCALE_U))
        if n == 1:
            value, truth = signed, h[1]
            scale_u = math.hypot(nudged[1] - h[1], SCALE_U * h[1])
        else:
            value, truth = signed / fundamental, h[n] / h[1]
            scale_u = abs(nudged[n] / nudged[1] - truth)
            u = math.hypot(u, fundamental_u * value) / fundamental
        to_db = lambda excess: 20 * math.log10(1 + max(excess, 0) / abs(truth))
        error = abs(value - truth)
        worst = max(worst, to_db(error - 3 * math.hypot(u, scale_u)))
        # 60 dB above the noise in its bin (u is that noise and the floor together) and above the floor:
        # then flat, with nothing but the rig's hidden scale error taken off.
        if abs(value) > 1000 * u:
            if n > 1 and float(row["relative_db"]) - float(row["floor_db"]) < 60:
                continue
            flat += 1
            worst_flat = max(worst_flat, to_db(error - 3 * scale_u))
    print(f"{name}: beyond 3 u {worst:.5f} dB; flat {worst_flat:.5f} dB over {flat} lines")
    check(worst < 0.02, f"{name}: H1..H7 within 0.02 dB of quadrature after three standard uncertainties")
    check(flat >= 10, f"{name}: {flat} lines stand 60 dB clear")
    check(worst_flat < 0.02, f"{name}: and within 0.02 dB wherever they stand 60 dB clear")
