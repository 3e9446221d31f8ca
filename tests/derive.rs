//! `salband derive`: one transform of one raster, from file to file.

mod common;

use common::{CELL, NORTH, Raster, SIDE, Survey, WEST, stderr, stdout};
use salband::grid::Source;

/// The values of a GeoTIFF, row by row, and its unit.
fn read(survey: &Survey, name: &str) -> (Vec<f64>, String) {
    let raster = Source::file(survey.path(name)).open().unwrap();
    let frame = salband::grid::Frame::new(raster.crs.clone(), WEST, NORTH, CELL, SIDE, SIDE).unwrap();
    let placed = raster.place(1, &frame, Ok).unwrap();
    (placed.grid.values().iter().copied().collect(), raster.unit.clone())
}

/// Gravity of a point mass at `depth` metres under the middle, in units of G times the mass: depth / r^3.
fn point(depth: f64) -> impl Fn(usize, usize) -> f64 {
    move |row, col| {
        let (x, y) = ((col as f64 - 39.5) * CELL, (row as f64 - 39.5) * CELL);
        1e9 * depth / (x * x + y * y + depth * depth).powf(1.5)
    }
}

#[test]
fn a_continuation_from_file_to_file_is_the_closed_form() {
    let survey = Survey::new();
    survey.raster("point.tif", &Raster::of(&point(3000.0)));
    let ran = survey.salband(&[
        "derive",
        "upward",
        "point.tif",
        "--with",
        "height=1000",
        "--unit",
        "mGal",
        "--out",
        "up.tif",
    ]);
    assert!(ran.status.success(), "{}", stderr(&ran));
    let said = stdout(&ran);
    assert!(
        said.starts_with("Wrote up.tif: upward, height 1000, of band 1; 80 rows x 80 columns of 500 m in EPSG:32633"),
        "{said}"
    );
    // Source: a point source seen from 1,000 m higher is one 1,000 m deeper.
    let (found, unit) = read(&survey, "up.tif");
    assert_eq!(unit, "mGal");
    let exact = point(4000.0);
    let largest = exact(39, 39);
    for (at, value) in found.iter().enumerate() {
        let (row, col) = (at / SIDE, at % SIDE);
        if row.min(col) >= 8 && row.max(col) < SIDE - 8 {
            assert!((value - exact(row, col)).abs() < 0.005 * largest, "{row} {col}: {value} {}", exact(row, col));
        }
    }
    let left: Vec<_> = std::fs::read_dir(survey.path("")).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert!(!left.iter().any(|name| name.to_string_lossy().contains("partial")), "{left:?}");
}

#[test]
fn declinations_are_turned_to_the_grid_of_the_raster() {
    // At the western edge of its zone true north lies 2.3 degrees east of grid north at 50.5 north: the meridians close up
    // toward the middle one, by (15 - longitude) sin(latitude) at 12 degrees east (Snyder 1987, from memory).
    let survey = Survey::new();
    let source = point(3000.0);
    let west = Raster { origin: (287_000.0, NORTH), ..Raster::of(&source) };
    survey.raster("west.tif", &west);
    let make = |declination: &str, out: &str| {
        let with = format!("declination={declination}");
        let ran =
            survey.salband(&["derive", "pole", "west.tif", "--with", "inclination=55", "--with", &with, "--out", out]);
        assert!(ran.status.success(), "{}", stderr(&ran));
        let raster = Source::file(survey.path(out)).open().unwrap();
        let frame = salband::grid::Frame::new(raster.crs.clone(), 287_000.0, NORTH, CELL, SIDE, SIDE).unwrap();
        raster.place(1, &frame, Ok).unwrap().grid
    };
    let turned = make("10", "turned.tif");
    let raster = Source::file(survey.path("west.tif")).open().unwrap();
    let frame = salband::grid::Frame::new(raster.crs.clone(), 287_000.0, NORTH, CELL, SIDE, SIDE).unwrap();
    let north = salband::grid::true_north(&frame).unwrap();
    assert!((north - 2.2).abs() < 0.2, "{north}");
    let field = salband::field::PreparedField::new(&raster.place(1, &frame, Ok).unwrap().grid).unwrap();
    let direction = salband::field::Direction::new(55.0, 10.0 + north).unwrap();
    let expected = field.to_pole(salband::field::MagneticDirections::induced(direction)).unwrap().values().unwrap();
    let (low, high) = expected.range().unwrap();
    for (found, expected) in turned.values().iter().zip(expected.values()) {
        assert!((found - expected).abs() < 1e-5 * (high - low), "{found} {expected}");
    }
}

#[test]
fn the_list_names_every_transform() {
    let survey = Survey::new();
    let said = stdout(&survey.salband(&["derive"]));
    for name in salband::field::Transform::names() {
        assert!(said.contains(&format!("\n  {name} ")), "{name}");
    }
}

