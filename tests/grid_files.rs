//! Reading rasters of several kinds and placing them on a frame.
//!
//! Expected values are closed forms: a layer whose value is its own easting or a plane in map coordinates must come back
//! as such, whatever its format, cell size, orientation or coordinate system.

use std::path::{Path, PathBuf};

use gdal::raster::Buffer;
use gdal::spatial_ref::SpatialRef;
use gdal::{DriverManager, Metadata};
use ndarray::Array2;
use salband::grid::{Crs, Frame, Grid, Raster, Resampler, Source, carry, write_raster};

const UTM33: &str = "EPSG:32633";

fn frame(cell: f64, rows: usize, cols: usize) -> Frame {
    Frame::new(Crs::from_definition(UTM33).unwrap(), 500_000.0, 5_600_000.0, cell, rows, cols).unwrap()
}

fn place(raster: &Raster, band: usize, frame: &Frame) -> Array2<f64> {
    raster.place(band, frame, Ok).unwrap().grid.into_values()
}

/// Writes a GeoTIFF whose value at each cell centre is `value(x, y)`; `south_up` stores the southern row first.
fn write_tiff(path: &Path, frame: &Frame, south_up: bool, value: impl Fn(f64, f64) -> f64) {
    let driver = DriverManager::get_driver_by_name("GTiff").unwrap();
    let mut dataset = driver.create_with_band_type::<f64, _>(path, frame.cols, frame.rows, 1).unwrap();
    let (corner, step) = if south_up { (frame.south(), frame.cell) } else { (frame.north, -frame.cell) };
    dataset.set_geo_transform(&[frame.west, frame.cell, 0.0, corner, 0.0, step]).unwrap();
    dataset.set_spatial_ref(&SpatialRef::from_wkt(&frame.crs.wkt).unwrap()).unwrap();
    let mut band = dataset.rasterband(1).unwrap();
    band.set_no_data_value(Some(-9999.0)).unwrap();
    let rows: Vec<usize> = if south_up { (0..frame.rows).rev().collect() } else { (0..frame.rows).collect() };
    let numbers = rows.iter().flat_map(|row| {
        (0..frame.cols).map(|col| {
            let (x, y) = frame.position(*row as f64, col as f64);
            value(x, y)
        })
    });
    let mut buffer = Buffer::new((frame.cols, frame.rows), numbers.collect());
    band.write((0, 0), (frame.cols, frame.rows), &mut buffer).unwrap();
}

/// Writes a GeoTIFF in longitude and latitude (EPSG:4326) with its corner at `west`, `north` and cells of `step` degrees.
fn write_degrees(path: &Path, (rows, cols): (usize, usize), [west, north, step]: [f64; 3], values: Vec<f64>) {
    let driver = DriverManager::get_driver_by_name("GTiff").unwrap();
    let mut dataset = driver.create_with_band_type::<f64, _>(path, cols, rows, 1).unwrap();
    dataset.set_geo_transform(&[west, step, 0.0, north, 0.0, -step]).unwrap();
    dataset.set_spatial_ref(&SpatialRef::from_epsg(4326).unwrap()).unwrap();
    dataset.rasterband(1).unwrap().write((0, 0), (cols, rows), &mut Buffer::new((cols, rows), values)).unwrap();
    dataset.close().unwrap();
}

fn plane(x: f64, y: f64) -> f64 {
    0.002 * (x - 500_000.0) - 0.003 * (y - 5_600_000.0) + 7.0
}

fn worst(frame: &Frame, values: &Array2<f64>, ring: usize, expected: impl Fn(f64, f64) -> f64) -> f64 {
    let inner = |index: &(usize, usize)| {
        index.0 >= ring && index.1 >= ring && index.0 + ring < frame.rows && index.1 + ring < frame.cols
    };
    values.indexed_iter().filter(|(index, _)| inner(index)).fold(0.0, |worst: f64, ((row, col), value)| {
        let (x, y) = frame.position(row as f64, col as f64);
        assert!(value.is_finite(), "missing at {row}, {col}");
        worst.max((value - expected(x, y)).abs())
    })
}

