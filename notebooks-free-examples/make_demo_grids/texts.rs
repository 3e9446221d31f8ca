//! The study file and the page that explain the survey to a new user.

use crate::bodies::FIELD_ANGLES;
use crate::survey::slice_file;
use crate::world::DEPTHS;

/// How far grid north lies east of true north at the middle of the area, degrees: 0.456 sin(50.98), the distance from the
/// central meridian times the sine of the latitude (Snyder 1987).
const CONVERGENCE: f64 = 0.35;

/// The study file, with a comment on each choice.
pub fn study(seed: u64) -> String {
    let [inclination, declination] = FIELD_ANGLES;
    let from_true_north = declination + CONVERGENCE;
    let slices: String = DEPTHS
        .iter()
        .map(|depth| format!("  {{ path = \"{}\", depth = {depth:.1} }},\n", slice_file(*depth).0))
        .collect();
    format!(
        r#"# Brindle Plain: an invented survey. Paths are relative to this file.
# The question: do the conductors follow the margins of dense or magnetic bodies more than chance would give?

title = "Brindle Plain: conductors and the gravity margins"
# Every random choice comes from this number: the same study and seed give the same bytes.
seed  = {seed}
# The common raster: a projected CRS and square cells of so many metres. Every file below is placed on it, whatever its
# own CRS, cells and extent.
frame = {{ crs = "EPSG:32633", cell = 500.0 }}

[conductivity]
# What the slices hold: "resistivity" is ohm m.
quantity = "resistivity"
# One file a depth (m below ground, positive down). Any raster that GDAL reads will do: here GeoTIFF, a virtual raster
# and an ESRI ASCII grid. The same model also lies in one file: write  volume = "resistivity.nc"  in place of the list.
slices = [
{slices}]
# Conductors are the most conductive 15 % of each slice, resistors its most resistive 15 %; bodies smaller than 1 km2
# are dropped.
conductors = {{ quantile = 0.85, least_area = 1.0e6 }}
resistors  = {{ quantile = 0.15, least_area = 1.0e6 }}

# Grids whose margins (contacts) are the reference.
[[potential]]
name = "gravity"
path = "gravity.tif"
kind = "gravity"
# Contacts are picked on the grid as it is and again 1,000 m higher, where only the larger and deeper margins remain.
heights = [0.0, 1000.0]

[[potential]]
name = "magnetics"
path = "magnetics.tif"
kind = "magnetic"
# Direction of the inducing field, degrees: inclination positive down, declination positive east of true north (grid north
# lies {CONVERGENCE} degrees east of it here). Invented like the rest: at this latitude a real one would point down.
inclination = {inclination:.1}
declination = {from_true_north:.2}
# No heights are listed: contacts are picked on the field as it is and, for each slice, half its depth higher.

# Known deposits: they are drawn on the maps and listed; they are never used to find contacts or conductors.
[deposits]
path = "deposits.csv"
crs  = "EPSG:4326"
columns = {{ x = "longitude", y = "latitude", name = "name" }}

[test]
# "Near" is tested at each of these distances, m.
within = [500.0, 1000.0, 2000.0, 3000.0]
# The chance that the whole study reports a likeness where there is none.
family = 0.05

# cover_thickness.tif is there for a later [[control]]; this version does not take controls out.
"#
    )
}

/// The page that lies beside the files.
pub const README: &str = r#"# Brindle Plain

An invented survey. There is no such place: the coordinates only give the files something to be placed on, and the
bodies, the conductors, the deposits and all names are made up. The example program `make_demo_grids` makes every file
from one seed:

    cargo run --release --example make_demo_grids -- demo-grids

The area is 128 km by 96 km, with 42 bodies. Most are dense; they lie a few hundred metres to 6 km down. Along some of
their margins, at 1,500, 2,500 and 4,000 m, lie conductors; along equally strong ones there are none; and at every depth
there are conductors that have nothing to do with any body. `truth.md` tells all: read it after you have looked for
yourself.

| file | what it is | CRS and cells |
| --- | --- | --- |
| `gravity.tif` | Bouguer gravity, mGal, with three small gaps | EPSG:32633, 500 m |
| `magnetics.tif` | total-field magnetic anomaly, nT | EPSG:4326, 0.005 degrees |
| `rho_0150.tif`, `rho_1500.tif`, `rho_2500.tif` | resistivity, ohm m; the name holds the depth, m | EPSG:32634, 400 m |
| `rho_0400.vrt` | the same, a virtual raster over `rho_0400_west.tif` and `rho_0400_east.tif` | EPSG:32634, 400 m |
| `rho_0800.asc`, `rho_0800.prj` | the same, an ESRI ASCII grid | EPSG:32634, 400 m |
| `rho_4000.tif`, `rho_9000.tif` | the same | EPSG:32634, 800 m |
| `rho_6000.tif` | the same, 16-bit integers with scale 0.1 and offset 3,000 | EPSG:32634, 800 m |
| `resistivity.nc` | the same model in one CF NetCDF volume with a depth axis | EPSG:32634, 1,000 m |
| `cover_thickness.tif` | thickness of the conductive cover, m | EPSG:32633, 500 m |
| `deposits.csv` | fifteen deposits, longitude and latitude | EPSG:4326 |
| `study.toml` | the study file | |
| `truth.md`, `truth.json` | what was put in, in words and for programs | EPSG:32633 |

The slices are in the neighbouring UTM zone on purpose: they lie turned by nearly five degrees against the gravity grid.
The resistivity model has a ragged edge and twelve holes; -9999 stands for no data (-32768 in `rho_6000.tif`).
Resistivities are rounded to three significant digits: no model of the ground is known better than that.

Licence: MIT OR Apache-2.0, like the program that made it.
"#;
