"""Writes the small files of `arrays/`: the same numbers through NumPy (NPY, NPZ), SciPy (MAT) and tifffile (TIFF).

    pip install numpy scipy tifffile imagecodecs
    python make_arrays.py

The numbers follow two formulas, so that the tests can make them again:
channel c, sample t:        (37 c + 11 t) mod 201 - 100, without the 100 where the type has no sign;
frame f, row r, column c:   (29 f + 7 r + 13 c) mod 250.
"""
from pathlib import Path

import numpy as np
import scipy.io
import tifffile

HERE = Path(__file__).parent / "arrays"
HERE.mkdir(exist_ok=True)

c, t = np.mgrid[:3, :40]
PLAIN = (37 * c + 11 * t) % 201
SIGNED = PLAIN - 100
f, r, c = np.mgrid[:6, :4, :5]
MOVIE = (29 * f + 7 * r + 13 * c) % 250


def npy(name, array):
    np.save(HERE / f"{name}.npy", array)


for kind in ["<f4", ">f4", "<f8", ">f8", "<i2", ">i2", "<i4", "<i8", "|i1"]:
    if kind == "|i1":
        npy("i1", np.clip(SIGNED, -100, 100).astype(kind))
    else:
        word = {"<": "little", ">": "big"}[kind[0]]
        npy(f"{kind[1:]}-{word}", SIGNED.astype(kind))
for kind in ["|u1", "<u2", ">u2", "<u4"]:
    word = {"<": "-little", ">": "-big", "|": ""}[kind[0]]
    npy(f"{kind[1:]}{word}", PLAIN.astype(kind))
npy("fortran", np.asfortranarray(SIGNED.astype("<f4")))
npy("samples-first", SIGNED.T.astype("<f4").copy())
npy("samples-first-fortran", np.asfortranarray(SIGNED.T.astype("<f4")))
npy("movie", MOVIE.astype("<u2"))
npy("movie-fortran", np.asfortranarray(MOVIE.astype("<u2")))
npy("movie-frames-last", np.moveaxis(MOVIE, 0, 2).astype("<u2").copy())
with open(HERE / "version-2.npy", "wb") as file:
    np.lib.format.write_array(file, SIGNED.astype("<f4"), version=(2, 0))

np.savez(HERE / "stored.npz", eeg=SIGNED.astype("<f4"), fs=np.float64(250))
np.savez_compressed(HERE / "deflated.npz", eeg=SIGNED.astype("<i2"), other=PLAIN[:, :5].astype("<u2"), rate=np.int64(500))

scipy.io.savemat(HERE / "plain.mat", {"x": SIGNED.astype("<f8"), "fs": 250.0, "label": "night"})
scipy.io.savemat(HERE / "packed.mat", {"x": SIGNED.astype("<f4"), "fs": 250.0}, do_compression=True)
scipy.io.savemat(HERE / "movie.mat", {"m": np.moveaxis(MOVIE, 0, 2).astype("<u2")}, do_compression=True)
scipy.io.savemat(HERE / "two.mat", {"left": SIGNED.astype("<i2"), "right": SIGNED[:2].astype("<i2")})
scipy.io.savemat(HERE / "small.mat", {"x": np.array([[1, 2], [3, 4]], dtype="u1"), "fs": 10.0})
scipy.io.savemat(HERE / "level-4.mat", {"x": SIGNED.astype("<f8")}, format="4")

STACK = MOVIE.astype("u2")
tifffile.imwrite(HERE / "plain.tif", STACK, photometric="minisblack")
tifffile.imwrite(HERE / "big.tif", STACK, photometric="minisblack", bigtiff=True)
tifffile.imwrite(HERE / "big-endian.tif", STACK, photometric="minisblack", byteorder=">")
tifffile.imwrite(HERE / "8-bit.tif", MOVIE.astype("u1"), photometric="minisblack")
tifffile.imwrite(HERE / "float.tif", MOVIE.astype("f4"), photometric="minisblack")
for name in ["lzw", "deflate", "packbits"]:
    tifffile.imwrite(HERE / f"{name}.tif", STACK, photometric="minisblack", compression=name, rowsperstrip=2)
tifffile.imwrite(HERE / "lzw-predictor.tif", STACK, photometric="minisblack", compression="lzw", predictor=True)
tifffile.imwrite(HERE / "float-deflate.tif", MOVIE.astype("f4"), photometric="minisblack", compression="deflate", predictor=True)
tifffile.imwrite(HERE / "tiles.tif", STACK, photometric="minisblack", tile=(16, 16), compression="deflate")
tifffile.imwrite(HERE / "colour.tif", np.zeros((2, 4, 5, 3), "u1"), photometric="rgb")
