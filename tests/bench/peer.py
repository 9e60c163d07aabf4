# SPDX-License-Identifier: GPL-3.0-or-later
"""The peer in numpy or scipy: peer.py DIR WORKLOAD TIMES numpy|scipy

numpy: take by take, as one would write it. scipy: one real transform of all takes at once.
Prints the seconds for all takes, the first call and TIMES more."""
import pathlib
import sys
import time

import numpy as np
import scipy.fft

ORDERS, PRODUCT_ORDER = 10, 5
LOW, HIGH, REACH = 20.0, 20000.0, 0.45
WINDOW = 16384  # samples about the instant of each order of a sweep


def load(folder, workload):
    raw = (pathlib.Path(folder) / f"{workload}.takes").read_bytes()
    takes, frames, first, hold, rate, c1, c2, blocks = map(int, np.frombuffer(raw, np.int64, 8))
    start, growth = np.frombuffer(raw, np.float64, 2, offset=64)
    samples = np.frombuffer(raw, np.float64, offset=80 + 8 * takes).reshape(takes, frames)
    return samples, first, hold, rate, c1, c2, blocks, start, growth


def steady(spectra, hold, rate, c):
    """Rows of spectra -> phasors of H1..H10, THD_F, THD+N."""
    width = rate / hold
    n = np.arange(1, ORDERS + 1)
    n = n[n * c < REACH * hold]
    turn = np.angle(spectra[:, c])
    lines = 2.0 / hold * spectra[:, n * c] * np.exp(-1j * np.outer(turn, n))
    low, high = int(np.ceil(LOW / width)), int(np.floor(HIGH / width))
    band = spectra[:, low:high + 1]
    whole = (band.real ** 2 + band.imag ** 2).sum(axis=1)
    fundamental = np.abs(spectra[:, c]) ** 2
    summed = n[(n > 1) & (n * c * width < HIGH)]
    thd = np.sqrt((np.abs(spectra[:, summed * c]) ** 2).sum(axis=1) / fundamental)
    thdn = np.sqrt((whole - fundamental) / whole)
    return lines, thd, thdn


def two_tone(spectra, hold, rate, c1, c2):
    """Rows of spectra -> phasors of every product up to order 5, total distortion."""
    pairs = np.array([(a, b) for a in range(-PRODUCT_ORDER, PRODUCT_ORDER + 1)
                      for b in range(-PRODUCT_ORDER, PRODUCT_ORDER + 1)
                      if abs(a) + abs(b) <= PRODUCT_ORDER and 0 < a * c1 + b * c2 <= REACH * hold])
    bins = pairs @ np.array([c1, c2])
    turns = np.angle(spectra[:, [c1, c2]]) @ pairs.T
    lines = 2.0 / hold * spectra[:, bins] * np.exp(-1j * turns)
    if c2 > 2 * c1:  # modulation distortion, else difference-frequency distortion
        second, third, carrier = [c2 - c1, c2 + c1], [c2 - 2 * c1, c2 + 2 * c1], [c2]
    else:
        second, third, carrier = [c2 - c1], [2 * c1 - c2, 2 * c2 - c1], [c1, c2]
    s, t, u = (np.abs(spectra[:, k]).sum(axis=1) for k in (second, third, carrier))
    return lines, np.hypot(s, t) / u


class Sweep:
    """One over the synchronised sweep's spectrum (stationary phase: Novak, Lotton & Simon 2015), made once."""

    def __init__(self, fft, size, rate, start, growth):
        self.fft, self.size = fft, size
        f = np.fft.rfftfreq(size, 1 / rate)
        f[0] = 1.0
        s = 2 * np.pi * f * growth
        self.inverse = 2 / rate * np.sqrt(f / growth) * np.exp(-1j * (s * (1 - np.log(f / start)) + np.pi / 4))
        self.inverse[f < start / 2] = 0.0
        self.window = np.hanning(WINDOW)
        self.instants = np.round(-growth * np.log(np.arange(1, ORDERS + 1)) * rate).astype(int)

    def __call__(self, repeats):
        impulse = self.fft.irfft(self.fft.rfft(repeats.mean(axis=0)) * self.inverse, self.size)
        around = np.arange(-WINDOW // 2, WINDOW // 2)
        cut = impulse[(self.instants[:, np.newaxis] + around) % self.size]
        return np.abs(self.fft.rfft(cut * self.window, axis=1))


samples, first, hold, rate, c1, c2, blocks, start, growth = load(*sys.argv[1:3])
times, way = int(sys.argv[3]), sys.argv[4]
held = samples[:, first:first + hold]


def read(spectra):
    return two_tone(spectra, hold, rate, c1, c2) if c2 else steady(spectra, hold, rate, c1)


sweep = None
for r in range(times + 1):
    begin = time.process_time()
    if start > 0:
        fft, size = (np.fft if way == "numpy" else scipy.fft), hold // blocks
        sweep = sweep or Sweep(fft, size, rate, start, growth)
        figures = sum(sweep(take.reshape(blocks, size)).size for take in held)
    elif way == "numpy":
        results = [read(np.fft.rfft(take)[np.newaxis]) for take in held]
        figures = sum(x[0].size for x in results)
    else:
        figures = read(scipy.fft.rfft(held, axis=1))[0].size
    print("first" if r == 0 else "warm", f"{time.process_time() - begin:.9f}")
print("figures", figures)