#[test]
fn what_cannot_be_derived_is_refused_in_words() {
    let survey = Survey::new();
    survey.raster("flat.tif", &Raster::of(&|_, _| 7.0));
    survey.raster("empty.tif", &Raster::of(&|_, _| -9999.0));
    let degrees =
        Raster { crs: Some(4326), origin: (15.0, 50.0), cell: 0.01, ..Raster::of(&|row, col| (row * col) as f64) };
    survey.raster("degrees.tif", &degrees);
    survey.file("there.tif", "something of the user's");
    let cases: [(&[&str], &str); 15] = [
        (
            &["upward", "gravity.tif", "--out", "o.tif"],
            "salband: the transform upward: found no height; wanted height (m). To mend it: give height a number.",
        ),
        (
            &["tilt", "gravity.tif", "--with", "hight=3", "--out", "o.tif"],
            "salband: the transform tilt: found a parameter \"hight\"; wanted height (m, may be left out). To mend it: leave hight out.",
        ),
        (
            &["tilt", "gravity.tif", "--with", "height", "--out", "o.tif"],
            "salband: --with: found \"height\"; wanted NAME=NUMBER, each name once. To mend it: write --with height=1000.",
        ),
        (
            &["tilt", "flat.tif", "--out", "o.tif"],
            "salband: flat.tif: a potential-field layer: found the layer is constant: 7 everywhere; wanted a field that varies. To mend it: check that this is the right band of the file.",
        ),
        (
            &["tilt", "empty.tif", "--out", "o.tif"],
            "salband: empty.tif: band 1: found no data in any cell that the frame covers; wanted numbers. To mend it: check the no-data value and the extent.",
        ),
        (
            &["tilt", "degrees.tif", "--out", "o.tif"],
            "salband: degrees.tif: the frame's coordinate system: found EPSG:4326, which is in degrees; wanted a projected system in metres, because distances and derivatives are taken on the frame. To mend it: name a projected system in metres with --onto EPSG:....",
        ),
        (
            &["tilt", "gravity.tif", "--band", "2", "--out", "o.tif"],
            "salband: gravity.tif: the band: found band 2 asked for, 1 in the file; wanted a band from 1 to 1. To mend it: set --band.",
        ),
        (
            &["tilt", "gravity.tif", "--out", "there.tif"],
            "salband: there.tif: the file to write: found a file at this path already; wanted a new path. To mend it: choose another name, or add --replace.",
        ),
        (
            &["tilt", "gravity.tif", "--out", "gravity.tif", "--replace"],
            "salband: gravity.tif: the file to write: found a file that the raster is read from; wanted another path, since the raster would be lost. To mend it: choose another name.",
        ),
        (
            &["tilt", "gravity.tif", "--out", ".", "--replace"],
            "salband: .: the file to write: found a folder at this path; wanted the path of a GeoTIFF in a folder that exists. To mend it: choose another path, or make the folder first.",
        ),
        (
            &["tilt", "gravity.tif", "--out", "nowhere/o.tif"],
            "salband: nowhere/o.tif: the file to write: found no such folder; wanted the path of a GeoTIFF in a folder that exists. To mend it: choose another path, or make the folder first.",
        ),
        (
            &["tilt", "gravity.tif", "--with", "height=1e9", "--out", "o.tif"],
            "salband: gravity.tif: the height: found 1000000000 m; wanted at most the raster's longer side, 40000 m: nothing of the field is left higher up. To mend it: check that it is in metres.",
        ),
        (
            &["tilt", "gravity.tif", "--cell", "1e7", "--out", "o.tif"],
            "salband: gravity.tif: the frame's shape: found 1 rows x 1 columns; wanted at least 8 rows and 8 columns. To mend it: choose a smaller --cell or a larger raster.",
        ),
        (
            &["tilt", "gravity.tif", "--onto", "EPSG:3857", "--out", "o.tif"],
            "salband: gravity.tif: the frame's coordinate system: found EPSG:3857, in which a metre is 0.638 m on the ground here; wanted a system made for the area, in which a metre is a metre. To mend it: name a system made for the area with --onto EPSG:CODE.",
        ),
        (
            &["tilt", "gravity.tif", "--cell", "nan", "--out", "o.tif"],
            "salband: gravity.tif: the frame's cell size: found NaN; wanted a positive number of metres. To mend it: set --cell.",
        ),
    ];
    for (arguments, message) in cases {
        let ran = survey.salband(&[&["derive"], arguments].concat());
        assert_eq!(ran.status.code(), Some(2), "{arguments:?}");
        assert_eq!(stderr(&ran).trim_end(), message);
        assert!(!survey.path("o.tif").exists());
    }
    assert_eq!(std::fs::read_to_string(survey.path("there.tif")).unwrap(), "something of the user's");
    let placed =
        survey.salband(&["derive", "tilt", "degrees.tif", "--onto", "EPSG:32633", "--cell", "1000", "--out", "o.tif"]);
    assert!(placed.status.success(), "{}", stderr(&placed));
}
