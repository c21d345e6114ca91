#!/usr/bin/env python3
"""Write kinds.json: the kinds of contrast other than event windows, by NumPy and SciPy on the file of make_pipeline.py.

    pip install numpy scipy pyedflib
    python make_kinds.py               # beside this file, after make_pipeline.py

Nothing here is shared with Teasel: filters by scipy.signal.firwin, eigenproblems by scipy.linalg.eigh.

Sources: spans: the generalised eigenproblem of two pooled covariances; band: Nikulin, Nolte & Curio 2011 (flanks), de Cheveigne &
Arzounian 2015 (broadband); repeatable: de Cheveigne & Simon 2008; slow: symmetrised lagged covariance against lag 0 (Molgedey &
Schuster 1994). All at full rank, without shrinkage.
"""
import json
import os

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
    os.environ.setdefault(name, "1")

import numpy as np
import scipy.linalg as sl
import scipy.signal as ss

import make_pipeline as mp

HERE = mp.HERE
RATE = mp.RATE
SPANS = [[5.0, 14.5], [30.25, 41.0]]
CENTRE, HALF = 17.0, 2.0
TRIAL = (0.1, 0.8)
LAG_S = 0.05


def covariance(x):
    x = x - x.mean(1, keepdims=True)
    return x @ x.T / (x.shape[1] - 1)


def pieces(x, count, runs=None):
    runs = [[0, x.shape[1]]] if runs is None else runs
    return [x[:, a + i * count:a + (i + 1) * count] for a, b in runs for i in range((b - a) // count)]


def pooled(windows):
    return np.mean([covariance(w) for w in windows], axis=0)


def spans(x):
    runs = [[mp.half_away(a * RATE), mp.half_away(b * RATE)] for a, b in SPANS]
    rest, at = [], 0
    for a, b in runs + [[x.shape[1], x.shape[1]]]:
        if at < a:
            rest.append([at, a])
        at = b
    s, r = pieces(x, RATE, runs), pieces(x, RATE, rest)
    return {"signal": len(s), "reference": len(r), "eigenvalues": eig(pooled(s), pooled(r))}


def eig(s, r):
    return sl.eigh(s, r, eigvals_only=True)[::-1].tolist()


def band_taps():
    """-6 dB points at the named edges, Hamming window, as long as 3.3 rates over the half width."""
    n = int(np.ceil(3.3 * RATE / HALF)) | 1
    def low(hz):
        return ss.firwin(n, hz, fs=RATE, window="hamming", scale=True)
    def between(a, b):
        return low(b) - low(a)
    band = between(CENTRE - HALF, CENTRE + HALF)
    flanks = between(CENTRE - 3 * HALF, CENTRE - 2 * HALF) + between(CENTRE + 2 * HALF, CENTRE + 3 * HALF)
    return band, flanks * np.sqrt((band ** 2).sum() / (flanks ** 2).sum())


def zero_phase(x, taps):
    half = len(taps) // 2
    padded = np.pad(x, ((0, 0), (half, half)), mode="reflect")
    return np.array([np.convolve(row, taps, mode="valid") for row in padded])


def band(x):
    taps, flanks = band_taps()
    count = int(round(min(max(8.0 / HALF, 1.0), 20.0) * RATE))
    s = pooled(pieces(zero_phase(x, taps), count))
    f = pooled(pieces(zero_phase(x, flanks), count))
    b = pooled(pieces(x, count))
    level = np.mean(np.diag(s) / np.diag(b))
    return {"segments": x.shape[1] // count, "flanks": eig(s, f), "broadband": eig(s / level, b)}


def repeatable(x, onsets):
    cut = []
    for o in onsets:
        a = mp.half_away((o + TRIAL[0]) * RATE)
        w = x[:, a:a + mp.half_away((TRIAL[1] - TRIAL[0]) * RATE)]
        cut.append(w - w.mean(1, keepdims=True))
    average = np.mean(cut, axis=0)
    share = sl.eigh(covariance(average), pooled(cut), eigvals_only=True)[::-1]
    return {"trials": len(cut), "share": share.tolist()}


def slow(x):
    lag = max(int(round(LAG_S * RATE)), 1)
    c0, ct = [], []
    for w in pieces(x, RATE):
        a, b = w[:, :-lag], w[:, lag:]
        a, b = a - a.mean(1, keepdims=True), b - b.mean(1, keepdims=True)
        n = a.shape[1] - 1
        c0.append((a @ a.T + b @ b.T) / (2 * n))
        ct.append((a @ b.T + b @ a.T) / (2 * n))
    r = sl.eigh(np.mean(ct, axis=0), np.mean(c0, axis=0), eigvals_only=True)[::-1]
    return {"segments": len(c0), "lag_s": LAG_S, "autocorrelation": r.tolist()}


def main():
    x, onsets, _ = mp.read(os.path.join(HERE, "pipeline.edf"))
    out = {"about": "see make_kinds.py", "spans_s": SPANS, "spans": spans(x), "centre_hz": CENTRE, "half_width_hz": HALF, "band": band(x),
           "repeatable": repeatable(x, onsets), "slow": slow(x)}
    with open(os.path.join(HERE, "kinds.json"), "w") as f:
        json.dump(out, f, separators=(",", ":"))
        f.write("\n")


if __name__ == "__main__":
    main()
