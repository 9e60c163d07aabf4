# SPDX-License-Identifier: GPL-3.0-or-later
"""Every figure that a reader can recompute, by NumPy and SciPy from the saved takes.

Independent routes where there are any: least-squares fits of sines and cosines (scipy.linalg.lstsq) in
place of the tool's whole-period transforms; a swept take demodulated by the phase of its own sweep in
place of the tool's inverse filter; weighting by SciPy's analogue response. What is read is the same part
of the take, as the README's "Recompute a figure" tells.
"""
import math

import numpy as np
import scipy.fft
import scipy.linalg
import scipy.signal
from scipy.io import wavfile

from kneeprint_tool import WORK, check, journal, run, table, write_plan

TOLERANCE_DB = 0.001
FULL_SCALE_DBU = 24.0  # of both virtual converters
VOLTS_PEAK = math.sqrt(0.6) * 10 ** (FULL_SCALE_DBU / 20) * math.sqrt(2)
MARGIN = 0.010
folder = WORK / "scipy"
plan = write_plan(WORK / "scipy-plan.json",
                  steps=[{"method": "silence", "duration_s": 4},
                         {"method": "steady", "frequencies_hz": [41, 997, 4990]},
                         {"method": "smpte"}, {"method": "din"}, {"method": "ccif"},
                         {"method": "tdfd"},
                         {"method": "modulation", "tones_hz": [100, 5000], "ratio": 2},
                         {"method": "multitone"}, {"method": "sweep"}],
                  ladder={"from": -40, "to": -4, "step_db": 12, "unit": "dBFS"})
run("measure", "--into", folder, "--plan", plan, "--rig", "virtual:sigmoid:family=tanh,bias=0.2",
    "--seed", 5)
harmonics, levels, intermods, products, responses, scalars = (
    table(folder, n) for n in ("harmonics", "levels", "intermod", "products", "response", "scalars"))
compared, worst = {}, {}


def compare(kind, value, stated):
    compared[kind] = compared.get(kind, 0) + 1
    worst[kind] = max(worst.get(kind, 0.0), abs(value - float(stated)))


def noise_taken_off(row):
    """What the tool took off a line for its noise, in dB: r = sqrt(read^2 - u^2), u from the row's own
    expanded uncertainty by a coverage factor of 2."""
    u = float(row["expanded_u_db"] or 0) / 8.685889638 / 2
    return 4.342944819 * math.log1p(u * u)


def compare_line(kind, value, stated, row):
    """Lines less than 30 dB over their noise are left to the phasors, from which nothing is taken."""
    if noise_taken_off(row) < 4 * TOLERANCE_DB:
        compare(kind, value - noise_taken_off(row), stated)


def db(x):
    return 20 * math.log10(x)


def samples(take):
    rate, x = wavfile.read(folder / take["file"])
    return rate, x.astype(float)


def steady_part(take, lowest_hz, settled_s):
    rate, x = samples(take)
    ramp = round(max(0.020, 4 / lowest_hz) * rate)
    first = 2 * round(MARGIN * rate) + ramp
    return rate, x[first + round(settled_s * rate):first + round(take["hold_s"] * rate)]


def sines(length, rate, frequencies):
    t = np.arange(length) / rate
    columns = [np.ones(length)]
    for f in frequencies:
        columns += [np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)]
    return np.stack(columns, axis=1)


def phasors(x, rate, frequencies):
    """DC and, per frequency, amplitude and phase of a cosine."""
    solution = scipy.linalg.lstsq(sines(len(x), rate, frequencies), x)[0]
    return solution[0], solution[1::2] - 1j * solution[2::2]


def power(x, rate, low, high, without=()):
    """Mean square from low to high; `without`: frequencies left out."""
    spectrum = scipy.fft.rfft(x) / len(x)
    f = scipy.fft.rfftfreq(len(x), 1 / rate)
    keep = (f > low - 1e-6) & (f < high + 1e-6)
    for w in without:
        keep &= abs(f - w) > 1e-6
    return 2 * np.sum(np.abs(spectrum[keep]) ** 2)