#[test]
fn a_plane_survives_every_change_of_cell_and_orientation() {
    let folder = tempfile::tempdir().unwrap();
    let target = frame(500.0, 20, 24);
    for (name, cell, south_up, resampler) in [
        ("same", 500.0, false, Resampler::Cubic),
        ("finer", 100.0, false, Resampler::Average),
        ("coarser", 1250.0, false, Resampler::Cubic),
        ("south_up", 500.0, true, Resampler::Cubic),
        ("south_up_finer", 125.0, true, Resampler::Average),
    ] {
        let path = folder.path().join(format!("{name}.tif"));
        let side = |extent: f64| (extent / cell).ceil() as usize + 8;
        let crs = Crs::from_definition(UTM33).unwrap();
        let (rows, cols) = (side(10_000.0), side(12_000.0));
        let own = Frame::new(crs, 500_000.0 - 4.0 * cell, 5_600_000.0 + 4.0 * cell, cell, rows, cols).unwrap();
        write_tiff(&path, &own, south_up, plane);
        let raster = Source::file(&path).open().unwrap();
        let placed = raster.place(1, &target, Ok).unwrap();
        assert_eq!(placed.resampler, resampler, "{name}");
        assert!((placed.raster_cell - cell).abs() < 1e-6);
        let error = worst(&target, placed.grid.values(), 0, plane);
        assert!(error < 1e-6, "{name}: {error}");
    }
}

#[test]
fn a_grid_in_degrees_lands_where_it_belongs() {
    // Each cell holds its own easting in UTM 33, from PROJ; on the frame it must read as the frame's easting.
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("degrees.tif");
    let (geographic, utm) = (Crs::from_definition("EPSG:4326").unwrap(), Crs::from_definition(UTM33).unwrap());
    let (rows, cols, step, west, north) = (90, 120, 0.004, 14.9, 50.6);
    let centre = |row: usize, col: usize| (west + (col as f64 + 0.5) * step, north - (row as f64 + 0.5) * step);
    let centres: Vec<(f64, f64)> = (0..rows * cols).map(|i| centre(i / cols, i % cols)).collect();
    let eastings: Vec<f64> = carry(&centres, &geographic, &utm).unwrap().into_iter().map(|(x, _)| x).collect();
    write_degrees(&path, (rows, cols), [west, north, step], eastings);
    let target = Frame::new(utm, 500_000.0, 5_595_000.0, 500.0, 40, 50).unwrap();
    let raster = Source::file(&path).open().unwrap();
    assert!(raster.crs.geographic);
    let error = worst(&target, &place(&raster, 1, &target), 0, |x, _| x);
    assert!(error < 0.01, "{error} m");
}

#[test]
fn rasters_across_the_antimeridian_are_read_whole() {
    // Each cell holds its own easting in UTM 60, from PROJ. Longitudes are written in both ways that files use.
    let folder = tempfile::tempdir().unwrap();
    let (geographic, utm) = (Crs::from_definition("EPSG:4326").unwrap(), Crs::from_definition("EPSG:32660").unwrap());
    let middle = carry(&[(180.0, 10.0)], &geographic, &utm).unwrap()[0];
    let target = Frame::new(utm.clone(), middle.0 - 20_000.0, middle.1 + 10_000.0, 500.0, 40, 80).unwrap();
    for west in [179.5, -180.5] {
        let path = folder.path().join(format!("{west}.tif"));
        let (rows, cols, step, north) = (80, 200, 0.005, 10.2);
        let centre = |at: usize| (west + ((at % cols) as f64 + 0.5) * step, north - ((at / cols) as f64 + 0.5) * step);
        let places: Vec<(f64, f64)> =
            (0..rows * cols).map(centre).map(|(x, y)| ((x + 540.0) % 360.0 - 180.0, y)).collect();
        let eastings = carry(&places, &geographic, &utm).unwrap().into_iter().map(|(x, _)| x).collect();
        write_degrees(&path, (rows, cols), [west, north, step], eastings);
        let values = place(&Source::file(&path).open().unwrap(), 1, &target);
        let missing = values.iter().filter(|value| value.is_nan()).count();
        assert_eq!(missing, 0, "from {west}");
        let error = worst(&target, &values, 0, |x, _| x);
        assert!(error < 0.1, "from {west}: {error} m");
    }
}

