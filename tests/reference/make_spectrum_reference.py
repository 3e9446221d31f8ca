"""Makes tests/data/fields/spectrum_reference.json: the half spectrum of a small padded layer, by scipy.fft.rfft2.

The layer has value (31 row + 17 col) mod 13 in 10 x 12 cells. It is padded to 20 x 24 cells, 5 and 6 of them before it:
beyond the edge stands twice the edge value less the value as far inside, under a cosine taper that reaches zero one cell
past the padding, without other surroundings. Run with: python3 tests/reference/make_spectrum_reference.py
"""

import json
import pathlib

import numpy as np
import scipy.fft

layer = np.fromfunction(lambda row, col: (31 * row + 17 * col) % 13, (10, 12))


def axis(length, padded):
    before = (padded - length) // 2
    place = np.arange(padded) - before
    nearest = np.clip(place, 0, length - 1)
    outside = np.abs(place - nearest)
    room = np.where(place < 0, before, padded - before - length)
    mirrored = np.where(place < 0, outside, nearest - outside)
    return nearest, mirrored, (1 + np.cos(np.pi * outside / (room + 1))) / 2


rows, far_rows, fade_rows = axis(10, 20)
cols, far_cols, fade_cols = axis(12, 24)
carried = 2 * layer[np.ix_(rows, cols)] - layer[np.ix_(far_rows, far_cols)]
spectrum = scipy.fft.rfft2(np.outer(fade_rows, fade_cols) * carried)
target = pathlib.Path(__file__).parents[1] / "data" / "fields" / "spectrum_reference.json"
record = {"real": spectrum.real.ravel().tolist(), "imaginary": spectrum.imag.ravel().tolist()}
target.write_text(json.dumps(record) + "\n")
