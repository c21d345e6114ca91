"""Values for trend removal, mains by fitted sinusoids and filter responses: `steady.json`, by NumPy and SciPy alone.

    python make_steady.py        # writes steady.json beside itself

Inputs come from the generator of README.md (seed 77). Trend: scipy.signal.detrend, with break points for pieces. Mains: numpy.linalg.lstsq
on a constant and cosine and sine of each multiple, in windows that overlap by half, blended with sin^2(pi (i + 1/2) / L), the last window
ending with the stretch. Response: scipy.signal.freqz of taps designed by scipy.signal.firwin (Hamming window).
"""
import json
import pathlib

import numpy as np
import scipy
from scipy import signal


def lcg(seed):
    state = seed
    while True:
        state = (state * 6364136223846793005 + 1442695040888963407) % 2**64
        yield (state >> 11) * 2.0**-53


def normals(source, count):
    return np.array([sum(next(source) for _ in range(12)) - 6.0 for _ in range(count)])


def fit_mains(x, rate, hz, window):
    n, length = len(x), min(int(round(window * rate)), len(x))
    t = np.arange(length) / rate
    columns = [np.ones(length)]
    for f in hz:
        columns += [np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)]
    design = np.stack(columns, axis=1)
    blend = np.sin(np.pi * (np.arange(length) + 0.5) / length) ** 2
    starts = list(range(0, n - length + 1, max(length // 2, 1)))
    if starts[-1] != n - length:
        starts.append(n - length)
    fitted, weight = np.zeros(n), np.zeros(n)
    for s in starts:
        found = np.linalg.lstsq(design, x[s : s + length], rcond=None)[0]
        fitted[s : s + length] += blend * (design[:, 1:] @ found[1:])
        weight[s : s + length] += blend
    return x - fitted / weight


def main():
    source = lcg(77)
    rate, n = 250.0, 437
    t = np.arange(n) / rate
    x = normals(source, n) + 3.0 + 0.02 * np.arange(n) + 4 * np.sin(2 * np.pi * 50 * t + 0.3) + np.cos(2 * np.pi * 100 * t)
    taps = signal.firwin(825, 0.5, pass_zero=False, fs=rate, window="hamming")
    hz = [0.1, 0.25, 0.5, 0.75, 1.0, 2.0, 10.0, 60.0]
    gain = np.abs(signal.freqz(taps, worN=hz, fs=rate)[1])
    out = {
        "about": "trend and mains by NumPy and SciPy; make_steady.py",
        "versions": {"numpy": np.__version__, "scipy": scipy.__version__},
        "rate_hz": rate,
        "input": x.tolist(),
        "mean": signal.detrend(x, type="constant").tolist(),
        "linear": signal.detrend(x, type="linear").tolist(),
        "every_0.6_s": signal.detrend(x, type="linear", bp=[150]).tolist(),
        "mains_fit_0.8_s": fit_mains(x, rate, [50.0, 100.0], 0.8).tolist(),
        "mains_fit_longer_than_stretch": fit_mains(x, rate, [50.0, 100.0], 4.0).tolist(),
        "high_pass_1_hz": {"hz": hz, "gain": gain.tolist()},
    }
    pathlib.Path(__file__).with_name("steady.json").write_text(json.dumps(out) + "\n")


if __name__ == "__main__":
    main()
