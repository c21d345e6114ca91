"""Reads what Teasel wrote into a folder with general libraries, and prints what they find as JSON.

    pip install numpy pandas pyedflib edfio
    python read_back.py FOLDER
"""
import json
import os
import sys

import edfio
import numpy as np
import pandas as pd
import pyedflib


def by_pyedflib(path):
    r = pyedflib.EdfReader(path)
    onset, duration, text = r.readAnnotations()
    count = r.signals_in_file
    out = {"samples": [r.readSignal(i).tolist() for i in range(count)], "rate_hz": r.getSampleFrequency(0),
           "names": [r.getLabel(i) for i in range(count)], "patient": r.getPatientName() or "X",
           "events": [[float(o), max(float(d), 0.0), str(t)] for o, d, t in zip(onset, duration, text)]}
    r.close()
    return out


def by_edfio(path):
    f = edfio.read_edf(path) if path.endswith(".edf") else edfio.read_bdf(path)
    return {"samples": [s.data.tolist() for s in f.signals], "rate_hz": f.signals[0].sampling_frequency, "names": list(f.labels),
            "patient": f.patient.name, "events": [[a.onset, a.duration or 0.0, a.text] for a in f.annotations]}


def main(folder):
    at = lambda name: os.path.join(folder, name)
    table = pd.read_csv(at("whole.csv"))
    rate = 1 / np.diff(table["time_s"]).mean()
    out = [{"by": f"pyEDFlib, {name}", **by_pyedflib(at(name))} for name in ("whole.edf", "whole.bdf")]
    out += [{"by": f"edfio, {name}", **by_edfio(at(name))} for name in ("whole.edf", "whole.bdf", "gaps.edf")]
    out.append({"by": "NumPy", "samples": np.load(at("whole.npy"), allow_pickle=False).astype(float).tolist()})
    out.append({"by": "pandas", "samples": table.iloc[:, 1:].to_numpy().T.tolist(), "rate_hz": round(rate, 6)})
    json.dump(out, sys.stdout, ensure_ascii=True)


if __name__ == "__main__":
    main(sys.argv[1])