def at_drive(rows, take):
    drive = take["send_dbfs"] + FULL_SCALE_DBU
    return [r for r in rows if r["drive"] and abs(float(r["drive"]) - drive) < 0.01]


def check_steady(take):
    level = next(r for r in at_drive(levels, take) if float(r["asked_hz"]) == take["frequency_hz"])
    f = float(level["frequency_hz"])
    rate, x = steady_part(take, f, float(level["settled_after_s"]))
    mean, h = phasors(x, rate, [n * f for n in range(1, 11) if n * f < rate / 2])
    a = np.abs(h)
    own = {int(r["order"]): r for r in at_drive(harmonics, take)
           if r["frequency_hz"] == level["frequency_hz"]}
    read = {n: r for n, r in own.items() if r["flag"] in ("", "floor")}
    compare("output", FULL_SCALE_DBU + db(a[0]), level["output"])
    compare("gain", db(a[0]) - take["send_dbfs"], level["gain_db"])
    compare("dc", db(abs(mean) * VOLTS_PEAK), db(abs(float(level["dc"]))))
    check(mean * float(level["dc"]) > 0, f"the sign of {float(level['dc']):.4g} V of DC")
    for n, row in read.items():
        if n == 1:
            compare("level", FULL_SCALE_DBU + db(a[0]), row["level"])
            continue
        compare_line("level", FULL_SCALE_DBU + db(a[n - 1]), row["level"], row)
        compare_line("relative", db(a[n - 1] / a[0]), row["relative_db"], row)
        # As a share of the harmonic, on the scale of 20 log10(1 + share): 8.686 dB for 1.
        phasor = complex(float(row["in_phase"]), float(row["quadrature"]))
        found = VOLTS_PEAK * h[n - 1] / (h[0] / a[0]) ** n
        compare("phasor", 8.686 * abs(found - phasor) / abs(found), 0.0)
        off = math.degrees(np.angle(found)) - float(row["phase_deg"])
        compare("phase", 8.686 * math.radians((off + 180) % 360 - 180), 0.0)
    summed = [n for n in read if 1 < n <= int(level["thd_orders"])]
    if summed:
        thd = math.sqrt(sum(a[n - 1] ** 2 for n in summed)) / a[0]
        compare("thd_f", db(100 * thd), db(float(level["thd_f_percent"])))
        compare("thd_r", db(100 * thd / math.hypot(1, thd)), db(float(level["thd_r_percent"])))
    if level["even_odd_db"]:
        even, odd = (math.sqrt(sum(a[n - 1] ** 2 for n in summed if n % 2 == p)) for p in (0, 1))
        compare("even_odd", db(even / odd), level["even_odd_db"])
    # Per block: the residual of the fit of DC and the fundamental from 20 Hz to 20 kHz.
    ratio, sinad, noise = [], [], []
    for block in np.split(x, int(level["blocks"])):
        c = sines(len(block), rate, [f])
        solution = scipy.linalg.lstsq(c, block)[0]
        rest = block - c @ solution
        fundamental = np.sum(solution[1:] ** 2) / 2
        residual = power(rest, rate, 20, 20000)
        ratio.append(residual / (fundamental + residual))
        sinad.append(fundamental / residual)
        noise.append(power(rest, rate, 20, 20000, np.arange(f, 20001, f)))
    compare("thdn", 10 * math.log10(np.mean(ratio)), db(float(level["thdn_percent"]) / 100))
    compare("sinad", 10 * math.log10(np.mean(sinad)), level["sinad_db"])
    compare("noise", FULL_SCALE_DBU + 10 * math.log10(2 * np.mean(noise)), level["noise"])


