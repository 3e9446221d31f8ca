"""The transforms of benches/fields.rs as a practitioner would write them in numpy and scipy.

Usage: python3 fields_peer.py SIDE PADDED THREADS. Prints s=SECONDS of the fastest of three runs.
"""

import sys
import time

import numpy as np
import scipy.fft

side, padded, threads = (int(word) for word in sys.argv[1:])
cell = 250.0
row, col = np.meshgrid(np.arange(side), np.arange(side), indexing="ij")
field = np.zeros((side, side))
for number in range(12):
    middle = ((number * 37 % 97) / 97 * side, (number * 61 % 89) / 89 * side)
    depth = (0.02 + 0.004 * number) * side
    field += (30 - 4 * number) / (1 + ((row - middle[0]) ** 2 + (col - middle[1]) ** 2) / depth**2) ** 1.5


def products():
    before = (padded - side) // 2
    room = (before, padded - side - before)
    rest = np.pad(field - field.mean(), (room, room), mode="symmetric")
    spectrum = scipy.fft.rfft2(rest, workers=threads)
    east = 2 * np.pi * scipy.fft.rfftfreq(padded, cell)[None, :]
    north = -2 * np.pi * scipy.fft.fftfreq(padded, cell)[:, None]
    inner = slice(before, before + side)

    def back(factor):
        return scipy.fft.irfft2(spectrum * factor, s=rest.shape, workers=threads)[inner, inner]

    gradient = back(1j * east), back(1j * north), back(np.hypot(east, north))
    return gradient, np.degrees(np.arctan2(gradient[2], np.hypot(gradient[0], gradient[1])))


fastest = float("inf")
for _ in range(3):
    began = time.perf_counter()
    products()
    fastest = min(fastest, time.perf_counter() - began)
print(f"s={fastest}")
