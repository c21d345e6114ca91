"""Tables of one small invented recording, written by pandas and by Python's csv module in the ways that laboratories write them,
and what pandas reads back from them.

    pip install pandas
    python make_tables.py         # writes tables.json beside this file
"""
import csv
import io
import json
import os

import numpy as np
import pandas as pd

RATE_HZ = 250.0


def recording():
    rng = np.random.default_rng(20)
    samples = np.round(rng.normal(0, 40, (40, 3)), 3)
    return pd.DataFrame(samples, columns=["Fz", "Cz", "Pz"])


def entry(name, text, read, **expected):
    back = pd.read_csv(io.StringIO(text), **read)
    channels = expected.pop("columns")
    values = back.iloc[:, channels].to_numpy(float)
    return {"name": name, "text": text, "samples": values.T.tolist(), **expected}


def main():
    plain = recording()
    timed = plain.copy()
    timed.insert(0, "time", np.arange(len(plain)) / RATE_HZ + 2)
    names = list(plain.columns)
    units = plain.rename(columns=lambda c: f"{c} (mV)")
    rounded = plain.copy()
    rounded.insert(0, "Time [ms]", np.round(np.arange(len(plain)) * 1000 / 256.0, 1))
    marked = timed.copy()
    marked["trigger"] = 0
    marked.loc[[5, 6, 20], "trigger"] = [7, 7, 3]
    quoted = io.StringIO()
    writer = csv.writer(quoted, quoting=csv.QUOTE_ALL)
    writer.writerow(["Fz, left", 'the "middle"', "Pz\nback"])
    writer.writerows(plain.to_numpy().tolist())
    three = [0, 1, 2]
    after = [1, 2, 3]
    tables = [
        entry("comma", plain.to_csv(index=False), {}, columns=three, names=names),
        entry("tab", plain.to_csv(index=False, sep="\t"), {"sep": "\t"}, columns=three, names=names),
        entry("decimal comma", plain.to_csv(index=False, sep=";", decimal=","), {"sep": ";", "decimal": ","}, columns=three, names=names),
        entry("decimal comma, tab", plain.to_csv(index=False, sep="\t", decimal=","), {"sep": "\t", "decimal": ","}, columns=three, names=names),
        entry("no header", plain.to_csv(index=False, header=False), {"header": None}, columns=three, names=["channel 1", "channel 2", "channel 3"]),
        entry("lines end as on Windows", plain.to_csv(index=False, lineterminator="\r\n"), {}, columns=three, names=names),
        entry("index", plain.to_csv(), {}, columns=after, names=names),
        entry("time", timed.to_csv(index=False), {}, columns=after, names=names, rate_hz=RATE_HZ, onset_s=2.0),
        entry("time, no header", timed.to_csv(index=False, header=False), {"header": None}, columns=after,
              names=["channel 1", "channel 2", "channel 3"], rate_hz=RATE_HZ, onset_s=2.0),
        entry("time in rounded milliseconds", rounded.to_csv(index=False, sep=";", decimal=","), {"sep": ";", "decimal": ","}, columns=after,
              names=names, rate_hz=256.0, onset_s=0.0),
        entry("units", units.to_csv(index=False), {}, columns=three, names=names, unit="mV"),
        entry("exponents", plain.to_csv(index=False, float_format="%.6e"), {}, columns=three, names=names),
        entry("marks", marked.to_csv(index=False), {}, columns=after, names=names, rate_hz=RATE_HZ, onset_s=2.0,
              events=[[2.0 + 5 / RATE_HZ, "7"], [2.0 + 20 / RATE_HZ, "3"]]),
        entry("quoted", quoted.getvalue(), {}, columns=three, names=["Fz, left", 'the "middle"', "Pzback"]),
    ]
    about = f"written by pandas {pd.__version__} and Python's csv module; see make_tables.py"
    with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "tables.json"), "w") as f:
        json.dump({"about": about, "tables": tables}, f, indent=1)
        f.write("\n")


if __name__ == "__main__":
    main()
