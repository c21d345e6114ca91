"""Small BDF and BDF+ files with invented content, written by pyEDFlib, and what pyEDFlib reads back from them.

    pip install numpy pyedflib==0.1.42
    python make_bdf.py            # writes edf/*.bdf and edf/bdf.json beside this file

`codes`: sample and value wherever a bit of the low 16 of the channel Status rises, found here by a loop over Python's integers.
"""
import json
import os

import numpy as np
import pyedflib

HERE = os.path.join(os.path.dirname(os.path.abspath(__file__)), "edf")
LIMITS = (-8388608, 8388607)


def channel(label, unit, rate, low, high):
    return {"label": label, "dimension": unit, "sample_frequency": rate, "physical_min": low, "physical_max": high,
            "digital_min": LIMITS[0], "digital_max": LIMITS[1], "transducer": "", "prefilter": ""}


def status(rng, count):
    code = np.zeros(count, dtype=np.int64)
    code[:4] = 2
    for at in rng.integers(10, count - 10, 12):
        code[at:at + rng.integers(1, 6)] |= int(rng.integers(1, 65536))
    # The upper byte tells of the battery and the like, and is no code.
    return (code | (rng.integers(0, 2, count) << 16)).astype(np.int32)


def write(name, kind, seconds, rate, seed, annotations=()):
    rng = np.random.default_rng(seed)
    path = os.path.join(HERE, name)
    signals = [channel("A1", "uV", rate, -262144, 262143), channel("A2", "mV", rate, -100, 100), channel("Status", "Boolean", rate, *LIMITS)]
    w = pyedflib.EdfWriter(path, len(signals), file_type=kind)
    w.setSignalHeaders(signals)
    codes = status(rng, rate * seconds)
    for second in range(seconds):
        for _ in range(2):
            w.writeDigitalSamples(rng.integers(*LIMITS, rate).astype(np.int32))
        w.writeDigitalSamples(codes[second * rate:(second + 1) * rate])
    for onset, duration, text in annotations:
        w.writeAnnotation(onset, duration, text)
    w.close()
    return path


def describe(path):
    r = pyedflib.EdfReader(path)
    with open(path, "rb") as f:
        reserved = f.read(256)[192:236].decode().strip()
    signals = []
    for i in range(2):
        x = r.readSignal(i)
        signals.append({"label": r.getLabel(i), "unit": r.getPhysicalDimension(i), "count": len(x), "first": x[:20].tolist(), "last": x[-20:].tolist(), "sum": float(x.sum())})
    code = [int(v) & 0xFFFF for v in r.readSignal(2, digital=True)]
    rises = [[k, code[k]] for k in range(1, len(code)) if code[k] & ~code[k - 1]]
    onset, duration, text = r.readAnnotations()
    out = {"file": os.path.basename(path), "reserved": reserved, "rate_hz": r.getSampleFrequency(0), "signals": signals, "codes": rises,
           "annotations": [[float(o), max(float(d), 0.0), str(t)] for o, d, t in zip(onset, duration, text)]}
    r.close()
    return out


def main():
    files = [
        write("codes.bdf", pyedflib.FILETYPE_BDF, 4, 128, 1),
        write("words.bdf", pyedflib.FILETYPE_BDFPLUS, 3, 100, 2, annotations=[(0.5, -1, "buoy"), (1.25, 0.5, "Boje → 灯")]),
    ]
    with open(os.path.join(HERE, "bdf.json"), "w") as f:
        json.dump({"about": "written and read by pyEDFlib " + pyedflib.__version__ + "; see make_bdf.py", "files": [describe(p) for p in files]}, f, indent=1, ensure_ascii=False)
        f.write("\n")


if __name__ == "__main__":
    main()