def check_pair(take):
    rows = {r["product"]: r for r in at_drive(intermods, take) if r["method"] == take["method"]}
    listed = [r for r in at_drive(products, take) if r["method"] == take["method"]]
    total = rows["total"]
    f1, f2 = float(total["f1_hz"]), float(total["f2_hz"])
    rate, x = steady_part(take, f1, float(total["settled_after_s"]))
    frequencies = sorted({round(float(r["frequency_hz"]), 6) for r in listed
                          if 0 < float(r["frequency_hz"]) < 0.499 * rate})
    a = dict(zip(frequencies, np.abs(phasors(x, rate, frequencies)[1])))
    at = lambda k1, k2: a[round(abs(k1 * f1 + k2 * f2), 6)]
    found = {}
    modulation = take["method"] in ("smpte", "din", "modulation")
    if modulation:
        reference = at(0, 1)
        pairs = {"2": [(-1, 1), (1, 1)], "3": [(-2, 1), (2, 1)]}
        for n, pair in pairs.items():
            found[f"m{n}"] = sum(at(*p) for p in pair) / reference
            found[f"m{n}-rss"] = math.hypot(*(at(*p) for p in pair)) / reference
        found["total"] = math.hypot(found["m2"], found["m3"])
        found["total-rss"] = math.hypot(found["m2-rss"], found["m3-rss"])
    else:
        reference = at(1, 0) + at(0, 1)
        third = [at(2, -1), at(-1, 2)]
        found["d2"] = at(-1, 1) / reference
        found["d3"] = sum(third) / reference
        found["d3-rss"] = math.hypot(*third) / reference
        found["total"] = math.hypot(found["d2"], found["d3"])
        found["total-rss"] = math.hypot(found["d2"], found["d3-rss"])
        if take["method"] == "tdfd":
            found = {"total": math.hypot(at(-1, 1), at(2, -1)) / reference}
    for product, row in rows.items():
        if row["flag"] == "" and row["db"]:
            compare(take["method"], db(found[product]), row["db"])
            compare(take["method"], db(100 * found[product]), db(float(row["percent"])))
    for row in listed:
        if row["flag"] == "" and row["relative_db"]:
            value = at(int(row["k1"]), int(row["k2"]))
            compare_line("products", db(value / reference), row["relative_db"], row)
            compare_line("products", FULL_SCALE_DBU + db(value), row["level"], row)


