#!/usr/bin/env python3
"""Write pipeline.edf and pipeline.json: the whole contrast by NumPy, SciPy and pyEDFlib.

    pip install numpy scipy pyedflib
    python make_pipeline.py            # beside this file

The recording is invented: ten channels, three planted sources, one of which grows and one of which falls after the event
"bell". It is written by pyEDFlib as EDF+ and read back by pyEDFlib, so the numbers are those of the 16-bit file. Nothing here is
shared with Teasel: the formulas are written out again with numpy.linalg, scipy.linalg.eigh and scipy.linalg.logm.

Sources: typical measure: Arsigny et al. 2006 (log-Euclidean mean); patterns: Haufe et al. 2014, eq. 6; total: scipy.linalg.eigh(S, R).
"""
import json
import os

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
    os.environ.setdefault(name, "1")

import numpy as np
import pyedflib
import scipy.linalg as sl

HERE = os.path.dirname(os.path.abspath(__file__))
RATE, CHANNELS, TRIALS = 128, 10, 33
SIGNAL, REFERENCE = (0.1, 0.8), (-0.9, -0.2)
KEEP, RHO, GAMMA, FOLDS, COMPONENTS = 7, 0.1, 0.0, 5, 3


def record(path):
    g = np.random.default_rng(20)
    onsets = np.round(2.0 + np.arange(TRIALS) * 2.25 + g.uniform(-0.1, 0.1, TRIALS), 3)
    n = int(80 * RATE)
    t = np.arange(n) / RATE
    mix = g.standard_normal((CHANNELS, CHANNELS))
    noise = np.cumsum(g.standard_normal((CHANNELS, n)), axis=1)
    noise -= noise.mean(1, keepdims=True)
    x = 1.5 * mix @ noise / np.sqrt(CHANNELS) + 4.0 * g.standard_normal((CHANNELS, n))
    grow, fall = np.full(n, 0.4), np.ones(n)
    for o in onsets:
        inside = (t >= o + 0.05) & (t < o + 0.85)
        grow[inside] = g.lognormal(0.0, 0.3)
        fall[inside] = 0.4 * g.lognormal(0.0, 0.3)
    sources = [grow * np.sin(2 * np.pi * 17 * t + np.cumsum(0.1 * g.standard_normal(n))),
               fall * np.sin(2 * np.pi * 9 * t + np.cumsum(0.1 * g.standard_normal(n))),
               np.sin(2 * np.pi * 5 * t + np.cumsum(0.2 * g.standard_normal(n)))]
    for s, a in zip(sources, (18, 22, 30)):
        x += a * np.outer(g.standard_normal(CHANNELS), s)
    w = pyedflib.EdfWriter(path, CHANNELS, file_type=pyedflib.FILETYPE_EDFPLUS)
    limit = float(np.ceil(np.abs(x).max()))
    names = ["Fp1", "Fz", "C3", "Cz", "C4", "P3", "Pz", "P4", "O1", "O2"]
    w.setSignalHeaders([{"label": m, "dimension": "uV", "sample_frequency": RATE, "physical_min": -limit, "physical_max": limit,
                         "digital_min": -32768, "digital_max": 32767, "transducer": "", "prefilter": ""} for m in names])
    import datetime
    w.setStartdatetime(datetime.datetime(1985, 1, 1))
    for o in onsets:
        w.writeAnnotation(float(o), -1, "bell")
    w.writeSamples([row for row in x])
    w.close()


def read(path):
    r = pyedflib.EdfReader(path)
    x = np.array([r.readSignal(i) for i in range(r.signals_in_file)])
    onsets, _, texts = r.readAnnotations()
    names = r.getSignalLabels()
    r.close()
    return x, [o for o, s in zip(onsets, texts) if s == "bell"], names


def half_away(v):
    return int(np.floor(abs(v) + 0.5) * np.sign(v))


def windows(x, onsets, span):
    out, kept = [], []
    for k, o in enumerate(onsets):
        a = half_away((o + span[0]) * RATE)
        b = a + half_away((span[1] - span[0]) * RATE)
        if a >= 0 and b <= x.shape[1]:
            w = x[:, a:b] - x[:, a:b].mean(1, keepdims=True)
            out.append(w @ w.T / (w.shape[1] - 1))
            kept.append(k)
    return np.array(out), kept


def space(cs, cr):
    p = (cs.mean(0) + cr.mean(0)) / 2
    e, v = np.linalg.eigh(p)
    return p, e[::-1], v[:, ::-1]


def log_shrunk(c):
    return np.real(sl.logm((1 - RHO) * c + RHO * np.eye(len(c))))


def finish(w, p, r):
    w = w / np.sqrt(w @ r @ w)
    a = p @ w / (w @ p @ w)
    sign = np.sign(a[np.argmax(np.abs(a))])
    return sign * w, sign * a


def typical(cs, cr, keep):
    p, e, v = space(cs, cr)
    z = v[:, :keep] / np.sqrt(e[:keep])
    d = np.mean([log_shrunk(z.T @ s @ z) - log_shrunk(z.T @ r @ z) for s, r in zip(cs, cr)], axis=0)
    delta, u = np.linalg.eigh((d + d.T) / 2)
    r = cr.mean(0)
    up = [finish(z @ u[:, -1 - j], p, r) for j in range(COMPONENTS)]
    down = [finish(z @ u[:, j], p, r) for j in range(COMPONENTS)]
    return up, down, delta[::-1]


