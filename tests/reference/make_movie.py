"""Writes movie.json: running-percentile baselines and binned means of small movies, by NumPy alone.

    pip install numpy
    python make_movie.py

The window of frame t holds frames t - h to t + h as far as they exist, h = round(window_s * rate / 2); percentiles are NumPy's
default (linear between order statistics).
"""
import json
from pathlib import Path

import numpy as np

rng = np.random.default_rng(7)
rate, count = 20.0, 200
x = 100 + 10 * np.sin(np.arange(count) / 9) + rng.normal(0, 2, count)
x = np.round(x, 3)
cases = []
for percentile, window_s in [(10, 3.0), (50, 1.05), (0, 2.0), (100, 2.0), (8, 30.0)]:
    h = int(np.floor(window_s * rate / 2 + 0.5))
    base = np.array([np.percentile(x[max(0, t - h) : t + h + 1], percentile) for t in range(count)])
    cases.append({"percentile": percentile, "window_s": window_s, "dff": ((x - base) / base).tolist()})

movie = np.round(rng.normal(50, 5, (4, 5, 7)), 2)  # frames, height, width
binned = movie[:, :4, :6].reshape(4, 2, 2, 3, 2).mean(axis=(2, 4))
mean = binned.mean(axis=0)
out = {
    "rate_hz": rate,
    "samples": x.tolist(),
    "cases": cases,
    "movie": movie.tolist(),
    "binned": binned.reshape(4, 6).T.tolist(),
    "mean": mean.ravel().tolist(),
    "quantile_45": float(np.quantile(mean, 0.45)),
}
(Path(__file__).parent / "movie.json").write_text(json.dumps(out) + "\n")