def check_multitone(take):
    stated = {r["figure"]: r for r in at_drive(scalars, take) if r["method"] == "multitone"}
    # Blocks of 1 s after a rise for the lowest tone, 21 Hz. A unit without memory is settled at once.
    rate, x = steady_part(take, 21, 0.0)
    spectra = np.array([scipy.fft.rfft(b) for b in np.split(x, len(x) // rate)]) * 2 / rate
    m, mean = len(spectra), spectra.mean(axis=0)
    bins = np.arange(20, 20001)
    tones = np.sort(np.argsort(np.abs(mean[bins]))[-31:] + 20)
    mains = (bins <= 1000) & ((bins % 50 == 0) | (bins % 60 == 0))
    other = bins[~mains & ~np.isin(bins, tones)]
    raw = np.abs(mean[other]) ** 2 / 2
    scatter = np.sum(np.abs(spectra[:, other] - mean[other]) ** 2, axis=0) / 2 / (m - 1)
    periodic = raw - scatter / m
    hum = np.sum(np.abs(spectra[:, bins[mains]]) ** 2) / 2 / m
    found = {"noise": scatter.sum(), "distortion": periodic.sum(),
             "even-distortion": periodic[other % 2 == 0].sum(),
             "odd-distortion": periodic[other % 2 == 1].sum(), "mains-multiples": hum,
             "noise-plus-distortion": periodic.sum() + scatter.sum() + hum}
    for figure, value in found.items():
        if stated[figure]["flag"] in ("", "floor"):
            compare("multitone", 10 * math.log10(value / (np.sum(np.abs(mean[tones]) ** 2) / 2)),
                    stated[figure]["value"])


def check_silence(take):
    """The state in which nothing is sent."""
    stated = {r["figure"]: r for r in scalars
              if r["method"] == "silence" and r["state"] == "drive-free"}
    rate, x = samples(take)
    # Blocks as those of the steady tone; three time constants of 0.5 s stand before the state.
    steady = next(t for t in takes if t["method"] == "steady" and t["frequency_hz"] == 997)
    row = next(r for r in at_drive(levels, steady) if r["asked_hz"] == "997")
    block = round((steady["hold_s"] - float(row["settled_after_s"])) / int(row["blocks"]) * rate)
    first, length = max(1, math.ceil(1.5 * rate / block)) * block, round(take["hold_s"] * rate)
    piece = x[first - block:first + length + block]
    # The block on either side rises and falls softly.
    soft = scipy.signal.windows.tukey(len(piece) + 1, 2 * block / len(piece))[:-1]
    piece = (piece - piece.mean()) * soft
    # IEC 61672-1: four zeros at DC, poles at 20.6 (twice), 107.7, 737.9 and 12194 Hz (twice).
    poles = -2 * np.pi * np.array([20.598997, 20.598997, 107.65265, 737.86223, 12194.217, 12194.217])
    a_weighting = lambda f: np.abs(scipy.signal.freqs_zpk([0] * 4, poles, 1, 2 * np.pi * f)[1])
    for figure, weight in (("noise", np.ones_like),
                           ("noise-a", lambda f: a_weighting(f) / a_weighting(np.array([1000.0])))):
        padded = np.pad(piece, (0, rate))
        f = scipy.fft.rfftfreq(len(padded), 1 / rate)
        weighted = scipy.fft.rfft(padded)
        weighted *= weight(f) * ((f >= 20) & (f <= 20000))
        state = scipy.fft.irfft(weighted, len(padded))[block:block + length]
        compare(f"{figure} at rest", FULL_SCALE_DBU + 10 * math.log10(2 * np.mean(state ** 2)),
                stated[figure]["value"])


def check_sweep(take):
    """Demodulated by the sweep's own phase, around the moment at which it passes each fundamental."""
    rate, x = samples(take)
    start, growth = 10.0, 5.0 / math.log(0.49 * rate / 10.0)
    blocks = int(take["hold_s"] / 5.2)
    first, block = round(MARGIN * rate), round(take["hold_s"] * rate) // blocks
    mean = x[first:first + blocks * block].reshape(blocks, block).mean(axis=0)
    # The two routes let noise in through different windows: orders are compared where four standard
    # deviations of it, in the 1.5 / 0.04 s of a Hann window, stay under half the tolerance.
    noise = min(float(r["noise"]) for r in at_drive(levels, take))
    noise += 10 * math.log10(37.5 / 19980 / blocks)
    least = noise + db(4 * 8.686 / (TOLERANCE_DB / 2))
    for row in at_drive(responses, take):
        f, n = float(row["frequency_hz"]), int(row["order"])
        # Lower, 40 ms hold too few periods; higher, the sixth order passes half the rate.
        if row["method"] != "sweep" or n > 3 or row["flag"] or not 200 < f < rate / 14:
            continue
        if float(row["magnitude_db"]) + float(row["drive"]) < least:
            continue
        centre, half = round(growth * math.log(f / start) * rate), round(0.02 * rate)
        i = np.arange(centre - half, centre + half + 1)
        phase = 2 * np.pi * start * growth * np.exp(i / rate / growth)
        columns = [np.ones(len(i))]
        for k in range(1, 7):
            columns += [np.cos(k * phase), np.sin(k * phase)]
        weight = np.hanning(len(i) + 2)[1:-1]
        solution = scipy.linalg.lstsq(np.stack(columns, axis=1) * weight[:, None], mean[i] * weight)[0]
        a = math.hypot(*solution[2 * n - 1:2 * n + 1])
        compare("sweep", db(a) + FULL_SCALE_DBU - float(row["drive"]), row["magnitude_db"])


takes = [t for t in journal(folder) if t["event"] == "take" and t["rung"] >= 0]
CHECKS = {"steady": check_steady, "multitone": check_multitone, "silence": check_silence,
          "sweep": check_sweep}
for take in takes:
    CHECKS.get(take["method"], check_pair)(take)

for kind, count in compared.items():
    print(f"{kind}: {count} compared, largest difference {worst[kind]:.7f} dB")
check(sum(compared.values()) >= 300, "at least 300 figures could be compared")
for kind in ("relative", "dc", "thdn", "noise", "even_odd", "noise at rest", "noise-a at rest", "smpte",
             "din", "ccif", "tdfd", "modulation", "products", "multitone", "sweep"):
    check(kind in compared, f"{kind}: compared")
for kind, most in worst.items():
    check(most < TOLERANCE_DB, f"{kind}: SciPy agrees within {TOLERANCE_DB} dB")
