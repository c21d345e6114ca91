"""Small EDF and EDF+ files with invented content, written by pyEDFlib, and what pyEDFlib reads back from them.

    pip install numpy pyedflib==0.1.42
    python make_edf.py            # writes edf/*.edf and edf/expected.json beside this file

Formats: Kemp et al. 1992, Electroenceph. clin. Neurophysiol. 82:391-393; Kemp & Olivan 2003, Clin. Neurophysiol. 114:1755-1761.
Annotation onsets in expected.json are pyEDFlib's own, which count from the first record; `first_record_onset_s` comes from the
bytes and has to be added to reach the file's clock.
"""
import datetime
import json
import os

import numpy as np
import pyedflib

HERE = os.path.join(os.path.dirname(os.path.abspath(__file__)), "edf")


def channel(label, unit, rate, low, high, digital=(-32768, 32767)):
    return {"label": label, "dimension": unit, "sample_frequency": rate, "physical_min": low, "physical_max": high,
            "digital_min": digital[0], "digital_max": digital[1], "transducer": "", "prefilter": ""}


def write(name, kind, channels, seconds, seed, record_s=1, annotations=(), annotation_signals=1, start=None):
    rng = np.random.default_rng(seed)
    path = os.path.join(HERE, name)
    w = pyedflib.EdfWriter(path, len(channels), file_type=kind)
    if record_s != 1:
        w.setDatarecordDuration(record_s)
    w.setSignalHeaders(channels)
    w.setStartdatetime(start or datetime.datetime(1985, 1, 1, 6, 30, 0))
    if annotation_signals > 1:
        w.set_number_of_annotation_signals(annotation_signals)
    per_record = [w.get_smp_per_record(i) for i in range(len(channels))]
    for _ in range(round(seconds / record_s)):
        for c, n in zip(channels, per_record):
            d = rng.integers(c["digital_min"], c["digital_max"] + 1, n).astype(np.int32)
            w.writeDigitalSamples(d)
    for onset, duration, text in annotations:
        w.writeAnnotation(onset, duration, text)
    w.close()
    return path


def describe(path):
    with open(path, "rb") as f:
        b = f.read()
    header = int(b[184:192])
    names = [b[256 + 16 * i:272 + 16 * i].decode("latin-1").strip() for i in range(int(b[252:256]))]
    first = None
    if b[192:196] == b"EDF+":
        sizes = [int(b[256 + 216 * len(names) + 8 * i:264 + 216 * len(names) + 8 * i]) for i in range(len(names))]
        at = header + 2 * sum(sizes[:names.index("EDF Annotations")])
        first = float(b[at:b.index(b"\x14", at)])
    r = pyedflib.EdfReader(path)
    onset, duration, text = r.readAnnotations()
    out = {"file": os.path.basename(path), "variant": b[192:236].decode().strip() or "EDF", "bytes": len(b),
           "records": r.datarecords_in_file, "record_s": r.datarecord_duration, "first_record_onset_s": first,
           "annotations": [[float(o), float(d), str(t)] for o, d, t in zip(onset, duration, text)], "signals": []}
    for i in range(r.signals_in_file):
        x, d = r.readSignal(i), r.readSignal(i, digital=True)
        out["signals"].append({"label": r.getLabel(i), "unit": r.getPhysicalDimension(i), "rate_hz": r.getSampleFrequency(i),
                               "count": len(x), "physical_min": r.getPhysicalMinimum(i), "physical_max": r.getPhysicalMaximum(i),
                               "first": [float(v) for v in x[:6]], "last": [float(v) for v in x[-6:]], "mean": float(x.mean()),
                               "sd_ddof0": float(x.std()), "sum_of_digital": int(d.sum())})
    r.close()
    return out


def main():
    os.makedirs(HERE, exist_ok=True)
    eeg = lambda label, rate=100: channel(label, "uV", rate, -3276.8, 3276.7)
    files = [
        write("plain.edf", pyedflib.FILETYPE_EDF,
              [eeg("Fz"), eeg("Cz"), channel("Pz", "mV", 100, -3, 3), channel("rudder", "deg", 5, -40, 40, (-2048, 2047))], 8, 1),
        write("units.edf", pyedflib.FILETYPE_EDFPLUS,
              [eeg("micro"), channel("milli", "mV", 100, -1.5, 2.5), channel("volt", "V", 100, -0.01, 0.02),
               channel("nano", "nV", 100, -50000, 50000), channel("field", "fT", 100, -9000, 9000),
               channel("upside down", "uV", 100, 500, -500), channel("unsigned", "uV", 100, 0, 1000, (0, 4095))], 6, 2),
        write("rates.edf", pyedflib.FILETYPE_EDFPLUS,
              [eeg("A", 487.5), eeg("B", 487.5), eeg("C", 499.5), eeg("D", 12.5)], 8, 3, record_s=2,
              annotations=[(0.5, -1, "first light"), (3.25, 1.5, "second light")]),
        write("words.edf", pyedflib.FILETYPE_EDFPLUS, [eeg("O1", 50), eeg("O2", 50)], 12, 4, annotation_signals=3,
              annotations=[(0.0, -1, "buoy"), (1.2345, 0.25, "Boje → 灯"), (1.2345, -1, "swell"), (2.5, -1, "ÄÖÜ"), (7.0001, 2, "buoy"), (11.99, -1, "last")]),
        # pyEDFlib takes microseconds for a tenth of what they are: this first record starts at 0.25 s.
        write("late.edf", pyedflib.FILETYPE_EDFPLUS, [eeg("O1", 128)], 10, 5, start=datetime.datetime(1985, 1, 1, 6, 30, 0, 25000),
              annotations=[(1.0, -1, "buoy"), (4.5, -1, "swell")]),
        write("short.edf", pyedflib.FILETYPE_EDFPLUS, [eeg("O1", 200), eeg("O2", 200), eeg("slow", 10)], 5, 6, record_s=0.1,
              annotations=[(0.35, -1, "buoy")]),
    ]
    out = {"about": "written and read by pyEDFlib " + pyedflib.__version__ + "; see make_edf.py", "files": [describe(p) for p in files]}
    with open(os.path.join(HERE, "expected.json"), "w") as f:
        json.dump(out, f, indent=1, ensure_ascii=False)
        f.write("\n")
    print(sum(os.path.getsize(p) for p in files), "bytes of EDF")


if __name__ == "__main__":
    main()
