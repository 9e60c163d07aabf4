# SPDX-License-Identifier: GPL-3.0-or-later
"""Two circuits of a general-purpose simulator, read by a reel, against its own Fourier analysis.

ngspice runs a transient until it is periodic and analyses its last period by `.four`. The same last
period, without what lies above half the sample rate (a converter's filter), stands for the unit's response
in the reel's slots: the tone, 1024 Hz, is 512 cycles of a block of 0.5 s and is played as asked. Both
circuits have memory (a capacitor); one is symmetric, one biased and inverting.

The transient's own accuracy: the step is fixed (its truncation control is set out of reach), and the
trapezoidal rule's error falls with its square. Each run is made with a step and with half of it. What
harmonics differ by is three times the error left in the finer run (Richardson), and so a bound for it.
The recording has the noise of a 24-bit recorder: without any, rounding would repeat from block to block.
"""
import math
import subprocess

import numpy as np
import scipy.interpolate
from scipy.io import wavfile

from kneeprint_tool import WORK, check, run, table, write_plan

RATE = 48000
FREQUENCY = 1024.0
ORDERS = 10
PERIODS = 10  # every time constant is under 15 us, one hundredth of these
STEPS = 3000  # per period
NOISE = 1e-7  # rms, full scales

# Antiparallel diodes behind a resistor; 1 V per full scale.
CLIPPER = """
vin in 0 dc 0 sin(0 {peak} {frequency})
r1 in out 2.2k
c1 out 0 4.7n
d1 out 0 dm
d2 0 out dm
.model dm d(is=2.52n n=1.752)
"""
# A common-emitter stage with its base biased to 1.1 V: exponential law, Early effect, degeneration.
EMITTER = """
vcc vcc 0 dc 12
vbias bias 0 dc 1.1
vin in bias dc 0 sin(0 {peak} {frequency})
rs in b 1k
q1 out b e qm
re e 0 220
rc vcc out 2.2k
c1 out 0 4.7n
.model qm npn(is=10f bf=200 vaf=80)
"""


class Transient:
    """One run: the last period, and what .four says of it."""

    def __init__(self, name, parts, peak, steps):
        folder = WORK / name
        folder.mkdir()
        # Read from the folder in which the simulator starts.
        (folder / ".spiceinit").write_text(
            f"set nfreqs={ORDERS + 1}\nset fourgridsize=16384\nset polydegree=3\n"
            "set numdgt=14\nset wr_singlescale\n")
        period = 1 / FREQUENCY
        # The control section makes one run and writes it; batch mode then makes the same run, the
        # simulator being deterministic, for .four.
        (folder / "circuit.cir").write_text(
            f"{name}\n" + parts.format(peak=repr(float(peak)), frequency=FREQUENCY) +
            ".options method=trap reltol=1e-10 abstol=1e-16 vntol=1e-13 trtol=1e9\n"
            f".tran {period / steps!r} {PERIODS * period!r} 0 {period / steps!r}\n"
            f".four {FREQUENCY!r} v(out)\n"
            ".control\nrun\nwrdata transient.txt v(out)\n.endc\n.end\n")
        done = subprocess.run(["ngspice", "-b", "circuit.cir"], cwd=folder, capture_output=True,
                              text=True, stdin=subprocess.DEVNULL, timeout=300)
        if "Fourier analysis for v(out)" not in done.stdout:
            raise SystemExit(f"ngspice, {name}: no Fourier analysis\n{done.stdout}\n{done.stderr}")
        self.read_four(done.stdout.split("Fourier analysis for v(out)")[1].splitlines())
        rows = np.loadtxt(folder / "transient.txt")
        t, v = rows[:, 0], rows[:, 1]
        last = t > t[-1] - 1.02 * period
        spline = scipy.interpolate.make_interp_spline(t[last], v[last], k=5)
        points = 4 * STEPS
        spectrum = np.fft.rfft(spline(t[-1] - period + np.arange(points) / points * period))
        # Orders below 24 kHz; DC stays out too, as in an AC-coupled return.
        self.lines = 2 / points * spectrum[1:math.ceil(RATE / 2 / FREQUENCY)]

    def read_four(self, lines):
        self.thd_percent = float(lines[1].split("THD:")[1].split("%")[0])
        rows = [[float(x) for x in line.split()] for line in lines
                if len(line.split()) == 6 and line.split()[0].isdigit()]
        check([int(r[0]) for r in rows] == list(range(ORDERS + 1)), ".four gives DC and ten orders")
        # Its phases refer to a sine.
        self.phasors = [r[2] * np.exp(1j * math.radians(r[3] - 90)) for r in rows[1:]]

    def at(self, phases):
        """Volts at phases of the sine that drives, in turns."""
        return sum((line * np.exp(2j * np.pi * n * phases)).real
                   for n, line in enumerate(self.lines, 1))

    def relative(self):
        """Harmonics over the fundamental, upright, phases referred to it n times over."""
        first = self.phasors[0]
        # An inverting unit's response is negated first: a cosine drive gives sign * |H1| near phase 0.
        sign = 1 if first.imag < 0 else -1
        turn = sign * first / abs(first)
        return [sign * h / abs(first) / turn ** n for n, h in enumerate(self.phasors, 1)]


