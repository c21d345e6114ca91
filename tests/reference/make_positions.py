"""Positions of the 10-05 system on a sphere, and biharmonic splines on a plane, made with NumPy and SciPy.

Writes positions.json beside this file. The positions follow the construction of Oostenveld & Praamstra 2001 (Clin. Neurophysiol.
112:713-719) on a sphere, but by another way than the core: every contour is found as the circle through three points (as a rotation
about the axis of its plane), and points on it by equal angles of that rotation.

    python make_positions.py
"""

import json
from pathlib import Path

import numpy as np
from scipy.interpolate import RBFInterpolator
from scipy.spatial import ConvexHull


def turned(point, axis, angle):
    """Rotation of a vector about an axis (Rodrigues 1840)."""
    axis = axis / np.linalg.norm(axis)
    return (
        point * np.cos(angle)
        + np.cross(axis, point) * np.sin(angle)
        + axis * (axis @ point) * (1 - np.cos(angle))
    )


def midline(percent):
    """Nasion 0, vertex 50, inion 100; 10 and 90 lie on the equator, so 80 percent are half a turn."""
    angle = np.pi * (percent - 10) / 80
    return np.array([0.0, np.cos(angle), np.sin(angle)])


def rim(percent, below):
    """The left half of a circumference, 0 in front and 100 behind, `below` steps of 5 percent under the equator."""
    around, down = np.pi * percent / 100, -below * np.pi / 16
    return np.array([-np.sin(around) * np.cos(down), np.cos(around) * np.cos(down), np.sin(down)])


def contour(left, top):
    """Seven points between the left end and the top of the circle through left, top and the mirror image of left."""
    right = left * [-1, 1, 1]
    normal = np.cross(top - left, right - left)
    normal /= np.linalg.norm(normal)
    centre = normal * (normal @ left)
    start, end = left - centre, top - centre
    angle = np.arctan2(normal @ np.cross(start, end), start @ end)
    return [centre + turned(start, normal, angle * k / 8) for k in range(1, 8)]


ROWS = {
    15: ("AFp", "AFp"), 20: ("AF", "AF"), 25: ("AFF", "AFF"), 30: ("F", "F"), 35: ("FFC", "FFT"), 40: ("FC", "FT"),
    45: ("FCC", "FTT"), 50: ("C", "T"), 55: ("CCP", "TTP"), 60: ("CP", "TP"), 65: ("CPP", "TPP"), 70: ("P", "P"),
    75: ("PPO", "PPO"), 80: ("PO", "PO"), 85: ("POO", "POO"),
}
ENDS = [("Fp", 0, 0), ("NFp", 0, 1), ("N", 0, 2), ("O", 100, 0), ("OI", 100, 1), ("I", 100, 2)]


def pair(all_, prefix, left, right, place):
    all_[prefix + left] = place
    all_[prefix + right] = place * [-1, 1, 1]


def electrodes():
    found = {}
    for percent, (medial, lateral) in ROWS.items():
        # A contour meets the circumference at the same share of the way from Fpz to Oz as of the way from nasion to inion.
        left, top = rim(percent, 0), midline(percent)
        found[medial + "z"] = top
        pair(found, lateral, "7", "8", left)
        names = ["7h 8h", "5 6", "5h 6h", "3 4", "3h 4h", "1 2", "1h 2h"]
        for k, (name, place) in enumerate(zip(names, contour(left, top))):
            pair(found, lateral if k == 0 else medial, *name.split(), place)
        pair(found, lateral, "9h", "10h", rim(percent, 1))
        pair(found, lateral, "9", "10", rim(percent, 2))
    for prefix, percent, below in ENDS:
        step = 5 if percent == 0 else -5
        found[prefix + "z"] = rim(percent, below) * [0, 1, 1]
        pair(found, prefix, "1h", "2h", rim(percent + step, below))
        pair(found, prefix, "1", "2", rim(percent + 2 * step, below))
    return found


def plate():
    random = np.random.default_rng(20)
    places = random.uniform([0, 0], [0.06, 0.04], (24, 2))
    values = random.normal(size=24)
    at = random.uniform([0, 0], [0.06, 0.04], (40, 2))
    spline = RBFInterpolator(places, values, kernel="thin_plate_spline", degree=1)
    hull = ConvexHull(places)
    return {
        "places": places.tolist(), "values": values.tolist(), "at": at.tolist(), "interpolated": spline(at).tolist(),
        "hull": places[hull.vertices].tolist(), "hull_area": hull.volume,
    }


def main():
    found = electrodes()
    assert len(found) == 345, len(found)
    out = {
        "made_by": "make_positions.py: NumPy, SciPy",
        "electrodes": {name: [float(f"{v:.15g}") for v in place] for name, place in sorted(found.items())},
        "plate": plate(),
    }
    path = Path(__file__).with_name("positions.json")
    path.write_text(json.dumps(out, separators=(",", ":")).replace('],"', '],\n"') + "\n")


main()
