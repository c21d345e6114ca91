"""Writes prepare.json: what the checks of preparation and description compare with.

    pip install numpy==2.4.6 scipy==1.17.1
    python make_prepare.py

Only NumPy and SciPy; inputs from the generator of README.md. Deterministic.
"""
import json
import math
import os

import numpy as np
import scipy.signal as ss

HERE = os.path.dirname(os.path.abspath(__file__))


class Lcg:
    """The generator of README.md."""

    def __init__(self, seed):
        self.state = seed

    def uniform(self):
        self.state = (self.state * 6364136223846793005 + 1442695040888963407) % 2**64
        return (self.state >> 11) * 2.0**-53

    def normal(self, n):
        out = np.empty(n)
        for i in range(n):
            s = self.uniform()
            for _ in range(11):
                s += self.uniform()
            out[i] = s - 6.0
        return out


def as_f32(x):
    """Recordings hold f32: the checks start from the same rounded values."""
    return np.asarray(x, np.float32).astype(np.float64)


def odd_length(rate, transition):
    n = math.ceil(3.3 * rate / transition)
    return n if n % 2 else n + 1


def high_pass(rate, edge):
    width = min(max(0.25 * edge, 2.0), edge)
    return ss.firwin(odd_length(rate, width), edge - width / 2, pass_zero=False, fs=rate, scale=True), width


def low_pass(rate, edge):
    width = min(max(0.25 * edge, 2.0), rate / 2 - edge)
    return ss.firwin(odd_length(rate, width), edge + width / 2, pass_zero=True, fs=rate, scale=True), width


def notch(rate, centre):
    return ss.firwin(odd_length(rate, 2.0), [centre - 1, centre + 1], pass_zero=True, fs=rate, scale=True), 2.0


def zero_phase(x, taps):
    half = len(taps) // 2
    return np.convolve(np.pad(x, half, mode="reflect"), taps, mode="valid")


