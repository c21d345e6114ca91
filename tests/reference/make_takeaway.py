"""Values for tapers, wavelets, phase consistency and the sign-flip test, by NumPy and SciPy.

    python tests/reference/make_takeaway.py > tests/reference/takeaway.json

Sources: scipy.signal.windows.dpss (tapers), numpy.convolve with an explicit Morlet wavelet (time and frequency by direct convolution),
scipy.stats.permutation_test with permutation_type="samples" (every arrangement of signs).
"""
import json
import math
import sys

import numpy as np
import scipy
from scipy import signal, stats

RATE = 100.0


class Lcg:
    """The generator of README.md."""

    def __init__(self, seed):
        self.state = seed

    def uniform(self):
        self.state = (self.state * 6364136223846793005 + 1442695040888963407) % 2**64
        return (self.state >> 11) * 2.0**-53


def noise(seed, count):
    rng = Lcg(seed)
    return np.array([rng.uniform() - 0.5 for _ in range(count)])


def morlet(hz, cycles=6.0, cut=4.0):
    sigma = cycles / (2 * math.pi * hz)
    half = int(round(cut * sigma * RATE))
    t = np.arange(-half, half + 1) / RATE
    envelope = np.exp(-0.5 * (t / sigma) ** 2)
    return 2 / envelope.sum() * envelope * np.exp(2j * np.pi * hz * t)


def tapers():
    out = {}
    for n in (16, 63, 200):
        out[str(n)] = [list(v) for v in signal.windows.dpss(n, 3.0, 5)]
    return out


def multitaper():
    x = noise(11, 80)
    y = x - x.mean()
    windows = signal.windows.dpss(80, 3.0, 5)
    density = np.mean([np.abs(np.fft.rfft(y * w)) ** 2 for w in windows], axis=0) / RATE
    density[1:-1] *= 2
    return {"seed": 11, "count": 80, "rate_hz": RATE, "density": list(density)}


def picture():
    x = noise(5, 3000)
    onsets = [400 + 310 * k for k in range(8)]
    hz = [6.0, 11.0, 23.0]
    offsets = [-20, 0, 15, 40]
    power, consistency = [], []
    for f in hz:
        analytic = np.convolve(x, morlet(f), mode="same")
        rows = np.array([[analytic[o + k] for k in offsets] for o in onsets])
        reference = np.array([np.mean(np.abs(analytic[o - 60 : o - 20]) ** 2) for o in onsets])
        power.append(list(np.mean(np.abs(rows) ** 2, axis=0)))
        consistency.append(list(np.abs(np.mean(rows / np.abs(rows), axis=0))))
    return {"seed": 5, "count": 3000, "rate_hz": RATE, "onsets": onsets, "hz": hz, "offsets": offsets, "power": power, "consistency": consistency}


def signs():
    cases = []
    for logs, side in (([0.3, -0.1, 0.25, 0.4, 0.02, 0.15], "greater"), ([-0.2, 0.05, -0.4, -0.1, 0.3, -0.25, -0.6], "less")):
        test = stats.permutation_test((np.array(logs),), np.mean, permutation_type="samples", alternative=side, n_resamples=np.inf)
        cases.append({"logs": logs, "side": side, "p": float(test.pvalue)})
    return cases


json.dump(
    {"made_with": {"numpy": np.__version__, "scipy": scipy.__version__}, "dpss": tapers(), "multitaper": multitaper(), "morlet": picture(), "sign_flips": signs()},
    sys.stdout,
)
