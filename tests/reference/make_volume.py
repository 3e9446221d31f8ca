"""Writes tests/data/volume.nc and two_variables.nc: CF grids whose values are known in closed form.

Run from the root of the repository: python3 tests/reference/make_volume.py   (needs numpy and scipy)
"""

import numpy as np
from scipy.io import netcdf_file

x = 500_000.0 - 1000 + 500.0 * (np.arange(24) + 0.5)
y = 5_600_000.0 - 8000 + 500.0 * (np.arange(20) + 0.5)  # ascending: the southern row comes first
depth = np.array([250.0, 750.0, 2000.0])


def axes(out, with_depth):
    out.Conventions = "CF-1.8"
    if with_depth:
        out.createDimension("depth", depth.size)
        axis = out.createVariable("depth", "d", ("depth",))
        axis[:] = depth
        axis.units, axis.positive, axis.standard_name, axis.axis = "m", "down", "depth", "Z"
    for name, values in (("y", y), ("x", x)):
        out.createDimension(name, values.size)
        axis = out.createVariable(name, "d", (name,))
        axis[:] = values
        axis.units, axis.standard_name = "m", f"projection_{name}_coordinate"
    crs = out.createVariable("crs", "i", ())
    crs.grid_mapping_name = "transverse_mercator"
    for name, value in (
        ("longitude_of_central_meridian", 15.0),
        ("latitude_of_projection_origin", 0.0),
        ("scale_factor_at_central_meridian", 0.9996),
        ("false_easting", 500_000.0),
        ("false_northing", 0.0),
        ("semi_major_axis", 6378137.0),
        ("inverse_flattening", 298.257223563),
    ):
        setattr(crs, name, np.array(value, dtype="d"))


with netcdf_file("tests/data/volume.nc", "w") as out:
    axes(out, True)
    rho = out.createVariable("log_rho", "d", ("depth", "y", "x"))
    rho.grid_mapping = "crs"
    rho[:] = 1 + depth[:, None, None] / 1000 + (x[None, None, :] - 500_000.0) / 1e5 + 0 * y[None, :, None]

with netcdf_file("tests/data/two_variables.nc", "w") as out:
    axes(out, False)
    for name, values in (("easting", x[None, :] + 0 * y[:, None]), ("northing", y[:, None] + 0 * x[None, :])):
        variable = out.createVariable(name, "d", ("y", "x"))
        variable.grid_mapping = "crs"
        variable[:] = values / 1000
