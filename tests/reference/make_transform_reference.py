"""Expected values for tests/field_scipy.rs, made with scipy.fft alone: python3 make_transform_reference.py

The layer is the fourth power of the Laplacian of a Gaussian (in closed form: a Laguerre polynomial times a Gaussian). Its first
seven moments vanish, so that even products with |k| in them die away within the layer, and how a layer is padded makes no
difference above rounding.
"""
import json
from pathlib import Path

import numpy as np
import scipy
import scipy.fft as fft

CELL, ROWS, COLS, SPREAD = 50.0, 193, 216, 4.0  # metres, cells, cells, cells
PADDED = 512

row, col = np.mgrid[:ROWS, :COLS]
u = ((row - 95.3) ** 2 + (col - 107.6) ** 2) / (2 * SPREAD**2)
layer = (u**4 - 16 * u**3 + 72 * u**2 - 96 * u + 24) / 24 * np.exp(-u)

spectrum = fft.rfft2(layer, s=(PADDED, PADDED))
east = 2 * np.pi * fft.rfftfreq(PADDED, CELL)[None, :]
north = -2 * np.pi * fft.fftfreq(PADDED, CELL)[:, None]
length = np.hypot(east, north)
safe = np.where(length == 0, 1.0, length)


def direction(inclination, declination):
    dip, bearing = np.radians([inclination, declination])
    along = np.cos(dip) * (np.sin(bearing) * east + np.cos(bearing) * north) / safe
    return np.where(length == 0, 1.0, np.sin(dip) + 1j * along)


field, magnetisation = direction(-55.0, 12.0), direction(35.0, 140.0)
level = np.where(length == 0, 0.0, direction(0.0, 12.0))
wave = length / (2 * np.pi)
low = lambda wavelength: np.exp(-np.log(2) * (wave * wavelength) ** 2)
newton = 6.6743e-11 / 1e-7 * 1e-9 * 1e5
filters = {
    "upward 120": np.exp(-length * 120.0),
    "downward 60 gain 30": np.exp(-length * 60) / (np.exp(-2 * length * 60) + 1 / (4 * 30**2)),
    "low-pass 900": low(900.0),
    "band-pass 600 2000": low(600.0) - low(2000.0),
    "east": 1j * east,
    "north": 1j * north,
    "down": length,
    "east east": -(east**2),
    "east north": -east * north,
    "east down": 1j * east * length,
    "north north": -(north**2),
    "north down": 1j * north * length,
    "down down": length**2,
    "pole": 1 / (field * magnetisation),
    "equator": level**2 / (field * magnetisation),
    "magnetic-potential": np.where(length == 0, 0.0, -1 / (safe * field)),
    "potential-to-gravity": np.where(length == 0, 0.0, -newton * 2.5 / magnetisation),
    "pseudo-gravity": np.where(length == 0, 0.0, newton * 2.5 / (safe * field * magnetisation)),
}
places = [(95, 108), (88, 102), (100, 113), (78, 122), (108, 85), (95, 92), (68, 72)]
records = []
for name, filter in filters.items():
    product = fft.irfft2(spectrum * filter, s=(PADDED, PADDED))[:ROWS, :COLS]
    records.append({"name": name, "range": float(np.ptp(product)), "values": [float(product[p]) for p in places]})
out = {"made with": f"scipy {scipy.__version__}, numpy {np.__version__}", "places": places, "records": records}
path = Path(__file__).parent.parent / "data" / "transform_reference.json"
path.write_text(json.dumps(out) + "\n")