#[test]
fn gaps_stay_gaps_and_half_covered_cells_are_kept() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("gaps.tif");
    // No data west of x = 502,250: with 500 m cells, that cuts the fifth column in half.
    let hole = |x: f64, y: f64| if x < 502_250.0 { -9999.0 } else { plane(x, y) };
    write_tiff(&path, &frame(50.0, 200, 240), false, hole);
    let target = frame(500.0, 20, 24);
    let values = place(&Source::file(&path).open().unwrap(), 1, &target);
    assert!(values.column(3).iter().all(|value| value.is_nan()), "no data in the fourth column");
    assert!(values.column(4).iter().all(|value| value.is_finite()), "half of the fifth is covered");
    // The mean over the covered half is the plane's value at the middle of that half.
    let (_, y) = target.position(7.0, 4.0);
    assert!((values[[7, 4]] - plane(502_375.0, y)).abs() < 1e-9);
    let less = |x: f64, y: f64| if x < 502_300.0 { -9999.0 } else { plane(x, y) };
    write_tiff(&path, &frame(50.0, 200, 240), false, less);
    let values = place(&Source::file(&path).open().unwrap(), 1, &target);
    assert!(values.column(4).iter().all(|value| value.is_nan()), "two fifths are too little");
}

#[test]
fn a_mask_band_hides_cells_that_hold_numbers() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("masked.tif");
    let own = frame(500.0, 20, 24);
    let driver = DriverManager::get_driver_by_name("GTiff").unwrap();
    let mut dataset = driver.create_with_band_type::<f32, _>(&path, 24, 20, 1).unwrap();
    dataset.set_geo_transform(&[own.west, 500.0, 0.0, own.north, 0.0, -500.0]).unwrap();
    dataset.set_spatial_ref(&SpatialRef::from_epsg(32633).unwrap()).unwrap();
    let mut band = dataset.rasterband(1).unwrap();
    band.write((0, 0), (24, 20), &mut Buffer::new((24, 20), vec![7.5f32; 480])).unwrap();
    band.create_mask_band(true).unwrap();
    let shown = (0..480).map(|at| if at == 5 * 24 + 9 { 0u8 } else { 255 }).collect();
    band.open_mask_band().unwrap().write((0, 0), (24, 20), &mut Buffer::new((24, 20), shown)).unwrap();
    dataset.close().unwrap();
    let values = place(&Source::file(&path).open().unwrap(), 1, &own);
    assert!(values[[5, 9]].is_nan());
    assert_eq!(values.iter().filter(|value| (**value - 7.5).abs() < 1e-6).count(), 479);
}

#[test]
fn where_the_raster_ends_inside_a_cell_its_cover_counts() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("ends.tif");
    let crs = Crs::from_definition(UTM33).unwrap();
    // The raster's western edge lies 300 m into the frame's third column of 500 m: 40 % of it is covered.
    write_tiff(&path, &Frame::new(crs, 501_300.0, 5_600_000.0, 100.0, 100, 60).unwrap(), false, plane);
    let values = place(&Source::file(&path).open().unwrap(), 1, &frame(500.0, 20, 24));
    assert!(values[[5, 2]].is_nan(), "{}", values[[5, 2]]);
    assert!(values[[5, 3]].is_finite());
}

