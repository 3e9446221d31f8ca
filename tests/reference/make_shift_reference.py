"""Writes tests/data/shift_reference.json: cross-sums by scipy.signal.correlate2d, and correlations on the overlap by
scipy.stats.pearsonr, for two small layers with different footprints. From the repository's root:

    python3 tests/reference/make_shift_reference.py

Needs numpy and scipy; made with numpy 2.4.6 and scipy 1.17.1."""
import json
import numpy as np
import scipy
from scipy import ndimage, signal, stats

ROWS, COLS, UP, LEFT = 16, 21, 4, 5
rng = np.random.default_rng(20260401)


def smooth():
    return np.round(ndimage.gaussian_filter(rng.standard_normal((ROWS, COLS)), 1.2) * 3.0, 6)


subject_footprint = np.ones((ROWS, COLS), bool)
subject_footprint[:6, 12:] = False
subject_footprint[9:12, 4:7] = False
reference_footprint = rng.random((ROWS, COLS)) > 0.08
reference_footprint[:, :2] = False
a, b = smooth(), smooth()
members = (a > np.quantile(a, 0.7)) & subject_footprint
lines = (np.abs(b) < 0.12) & reference_footprint
distance = np.round(ndimage.distance_transform_edt(~lines), 6)
near = (distance <= 2.0) & reference_footprint


def every(moved, fixed):
    """sum over x of moved(x) fixed(x + s), for |s| <= (UP, LEFT); the shift of zero in the middle."""
    full = signal.correlate2d(np.asarray(fixed, float), np.asarray(moved, float), mode="full")
    return full[ROWS - 1 - UP : ROWS + UP, COLS - 1 - LEFT : COLS + LEFT]


def pearson(down, right):
    pairs = [
        (a[i, j], b[i + down, j + right])
        for i in range(ROWS)
        for j in range(COLS)
        if 0 <= i + down < ROWS
        and 0 <= j + right < COLS
        and subject_footprint[i, j]
        and reference_footprint[i + down, j + right]
    ]
    return float(stats.pearsonr(*zip(*pairs)).statistic)


capped = np.where(reference_footprint, np.minimum(distance, 3.0), 0.0)
shifts = [(0, 0), (1, 0), (0, -1), (-4, 5), (4, -5), (3, 2), (-2, -3)]
flat = lambda array: np.asarray(array, float).ravel().tolist()
out = {
    "source": f"numpy {np.__version__}, scipy {scipy.__version__}",
    "rows": ROWS, "cols": COLS, "up": UP, "left": LEFT,
    "subject_footprint": flat(subject_footprint), "reference_footprint": flat(reference_footprint),
    "members": flat(members), "a": flat(a), "b": flat(b), "distance": flat(distance),
    "overlap": flat(every(subject_footprint, reference_footprint)),
    "subject": flat(every(members, reference_footprint)),
    "near": flat(every(subject_footprint, near)),
    "hits": flat(every(members, near)),
    "distance_sum": flat(np.round(every(members, capped), 9)),
    "product": flat(np.round(every(np.where(subject_footprint, a, 0.0), np.where(reference_footprint, b, 0.0)), 10)),
    "pearson": [[down, right, pearson(down, right)] for down, right in shifts],
}
text = json.dumps(out).replace(".0,", ",").replace(".0]", "]")
with open("tests/data/shift_reference.json", "w") as file:
    file.write(text + "\n")