def resampled(x, up, down):
    """resample_poly of the mirrored signal, cut to where the signal was."""
    pad = down * math.ceil((10 * max(up, down) + 1) / down)
    y = ss.resample_poly(np.pad(x, pad, mode="reflect"), up, down)
    first = pad * up // down
    return y[first:first + -(-len(x) * up // down)]


def designs():
    out = []
    for name, make, rate, edge in [
        ("high-pass", high_pass, 100.0, 1.0), ("high-pass", high_pass, 100.0, 12.0), ("high-pass", high_pass, 250.0, 4.0),
        ("low-pass", low_pass, 100.0, 20.0), ("low-pass", low_pass, 100.0, 40.0), ("low-pass", low_pass, 100.0, 49.0),
        ("notch", notch, 100.0, 25.0), ("notch", notch, 250.0, 50.0),
    ]:
        taps, width = make(rate, edge)
        w, h = ss.freqz(taps, worN=[edge], fs=rate)
        cut = {"high-pass": edge - width / 2, "low-pass": edge + width / 2, "notch": edge + 1}[name]
        gain = abs(ss.freqz(taps, worN=[cut], fs=rate)[1][0])
        out.append({"name": name, "rate_hz": rate, "edge_hz": edge, "transition_hz": width, "length": len(taps),
                    "first_half_and_centre": taps[:len(taps) // 2 + 1], "gain_at_cut_off": gain})
    taps, _ = high_pass(512.0, 0.1)
    out.append({"name": "high-pass", "rate_hz": 512.0, "edge_hz": 0.1, "transition_hz": 0.1, "length": len(taps),
                "every_512th": taps[::512]})
    return out


def chain():
    """Five channels, three stretches (the last one shorter than half the kernel), average reference, three filters, resampling."""
    rate, counts, channels = 100.0, [700, 430, 120], 5
    random = Lcg(11)
    t = np.arange(sum(counts)) / rate
    x = np.array([
        as_f32(40.0 * (c - 2) + 3.0 * np.sin(2 * np.pi * (4 + 3 * c) * t) + 2.0 * np.sin(2 * np.pi * 25 * t + c) + random.normal(len(t)))
        for c in range(channels)])
    kernel = np.convolve(np.convolve(high_pass(rate, 1.0)[0], low_pass(rate, 40.0)[0]), notch(rate, 25.0)[0])
    y = x - x.mean(axis=0)
    starts = np.concatenate([[0], np.cumsum(counts)])
    parts = [slice(a, b) for a, b in zip(starts[:-1], starts[1:])]
    filtered = np.array([np.concatenate([zero_phase(row[p], kernel) for p in parts]) for row in y])
    alone = np.concatenate([zero_phase(x[0][p], kernel) for p in parts])
    down = np.array([np.concatenate([resampled(zero_phase(row[p], kernel), 3, 5) for p in parts]) for row in y])
    T = np.eye(channels) - 1.0 / channels
    pick = np.arange(0, len(t), 5)
    return {"rate_hz": rate, "counts": counts, "samples": x.round(9).tolist(), "kernel_length": len(kernel),
            "matrix": T, "rank": int(np.linalg.matrix_rank(np.cov(filtered))),
            "channel_0_as_recorded_filtered_every_5th": alone[pick], "filtered_every_5th": filtered[:, pick],
            "resampled_up_down": [3, 5], "resampled_counts": [-(-n * 3 // 5) for n in counts], "resampled_every_4th": down[:, ::4]}


def resampling():
    x = Lcg(12).normal(400)
    out = {"samples": x, "results": []}
    for up, down in [(1, 2), (2, 5), (125, 256), (20, 39)]:
        y = resampled(x, up, down)
        out["results"].append({"up": up, "down": down, "count": len(y), "values": y[:: max(1, len(y) // 60)], "step": max(1, len(y) // 60)})
    return out


def channels():
    """Standard deviation about each stretch's mean, mains ratio by SciPy's Welch."""
    rate, counts = 200.0, [3000, 1500]
    random = Lcg(13)
    t = np.arange(sum(counts)) / rate
    out = []
    for mains, size in [(50.0, 2.0), (60.0, 0.5), (50.0, 0.0)]:
        x = as_f32(random.normal(len(t)) + size * np.sin(2 * np.pi * mains * t) + np.where(t < 15, 1000.0, -500.0))
        parts = [x[:counts[0]], x[counts[0]:]]
        sd = math.sqrt(sum(((p - p.mean())**2).sum() for p in parts) / (len(x) - 2))
        f, P = ss.welch(parts[0], rate, window="hann", nperseg=400, noverlap=200, detrend="constant")
        ratios = []
        for m in (50.0, 60.0):
            d = np.abs(f - m)
            ratios.append(10 * np.log10(P[d <= 1].mean() / P[(d >= 3) & (d <= 8)].mean()))
        k = int(np.argmax(ratios))
        out.append({"mains_hz_added": mains, "size": size, "sd": sd, "mains_hz": (50.0, 60.0)[k], "mains_db": ratios[k]})
    return {"rate_hz": rate, "counts": counts, "seed": 13,
            "recipe": "f32(normal12 + size sin(2 pi mains t) + (1000 if t < 15 else -500)), one after the other from one generator", "channels": out}


def description():
    """One component around 9 onsets: spectra and power course written out plainly."""
    rate, n = 100.0, 3200
    random = Lcg(14)
    t = np.arange(n) / rate
    onsets = np.array([150 + 330 * k + int(40 * random.uniform()) for k in range(9)])
    x = random.normal(n)
    for o in onsets:
        x[o:o + 100] += 1.5 * np.sin(2 * np.pi * 20 * (t[o:o + 100] - t[o])) + 0.5
    signal = [(int(o), 90) for o in onsets]
    reference = [(int(o) - 90, 90) for o in onsets]
    psd = lambda wins: np.mean([ss.welch(x[a:a + c], rate, window="hann", nperseg=90, noverlap=45, detrend="constant")[1] for a, c in wins], axis=0)
    # span −1 … 1.51 s: 251 samples, so 125 bins of 2 samples (image: 83 of 3)
    start, count = -100, 251
    half = 10
    smoother = 0.5 - 0.5 * np.cos(np.pi * np.arange(1, 2 * half) / half)
    trials, refs, average = [], [], []
    keep = [k for k, o in enumerate(onsets) if o + start >= 0 and o + start + count <= n]
    for k in keep:
        o = onsets[k]
        mean = x[o + start:o + start + count].mean()
        power = []
        for i in range(count):
            lo, hi = max(0, o + start + i - half + 1), min(n, o + start + i + half)
            w = smoother[lo - (o + start + i) + half - 1:hi - (o + start + i) + half - 1]
            power.append((w * (x[lo:hi] - mean)**2).sum() / w.sum())
        trials.append(power)
        a, c = reference[k]
        refs.append(((x[a:a + c] - mean)**2).mean())
        average.append(x[o + start:o + start + count] - mean)
    trials, refs, average = np.array(trials), np.array(refs), np.array(average)
    centres = np.arange(125) * 2
    image_centres = np.arange(83) * 3 + 1
    pooled = np.mean([x[a:a + c].var() for a, c in reference])
    mean_power = trials.mean(axis=0)
    return {"rate_hz": rate, "samples": n, "seed": 14,
            "recipe": "onsets 150 + 330 k + floor(40 uniform), k = 0..8; then x = normal12; from every onset on 100 samples of 1.5 sin(2 pi 20 (t - onset)) + 0.5",
            "onsets": onsets, "window_samples": 90,
            "psd_signal": psd(signal), "psd_reference": psd(reference),
            "span_s": [-1.0, 1.51], "trials_that_fit": len(keep),
            "t_s": (start + centres + 0.5) / rate, "mean_db": 10 * np.log10(mean_power[centres] / refs.mean()),
            "mean_db_pooled": 10 * np.log10(mean_power[centres] / pooled),
            "average": average.mean(axis=0)[:250].reshape(125, 2).mean(axis=1),
            "average_standard_deviation": average[:, :250].reshape(len(keep), 125, 2).mean(axis=2).std(axis=0),
            "image_t_s": (start + image_centres) / rate, "image_first_and_last": 10 * np.log10(trials[:, image_centres] / refs[:, None])[[0, -1]]}


def short_welch():
    x = Lcg(15).normal(100) + 2.0
    _, P = ss.welch(x, 128.0, window="hann", nperseg=100, noverlap=50, nfft=128, detrend="constant")
    _, odd = ss.welch(x, 128.0, window="hann", nperseg=33, detrend="constant")
    return {"seed": 15, "recipe": "normal12 + 2, 100 samples at 128 Hz", "padded_to_128": P, "segments_of_33": odd}


def plain(value):
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, np.generic):
        return value.item()
    if isinstance(value, dict):
        return {k: plain(v) for k, v in value.items()}
    if isinstance(value, (list, tuple)):
        return [plain(v) for v in value]
    return value


def main():
    parts = {"about": "made by make_prepare.py with NumPy and SciPy only; mirrored edges are numpy.pad(mode='reflect')",
             "designs": designs(), "chain": chain(), "resampling": resampling(), "channels": channels(),
             "description": description(), "short_welch": short_welch()}
    with open(os.path.join(HERE, "prepare.json"), "w") as f:
        f.write("{\n" + ",\n".join(
            json.dumps(k) + ": " + json.dumps(plain(v), separators=(",", ":"), allow_nan=False) for k, v in parts.items()) + "\n}\n")


if __name__ == "__main__":
    main()
