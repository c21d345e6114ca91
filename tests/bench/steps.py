"""The page's steps with general libraries, timed: the other side of the budget table.

    python steps.py make FILE.edf          writes the recording of the benchmark
    python steps.py time FILE.edf RECIPE   prints {step: seconds} as JSON

NumPy, SciPy and pyEDFlib on one thread. Every step is written as one would write it by hand for speed: whole arrays,
one transform for all channels, batched eigenproblems.
"""
import json
import math
import os
import sys
import time

for _threads in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_threads] = "1"

import numpy as np
import pyedflib
import scipy.linalg
import scipy.signal

RATE, SECONDS, TRIALS = 512, 600, 200
NAMES = (
    "Fp1 Fpz Fp2 AF7 AF3 AFz AF4 AF8 F7 F5 F3 F1 Fz F2 F4 F6 F8 FT7 FC5 FC3 FC1 FCz FC2 FC4 FC6 FT8 T7 C5 C3 C1 Cz C2 C4 C6 T8 "
    "TP7 CP5 CP3 CP1 CPz CP2 CP4 CP6 TP8 P7 P5 P3 P1 Pz P2 P4 P6 P8 PO7 PO3 POz PO4 PO8 O1 Oz O2 F9 F10 P9"
).split()


def make(path):
    """64 channels, 10 minutes: correlated 1/f noise, and a rhythm of 20 Hz that rises after each of 200 events."""
    rng = np.random.default_rng(20)
    n, m = RATE * SECONDS, len(NAMES)
    white = np.fft.rfft(rng.standard_normal((m, n)), axis=1)
    white[:, 1:] /= np.sqrt(np.arange(1, white.shape[1]))
    pink = np.fft.irfft(white, n, axis=1)
    mixing = rng.standard_normal((m, m)) + 2 * np.eye(m)
    data = mixing @ (pink / pink.std(axis=1, keepdims=True)) * 4 + rng.standard_normal((m, n))
    onsets = 2.0 + np.arange(TRIALS) * (SECONDS - 4) / TRIALS
    rhythm = np.sin(2 * np.pi * 20 * np.arange(n) / RATE) * rng.uniform(0.5, 1.5, n // RATE).repeat(RATE)
    gate = np.ones(n)
    for onset in onsets:
        first = round(onset * RATE)
        gate[first : first + RATE] = 2.0
    data += np.outer(rng.standard_normal(m), rhythm * gate) * 2
    with pyedflib.EdfWriter(path, m, file_type=pyedflib.FILETYPE_EDFPLUS) as writer:
        for i, name in enumerate(NAMES):
            writer.setSignalHeader(
                i,
                dict(label=name, dimension="uV", sample_frequency=RATE, physical_min=-3276.8, physical_max=3276.7,
                     digital_min=-32768, digital_max=32767, transducer="", prefilter=""),
            )
        writer.writeSamples(list(data))
        for onset in onsets:
            writer.writeAnnotation(float(onset), -1, "tone")


def fir(high, low, rate):
    """Windowed sinc by DESIGN's rule: pass band from `high` to `low`."""
    taps = None
    for edge, band in ((high, "highpass"), (low, "lowpass")):
        room = edge if band == "highpass" else rate / 2 - edge
        width = min(max(0.25 * edge, 2.0), room)
        length = math.ceil(3.3 * rate / width) | 1
        cut = edge - width / 2 if band == "highpass" else edge + width / 2
        one = scipy.signal.firwin(length, cut, fs=rate, pass_zero=band, window="hamming")
        taps = one if taps is None else np.convolve(taps, one)
    return taps


def zero_phase(data, taps):
    half = len(taps) // 2
    padded = np.pad(data, ((0, 0), (half, half)), mode="reflect")
    return scipy.signal.oaconvolve(padded, taps[None], mode="valid", axes=1)


def logm(matrices):
    values, vectors = np.linalg.eigh(matrices)
    return (vectors * np.log(values)[:, None]) @ vectors.transpose(0, 2, 1)


def spline(positions, grid, order=4, terms=50, ridge=1e-5):
    """Matrix from channel values to map values (Perrin et al. 1989)."""

    def g(cosines):
        n = np.arange(1, terms + 1)
        weights = np.concatenate([[0], (2 * n + 1) / (n * (n + 1)) ** order]) / (4 * np.pi)
        return np.polynomial.legendre.legval(np.clip(cosines, -1, 1), weights)

    m = len(positions)
    system = np.ones((m + 1, m + 1))
    system[:m, :m] = g(positions @ positions.T) + ridge * np.eye(m)
    system[m, m] = 0
    out = np.ones((len(grid), m + 1))
    out[:, :m] = g(grid @ positions.T)
    return (out @ np.linalg.inv(system))[:, :m]


class Contrast:
    """Typical measure with ρ = 0.1, both ends, on windows of one event."""

    def __init__(self, data, onsets, recipe):
        self.sides = []
        for side in ("signal", "reference"):
            window = recipe["contrast"][side]
            count = round((window["to_s"] - window["from_s"]) * RATE)
            firsts = np.round((onsets + window["from_s"]) * RATE).astype(int)
            kept = np.stack([data[:, f : f + count] for f in firsts])
            self.sides.append(kept - kept.mean(axis=2, keepdims=True))
        self.covariances = [x @ x.transpose(0, 2, 1) / (x.shape[2] - 1) for x in self.sides]
        self.pooled = np.concatenate(self.covariances).mean(axis=0)
        values, vectors = scipy.linalg.eigh(self.pooled)
        self.values, self.vectors = values[::-1], vectors[:, ::-1]

    def fit(self, keep, components=4):
        white = self.vectors[:, :keep] / np.sqrt(self.values[:keep])
        eye = np.eye(keep)
        logs = [logm(0.9 * (white.T @ c @ white) + 0.1 * eye) for c in self.covariances]
        self.differences = logs[0] - logs[1]
        _, u = scipy.linalg.eigh(self.differences.mean(axis=0))
        u = np.concatenate([u[:, ::-1][:, :components], u[:, :components]], axis=1)
        filters = white @ u
        filters /= np.sqrt(np.einsum("ic,ij,jc->c", filters, self.covariances[1].mean(axis=0), filters))
        patterns = self.pooled @ filters / np.einsum("ic,ij,jc->c", filters, self.pooled, filters)
        ratios = [
            np.exp(np.mean([np.log(np.einsum("ic,kij,jc->kc", filters, c, filters)) for c in (side,)][0], axis=0))
            for side in self.covariances
        ]
        return filters, patterns, ratios[0] / ratios[1]

    def spectra(self, filters):
        out = []
        for x in self.sides:
            sources = np.einsum("ic,kit->kct", filters, x)
            out.append(scipy.signal.welch(sources, RATE, window="hann", nperseg=min(256, x.shape[2]), axis=2)[1].mean(axis=0))
        return out


def timed(table, name, act):
    started = time.perf_counter()
    value = act()
    table[name] = table.get(name, 0) + time.perf_counter() - started
    return value


def read(path):
    with pyedflib.EdfReader(path) as reader:
        data = np.stack([reader.readSignal(i) for i in range(reader.signals_in_file)])
        onsets, _, labels = reader.readAnnotations()
    return data, onsets[labels == "tone"]


def measure(path, recipe_path):
    with open(recipe_path) as file:
        recipe = json.load(file)
    table = {}
    data, onsets = timed(table, "read", lambda: read(path))
    band = recipe["filter"]
    data = timed(table, "filter", lambda: zero_phase(data, fir(band["high_pass_hz"], band["low_pass_hz"], RATE)))
    contrast = timed(table, "covariances", lambda: Contrast(data, onsets, recipe))
    filters, patterns, _ = timed(table, "fit", lambda: contrast.fit(len(NAMES)))
    timed(table, "spectra", lambda: contrast.spectra(filters))
    rng = np.random.default_rng(1)
    unit = lambda count: (lambda x: x / np.linalg.norm(x, axis=1, keepdims=True))(rng.standard_normal((count, 3)))
    timed(table, "maps", lambda: spline(unit(len(NAMES)), unit(67 * 67)) @ patterns)
    table["first_result"] = sum(table.values())

    def described(of, keep):
        filters, patterns, _ = of.fit(keep)
        of.spectra(filters[:, :1])
        return patterns

    def moved(step):
        edge = json.loads(json.dumps(recipe))
        edge["contrast"]["signal"]["from_s"] += 0.05 * step
        return described(Contrast(data, onsets, edge), len(NAMES))

    table["change_keep"] = median(seconds(lambda: described(contrast, keep)) for keep in (20, 24, 28, 32, 36, 40, 48))
    table["change_edge"] = median(seconds(lambda: moved(step)) for step in (1, 2, 3, 4, 5))
    contrast.fit(32)

    def permute():
        signs = np.random.default_rng(1).choice([-1.0, 1.0], (1000, len(onsets)))
        means = (signs @ contrast.differences.reshape(len(onsets), -1)).reshape(1000, 32, 32) / len(onsets)
        return np.linalg.eigvalsh(means)[:, [0, -1]]

    table["permute"] = min(repeats(permute))
    square = np.random.default_rng(2).standard_normal((512, 512))
    square = square @ square.T
    table["eigen_512"] = min(repeats(lambda: scipy.linalg.eigh(square)))
    panel = np.random.default_rng(3).standard_normal((64, 4096))
    table["gram_64"] = min(repeats(lambda: panel @ panel.T, 20))
    table["bytes"] = os.path.getsize(path)
    print(json.dumps(table))


def seconds(act):
    started = time.perf_counter()
    act()
    return time.perf_counter() - started


def median(times):
    ordered = sorted(times)
    return ordered[len(ordered) // 2]


def repeats(act, count=3):
    return [seconds(act) for _ in range(count)]


if __name__ == "__main__":
    if sys.argv[1] == "make":
        make(sys.argv[2])
    else:
        measure(sys.argv[2], sys.argv[3])