def total(cs, cr, keep):
    p, _, v = space(cs, cr)
    v = v[:, :keep]
    s, r = cs.mean(0), cr.mean(0)
    lam, u = sl.eigh(v.T @ s @ v, v.T @ r @ v)
    up = [finish(v @ u[:, -1 - j], p, r) for j in range(COMPONENTS)]
    down = [finish(v @ u[:, j], p, r) for j in range(COMPONENTS)]
    return up, down, lam[::-1]


def folds(n):
    sizes = [n // FOLDS + (f < n % FOLDS) for f in range(FOLDS)]
    return np.repeat(np.arange(FOLDS), sizes)


def log_ratios(w, cs, cr):
    return np.log(np.einsum("i,kij,j->k", w, cs, w)) - np.log(np.einsum("i,kij,j->k", w, cr, w))


def log_total(w, cs, cr):
    return np.log(w @ cs.mean(0) @ w) - np.log(w @ cr.mean(0) @ w)


def evaluate(method, cs, cr, keep):
    up, down, statistic = method(cs, cr, keep)
    fold = folds(len(cs))
    fits = [method(cs[fold != f], cr[fold != f], keep) for f in range(FOLDS)]
    out = {"statistic": statistic.tolist(), "eigenvalues": space(cs, cr)[1].tolist()}
    for end, name, list_ in ((0, "stronger", up), (1, "weaker", down)):
        rows = []
        for j, (w, a) in enumerate(list_):
            trial = np.empty(len(cs))
            per_fold = []
            for f in range(FOLDS):
                wf = fits[f][end][j][0]
                trial[fold == f] = log_ratios(wf, cs[fold == f], cr[fold == f])
                per_fold.append(log_total(wf, cs[fold == f], cr[fold == f]))
            rows.append({"filter": w.tolist(), "pattern": a.tolist(),
                         "typical_fitted": float(np.exp(log_ratios(w, cs, cr).mean())), "total_fitted": float(np.exp(log_total(w, cs, cr))),
                         "typical_held_out": float(np.exp(trial.mean())), "total_held_out": float(np.exp(np.mean(per_fold))),
                         "total_folds": np.exp(per_fold).tolist(), "trial_log_ratios": trial.tolist()})
        out[name] = rows
    return out


def comparators(cs, cr, keep):
    """First and best principal component and best channel, chosen on training trials by the typical measure."""
    fold = folds(len(cs))
    trial = {k: np.empty(len(cs)) for k in ("first_pc", "best_pc", "best_channel", "mean_of_channels")}
    for f in range(FOLDS):
        a, b = cs[fold != f], cr[fold != f]
        _, _, v = space(a, b)
        pcs = [v[:, i] for i in range(keep)]
        channels = list(np.eye(len(v)))
        chosen = {"first_pc": v[:, 0], "best_pc": max(pcs, key=lambda w: log_ratios(w, a, b).mean()),
                  "best_channel": max(channels, key=lambda w: log_ratios(w, a, b).mean()), "mean_of_channels": np.ones(len(v)) / len(v)}
        for k, w in chosen.items():
            trial[k][fold == f] = log_ratios(w, cs[fold == f], cr[fold == f])
    return {k: float(np.exp(v.mean())) for k, v in trial.items()}


def exact_p(cs, cr, keep):
    """Every sign arrangement of the first ten trials, largest eigenvalue (typical): counts as large, of 1024."""
    cs, cr = cs[:10], cr[:10]
    _, e, v = space(cs, cr)
    z = v[:, :keep] / np.sqrt(e[:keep])
    d = np.array([log_shrunk(z.T @ s @ z) - log_shrunk(z.T @ r @ z) for s, r in zip(cs, cr)])
    stats = []
    for i in range(1024):
        sign = np.array([-1.0 if i >> t & 1 else 1.0 for t in range(10)])
        m = np.tensordot(sign, d, 1) / 10
        stats.append(np.linalg.eigvalsh((m + m.T) / 2)[[-1, 0]])
    stats = np.array(stats)
    return {"count_largest": int((stats[:, 0] >= stats[0, 0] * (1 - 1e-9)).sum()), "count_smallest": int((stats[:, 1] <= stats[0, 1] * (1 - 1e-9)).sum())}


def main():
    path = os.path.join(HERE, "pipeline.edf")
    record(path)
    x, onsets, names = read(path)
    cs, ks = windows(x, onsets, SIGNAL)
    cr, kr = windows(x, onsets, REFERENCE)
    assert ks == kr == list(range(TRIALS))
    out = {"about": "see make_pipeline.py", "channels": names, "trials": len(cs), "keep": KEEP, "rho": RHO, "folds": FOLDS,
           "signal_s": SIGNAL, "reference_s": REFERENCE,
           "typical": evaluate(typical, cs, cr, KEEP), "total": evaluate(total, cs, cr, KEEP),
           "total_full": {"eigenvalues": sl.eigh(cs.mean(0), cr.mean(0), eigvals_only=True)[::-1].tolist()},
           "compare": comparators(cs, cr, KEEP), "exact_permutation_of_ten": exact_p(cs, cr, KEEP)}
    with open(os.path.join(HERE, "pipeline.json"), "w") as f:
        json.dump(out, f, separators=(",", ":"))
        f.write("\n")


if __name__ == "__main__":
    main()