#[test]
fn ascii_grid_with_a_stated_system_and_a_virtual_raster_over_it() {
    let folder = tempfile::tempdir().unwrap();
    let ascii = folder.path().join("plane.asc");
    let own = frame(500.0, 30, 30);
    let mut text = format!(
        "ncols 30\nnrows 30\nxllcorner {}\nyllcorner {}\ncellsize 500\nNODATA_value -99999\n",
        own.west,
        own.south()
    );
    for row in 0..30 {
        let line: Vec<String> = (0..30)
            .map(|col| {
                let (x, y) = own.position(f64::from(row), f64::from(col));
                if (row, col) == (2, 3) { "-99999".into() } else { format!("{:.6}", plane(x, y)) }
            })
            .collect();
        text += &(line.join(" ") + "\n");
    }
    std::fs::write(&ascii, text).unwrap();
    let refused = Source::file(&ascii).open().err().expect("no coordinate system").to_string();
    assert!(refused.contains("none in the file"), "{refused}");
    let stated = Source { crs: Some(UTM33.into()), ..Source::file(&ascii) };
    let raster = stated.open().unwrap();
    assert!(raster.crs_stated);
    let target = frame(500.0, 20, 24);
    let values = place(&raster, 1, &target);
    assert!(values[[2, 3]].is_nan());
    assert!((values[[9, 9]] - plane(target.position(9.0, 9.0).0, target.position(9.0, 9.0).1)).abs() < 1e-4);
    // A virtual raster with scale and offset: value = 2 * stored + 100.
    let virtual_raster = folder.path().join("plane.vrt");
    let body = format!(
        "<VRTDataset rasterXSize=\"30\" rasterYSize=\"30\"><SRS>{UTM33}</SRS><GeoTransform>{}, 500, 0, {}, 0, -500\
         </GeoTransform><VRTRasterBand dataType=\"Float32\" band=\"1\"><NoDataValue>-99999</NoDataValue>\
         <Scale>2</Scale><Offset>100</Offset><SimpleSource><SourceFilename relativeToVRT=\"1\">plane.asc\
         </SourceFilename><SourceBand>1</SourceBand></SimpleSource></VRTRasterBand></VRTDataset>",
        own.west, own.north
    );
    std::fs::write(&virtual_raster, body).unwrap();
    let scaled = place(&Source::file(&virtual_raster).open().unwrap(), 1, &target);
    assert!(scaled[[2, 3]].is_nan(), "no-data is a stored value, before scaling");
    assert!((scaled[[9, 9]] - (2.0 * values[[9, 9]] + 100.0)).abs() < 1e-3);
}

#[test]
fn a_netcdf_volume_gives_its_depths_and_its_bands() {
    // tests/data/volume.nc comes from tests/reference/make_volume.py (scipy.io.netcdf_file), which states its contents:
    // log10 rho = 1 + depth / 1000 + (x - 500000) / 1e5, depths 250, 750 and 2000 m, y ascending (south first).
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/volume.nc");
    let raster = Source::file(&path).open().unwrap();
    assert_eq!(raster.format, "netCDF");
    assert_eq!(raster.depths, [Some(250.0), Some(750.0), Some(2000.0)]);
    let target = frame(500.0, 12, 16);
    for (band, depth) in [(1, 250.0), (2, 750.0), (3, 2000.0)] {
        let values = place(&raster, band, &target);
        let error = worst(&target, &values, 0, |x, _| 1.0 + depth / 1000.0 + (x - 500_000.0) / 1e5);
        assert!(error < 1e-5, "{depth}: {error}");
    }
    // The y axis is told apart from its mirror image by a second variable: northing in kilometres.
    let several = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/two_variables.nc");
    let refused = Source::file(&several).open().err().expect("two variables").to_string();
    assert!(refused.contains("several variables"), "{refused}");
    let chosen = Source { variable: Some("northing".into()), ..Source::file(&several) };
    let values = place(&chosen.open().unwrap(), 1, &target);
    let error = worst(&target, &values, 0, |_, y| y / 1000.0);
    assert!(error < 1e-3, "{error}");
}

#[test]
fn what_is_written_reads_back_in_place() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.tif");
    let own = frame(500.0, 20, 24);
    let mut values = Array2::from_shape_fn(own.shape(), |(row, col)| (row * 24 + col) as f64 * 0.25);
    values[[4, 5]] = f64::NAN;
    let grid = Grid::new(own.clone(), values.clone()).unwrap();
    write_raster(&path, &grid, "gradient strength", "mGal/m").unwrap();
    let again = place(&Source::file(&path).open().unwrap(), 1, &own);
    for (index, value) in values.indexed_iter() {
        // Quarters are exact in 32-bit floats, and cubic convolution at cell centres is the identity.
        let equal = (value - again[index]).abs() < 1e-4 || (value.is_nan() && again[index].is_nan());
        assert!(equal, "{index:?}: {value} became {}", again[index]);
    }
    let dataset = gdal::Dataset::open(&path).unwrap();
    assert_eq!(dataset.rasterband(1).unwrap().description().unwrap(), "gradient strength");
    let bytes = std::fs::read(&path).unwrap();
    write_raster(&path, &grid, "gradient strength", "mGal/m").unwrap();
    assert_eq!(bytes, std::fs::read(&path).unwrap(), "the same grid gives the same bytes");
}