def slots_of(reel):
    """Stretches between at least 0.25 s of exact silence that hold nothing but the steady tone."""
    sounding = np.flatnonzero(reel)
    for part in np.split(sounding, np.flatnonzero(np.diff(sounding) > RATE // 4) + 1):
        first, last = part[0], part[-1] + 1
        n = np.arange(first + (last - first) // 3, last - (last - first) // 3)
        tone = np.stack([f(2 * np.pi * FREQUENCY * n / RATE) for f in (np.cos, np.sin)], axis=1)
        (a, b), rest = np.linalg.lstsq(tone, reel[n], rcond=None)[:2]
        if math.sqrt(rest[0] / len(n)) < 1e-6 * math.hypot(a, b):
            # a cos + b sin = A sin(2 pi (f n / rate + lead))
            yield first, last, math.hypot(a, b), math.atan2(a, b) / (2 * np.pi)


def measure(name, parts, volts_per_full_scale, drives):
    folder = WORK / name
    plan = write_plan(WORK / f"{name}.json",
                      ladder={"from": drives[0], "to": drives[-1], "step_db": drives[1] - drives[0],
                              "unit": "dBFS"},
                      steps=[{"method": "steady", "frequencies_hz": [FREQUENCY]}], orders=ORDERS)
    run("reel", "--into", folder, "--plan", plan, "--unit", name)
    rate, reel = wavfile.read(folder / "reel.wav")
    recording = reel.astype(float)
    check(rate == RATE, "the reel has 48 kHz")
    slots = list(slots_of(recording))
    check(len(slots) == len(drives), f"{name}: one slot per rung in the reel")
    coarse, fine = [], []
    for k, (_, _, peak, _) in enumerate(slots):
        check(abs(20 * math.log10(peak) - drives[k]) < 1e-5, f"the reel plays {drives[k]:g} dBFS")
        volts = peak * volts_per_full_scale
        coarse.append(Transient(f"{name}-{k}-coarse", parts, volts, STEPS))
        fine.append(Transient(f"{name}-{k}-fine", parts, volts, 2 * STEPS))
    scale = 0.5 / max(np.abs(t.at(np.arange(0, 1, 1e-3))).max() for t in fine)
    for (first, last, _, lead), transient in zip(slots, fine):
        n = np.arange(first, last)
        recording[n] = scale * transient.at(n * FREQUENCY / RATE + lead)
    recording += NOISE * np.random.default_rng(1).standard_normal(len(recording))
    wavfile.write(WORK / f"{name}.wav", rate, recording.astype(np.float32))
    run("ingest", folder, WORK / f"{name}.wav", "--takes-only")
    run("analyse", folder)
    return folder, coarse, fine


def compare(name, inverting, *arguments):
    folder, coarse, fine = measure(name, *arguments)
    levels = sorted(table(folder, "levels"), key=lambda r: float(r["drive"]))
    compared, lost, worst_share, worst_db, worst_degrees = 0, 0, 0.0, 0.0, 0.0
    for level, rough, good in zip(levels, coarse, fine):
        check(level["polarity"] == ("-1" if inverting else "1"), f"{name}: polarity {level['polarity']}")
        gain = 20 * math.log10(abs(good.phasors[0]) / abs(fine[0].phasors[0]))
        accuracy = 20 * abs(math.log10(abs(good.phasors[0]) / abs(rough.phasors[0])))
        difference = abs(float(level["output"]) - gain)
        # Relative to the lowest rung, whose own noise is in it, too.
        own_u = math.hypot(float(level["output_u_db"]), float(levels[0]["output_u_db"]))
        check(difference < accuracy + 2 * own_u and accuracy < 1e-4,
              f"{name} at {float(level['drive']):.0f} dBFS: fundamental {difference:.1e} dB off, "
              f"transient good for {accuracy:.1e} dB, reading for {own_u:.1e}")
        thd = abs(float(level["thd_f_percent"]) - good.thd_percent)
        # .four prints its THD to six digits.
        accuracy = abs(rough.thd_percent - good.thd_percent) + 0.5e-5 * good.thd_percent
        check(thd < accuracy + 2 * float(level["thd_f_u_percent"]),
              f"{name}: THD {float(level['thd_f_percent']):.5f} %, {thd:.1e} off, "
              f"transient good for {accuracy:.1e}")
        ours = {int(r["order"]): r for r in table(folder, "harmonics") if r["drive"] == level["drive"]}
        for n, (a, b) in enumerate(zip(rough.relative(), good.relative()), 1):
            row = ours[n]
            if n == 1 or row["flag"]:
                # Flagged: under the noise of a recording in single precision.
                lost += n > 1 and abs(b) > 1e-5
                continue
            ratio = 10 ** (float(row["relative_db"]) / 20)
            own_u = ratio * float(row["expanded_u_db"]) / 8.685889638
            difference = abs(ratio * np.exp(1j * math.radians(float(row["phase_deg"]))) - b)
            # Twice the 95 % interval of one component: both components, some 40 figures.
            share = difference / (abs(a - b) + 2 * own_u)
            worst_share = max(worst_share, share)
            print(f"  H{n}: {20 * math.log10(abs(b)):9.4f} dB {math.degrees(np.angle(b)):9.4f} deg; "
                  f"differs by {difference:.1e} of H1; transient good for {abs(a - b):.1e}, "
                  f"reading for {own_u:.1e}")
            if abs(b) > 1e-4:
                worst_db = max(worst_db, abs(20 * math.log10(ratio / abs(b))))
                phase = float(row["phase_deg"]) - math.degrees(np.angle(b))
                worst_degrees = max(worst_degrees, abs((phase + 180) % 360 - 180))
                # The transient itself must be worth comparing with.
                check(abs(a - b) < 1e-3 * abs(b), f"{name}: H{n} of the transient is good to 0.01 dB")
            compared += 1
    print(f"{name}: {compared} harmonics compared; over -80 dB they differ by {worst_db:.6f} dB and "
          f"{worst_degrees:.5f} degrees at most")
    check(lost == 0, f"{name}: no harmonic over -100 dB was lost")
    check(worst_share < 1, f"{name}: all within the transient's and the reading's accuracy, at most "
          f"{worst_share:.2f} of it")
    return compared


symmetric = compare("clipper", False, CLIPPER, 1.0, [-12, -6, 0])
check(symmetric >= 10, f"{symmetric} odd harmonics compared")
biased = compare("emitter", True, EMITTER, 0.8, [-20, -10, 0])
check(biased >= 20, f"{biased} harmonics compared")
