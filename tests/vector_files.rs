//! Vector files of several kinds: filters, lines cut at the frame, and mapped units as cells and boundaries.
//!
//! The files are written by GDAL; expected lengths and areas are closed forms.

use std::f64::consts::PI;
use std::path::{Path, PathBuf};
use std::time::Instant;

use gdal::DriverManager;
use gdal::spatial_ref::SpatialRef;
use gdal::vector::{Feature, LayerAccess, LayerOptions, OGRFieldType, OGRwkbGeometryType, ToGdal};
use geo::{Distance, Euclidean, Geometry, Length, LineString, MultiPolygon, Point, Polygon, Translate, polygon};
use salband::grid::{AttributeFilter, Crs, Frame, Units, VectorSource, carry, describe_layers, read_lines, read_units};

const WEST: f64 = 500_000.0;
const NORTH: f64 = 5_600_000.0;

/// A frame of 10 km x 10 km in UTM 33.
fn frame(cell: f64) -> Frame {
    let side = (10_000.0 / cell).round() as usize;
    Frame::new(Crs::from_definition("EPSG:32633").unwrap(), WEST, NORTH, cell, side, side).unwrap()
}

/// Columns of the test layers.
const COLUMNS: [(&str, OGRFieldType::Type); 3] =
    [("kind", OGRFieldType::OFTString), ("rank", OGRFieldType::OFTInteger64), ("dip", OGRFieldType::OFTReal)];

struct Row {
    shape: Geometry<f64>,
    kind: &'static str,
    rank: i64,
    dip: f64,
}

fn row(shape: impl Into<Geometry<f64>>, kind: &'static str, rank: i64, dip: f64) -> Row {
    Row { shape: shape.into(), kind, rank, dip }
}

fn plain(shape: impl Into<Geometry<f64>>) -> Row {
    row(shape, "a", 1, 0.0)
}

/// Writes one layer named `mapped`.
fn write(path: &Path, driver: &str, code: u32, kind: OGRwkbGeometryType::Type, rows: &[Row]) {
    let mut reference = SpatialRef::from_epsg(code).unwrap();
    reference.set_axis_mapping_strategy(gdal::spatial_ref::AxisMappingStrategy::TraditionalGisOrder);
    let mut dataset = DriverManager::get_driver_by_name(driver).unwrap().create_vector_only(path).unwrap();
    let options = LayerOptions { name: "mapped", srs: Some(&reference), ty: kind, options: None };
    let layer = dataset.create_layer(options).unwrap();
    layer.create_defn_fields(&COLUMNS).unwrap();
    for Row { shape, kind, rank, dip } in rows {
        let mut feature = Feature::new(layer.defn()).unwrap();
        feature.set_field_string(0, kind).unwrap();
        feature.set_field_integer64(1, *rank).unwrap();
        feature.set_field_double(2, *dip).unwrap();
        feature.set_geometry(shape.to_gdal().unwrap()).unwrap();
        feature.create(&layer).unwrap();
    }
    dataset.close().unwrap();
}

fn source(path: PathBuf) -> VectorSource {
    VectorSource { path, layer: None, crs: None, filter: None }
}

fn filtered(path: &Path, column: &str, is: &[&str], not: &[&str]) -> VectorSource {
    let texts = |values: &[&str]| values.iter().map(|value| value.to_string()).collect();
    let filter = AttributeFilter { column: column.into(), is: texts(is), not: texts(not) };
    VectorSource { filter: Some(filter), ..source(path.to_path_buf()) }
}

fn line(points: &[(f64, f64)]) -> LineString<f64> {
    points.iter().map(|(x, y)| (WEST + x, NORTH - 10_000.0 + y)).collect()
}

fn square(x: f64, y: f64, side: f64) -> Polygon<f64> {
    Polygon::new(line(&[(x, y), (x + side, y), (x + side, y + side), (x, y + side)]), vec![])
}

/// A regular polygon of many sides around a place of the frame; its area is n r^2 sin(2 pi / n) / 2.
fn round(x: f64, y: f64, radius: f64, sides: usize) -> LineString<f64> {
    let angle = |k: usize| 2.0 * PI * k as f64 / sides as f64;
    line(&(0..=sides).map(|k| (x + radius * angle(k).cos(), y + radius * angle(k).sin())).collect::<Vec<_>>())
}

fn length(lines: &[LineString<f64>]) -> f64 {
    lines.iter().map(|line| Euclidean.length(line)).sum()
}

/// The error's text without the folder of the test.
fn told(error: salband::Error, folder: &Path) -> String {
    error.to_string().replace(&format!("{}/", folder.display()), "")
}

/// Four lines, 1 to 4 km long, that differ in every column.
fn four_lines(folder: &Path) -> Vec<PathBuf> {
    let rows = [
        row(line(&[(1000.0, 1000.0), (2000.0, 1000.0)]), "thrust", 1, 30.0),
        row(line(&[(1000.0, 2000.0), (3000.0, 2000.0)]), "dyke", 2, 85.5),
        row(line(&[(1000.0, 3000.0), (4000.0, 3000.0)]), "dyke; SELECT", 3, 85.5),
        row(line(&[(1000.0, 4000.0), (5000.0, 4000.0)]), "it's", 4, -0.25),
    ];
    let files = [("faults.gpkg", "GPKG"), ("faults.geojson", "GeoJSON"), ("faults.shp", "ESRI Shapefile")];
    let written = files.map(|(name, driver)| {
        let path = folder.join(name);
        // GeoJSON holds longitude and latitude unless told otherwise; the driver writes the system that it is given.
        write(&path, driver, 32633, OGRwkbGeometryType::wkbLineString, &rows);
        path
    });
    written.to_vec()
}

#[test]
fn filters_choose_by_text_number_and_exclusion_in_every_format() {
    let folder = tempfile::tempdir().unwrap();
    let cases: [(&str, &[&str], &[&str], f64); 9] = [
        ("kind", &["dyke"], &[], 2000.0),
        ("kind", &[" thrust ", "dyke"], &[], 3000.0),
        ("kind", &[], &["dyke"], 8000.0),
        ("kind", &["dyke", "thrust"], &["thrust"], 2000.0),
        ("kind", &["dyke; SELECT", "it's"], &[], 7000.0),
        ("rank", &["3", "4.0"], &[], 7000.0),
        ("rank", &[], &["1", "2"], 7000.0),
        ("dip", &["85.50"], &[], 5000.0),
        ("dip", &["-.25"], &["30"], 4000.0),
    ];
    for path in four_lines(folder.path()) {
        assert!((length(&read_lines(&source(path.clone()), &frame(100.0), 0.0).unwrap()) - 10_000.0).abs() < 1e-3);
        for (column, is, not, expected) in cases {
            let kept = read_lines(&filtered(&path, column, is, not), &frame(100.0), 0.0).unwrap();
            let found = length(&kept);
            assert!((found - expected).abs() < 1e-3, "{} {column} {is:?} {not:?}: {found}", path.display());
        }
    }
}

#[test]
fn truth_values_and_missing_values_are_chosen_too() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("sure.geojson");
    let feature = |properties: &str, y: f64, long: f64| {
        format!(
            r#"{{"type":"Feature","properties":{properties},"geometry":{{"type":"LineString","coordinates":[[501000,{}],[{},{}]]}}}}"#,
            NORTH - y,
            501_000.0 + long,
            NORTH - y
        )
    };
    let features = [
        feature(r#"{"sure":true,"kind":"a"}"#, 1000.0, 1000.0),
        feature(r#"{"sure":false,"kind":null}"#, 2000.0, 2000.0),
        feature(r#"{"sure":null}"#, 3000.0, 4000.0),
        r#"{"type":"Feature","properties":{"sure":true},"geometry":null}"#.to_string(),
    ];
    let text = format!(
        r#"{{"type":"FeatureCollection","crs":{{"type":"name","properties":{{"name":"EPSG:32633"}}}},"features":[{}]}}"#,
        features.join(",")
    );
    std::fs::write(&path, text).unwrap();
    let kept = |column: &str, is: &[&str], not: &[&str]| {
        length(&read_lines(&filtered(&path, column, is, not), &frame(100.0), 0.0).unwrap())
    };
    assert_eq!(kept("sure", &["true"], &[]), 1000.0);
    assert_eq!(kept("sure", &["False"], &[]), 2000.0);
    assert_eq!(kept("sure", &[], &["true"]), 6000.0);
    assert_eq!(kept("kind", &[""], &[]), 6000.0);
    assert_eq!(kept("kind", &[], &[""]), 1000.0);
}

#[test]
fn lines_end_where_the_frame_and_its_margin_end() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("long.gpkg");
    let rows = [
        // y = x / 2 through the frame: inside for x in [-margin, 10 km + margin], so (10 km + 2 margin) sqrt(5) / 2.
        plain(line(&[(-20_000.0, -10_000.0), (40_000.0, 20_000.0)])),
        // Touches the corner of the frame only.
        plain(line(&[(-1000.0, 9000.0), (1000.0, 11_000.0)])),
        plain(line(&[(12_000.0, 0.0), (12_000.0, 9000.0)])),
    ];
    write(&path, "GPKG", 32633, OGRwkbGeometryType::wkbLineString, &rows);
    let read = |margin: f64| read_lines(&source(path.clone()), &frame(100.0), margin).unwrap();
    let slanting = |margin: f64| (10_000.0 + 2.0 * margin) * 5f64.sqrt() / 2.0;
    assert_eq!(read(0.0).len(), 1);
    assert!((length(&read(0.0)) - slanting(0.0)).abs() < 1e-6, "{}", length(&read(0.0)));
    // With 500 m, the second line cuts a corner: y = x + 10 km from x = -500 m to y = 10.5 km.
    let corner = 1000.0 * 2f64.sqrt();
    assert!((length(&read(500.0)) - slanting(500.0) - corner).abs() < 1e-6);
    for (margin, text) in [(f64::NAN, "NaN"), (-1.0, "-1"), (f64::INFINITY, "inf")] {
        let error = read_lines(&source(path.clone()), &frame(100.0), margin).unwrap_err().to_string();
        assert_eq!(error, format!("the margin: found {text}; wanted a number of metres, zero or more."));
    }
}

#[test]
fn heights_are_passed_over_and_outlines_count_as_lines() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("high.geojson");
    let shape = |text: &str| format!(r#"{{"type":"Feature","properties":{{}},"geometry":{text}}}"#);
    let features = [
        shape(
            r#"{"type":"MultiLineString","coordinates":[[[501000,5595000,120],[503000,5595000,80]],[[501000,5594000,1],[502000,5594000,2]]]}"#,
        ),
        shape(
            r#"{"type":"Polygon","coordinates":[[[505000,5595000,3],[506000,5595000,3],[506000,5596000,3],[505000,5596000,3],[505000,5595000,3]]]}"#,
        ),
    ];
    let text = format!(
        r#"{{"type":"FeatureCollection","crs":{{"type":"name","properties":{{"name":"EPSG:32633"}}}},"features":[{}]}}"#,
        features.join(",")
    );
    std::fs::write(&path, text).unwrap();
    assert_eq!(length(&read_lines(&source(path.clone()), &frame(100.0), 0.0).unwrap()), 7000.0);
    let units = read_units(&source(path), &frame(100.0)).unwrap();
    assert_eq!((units.area_m2, units.mask.count(), units.features), (1e6, 100, 1));
}

/// One unit: a circle of 3 km around the middle with a hole of 1 km.
fn ring_shaped() -> Polygon<f64> {
    Polygon::new(round(5012.3, 4987.1, 3000.0, 2000), vec![round(5412.0, 5287.0, 1000.0, 2000)])
}

#[test]
fn cells_of_a_circle_with_a_hole_approach_its_area() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("ring.gpkg");
    write(&path, "GPKG", 32633, OGRwkbGeometryType::wkbPolygon, &[plain(ring_shaped())]);
    let exact = PI * (9e6 - 1e6);
    let boundary = 2.0 * PI * 4000.0;
    for cell in [500.0, 200.0, 100.0, 40.0, 10.0] {
        let target = frame(cell);
        let units = read_units(&source(path.clone()), &target).unwrap();
        // The error of counting centres is that of cells along the boundary with random signs: about
        // sqrt(boundary / cell) cells, and less for smooth curves.
        let error = (units.mask.count() as f64 * cell * cell - exact).abs();
        assert!(error < (boundary / cell).sqrt() * cell * cell, "{cell}: {error}");
        // 2000 sides: 1 - sin(2 pi / n) n / (2 pi) = 1.6e-6 less than the circle.
        assert!((units.area_m2 / exact - 1.0).abs() < 3e-6, "{}", units.area_m2);
        assert!((length(&units.outlines) / boundary - 1.0).abs() < 3e-6);
        assert!(units.notes.is_empty() && units.features == 1);
        // Each centre, by its distance from the two middles; the sides stray 4 mm at most from the circles.
        let place = |x: f64, y: f64| Point::new(WEST + x, NORTH - 10_000.0 + y);
        for ((row, col), &set) in units.mask.0.indexed_iter() {
            let (x, y) = target.position(row as f64, col as f64);
            let outer = Euclidean.distance(Point::new(x, y), place(5012.3, 4987.1)) - 3000.0;
            let inner = Euclidean.distance(Point::new(x, y), place(5412.0, 5287.0)) - 1000.0;
            if outer.abs() > 0.01 && inner.abs() > 0.01 {
                assert_eq!(set, outer < 0.0 && inner > 0.0, "{cell} m: {row}, {col}");
            }
        }
    }
}

#[test]
fn a_unit_in_degrees_lands_on_the_metric_frame_with_its_edges_bent() {
    // A polygon of four vertices along meridians and parallels. On the frame, a centre is inside when its own longitude and
    // latitude, from PROJ, are between them: the long edges must be bent for that. The parallel bows by
    // (300 km)^2 / 8 / (6378 km / tan 50) = 2 km.
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("degrees.gpkg");
    let (west, east, south, north) = (12.9, 17.1, 50.3, 50.52);
    let unit = polygon![(x: west, y: south), (x: east, y: south), (x: east, y: north), (x: west, y: north)];
    write(&path, "GPKG", 4326, OGRwkbGeometryType::wkbPolygon, &[plain(unit)]);
    let (geographic, utm) = (Crs::from_definition("EPSG:4326").unwrap(), Crs::from_definition("EPSG:32633").unwrap());
    let middle = carry(&[(15.0, 50.41)], &geographic, &utm).unwrap()[0];
    let target = Frame::new(utm.clone(), middle.0 - 160_000.0, middle.1 + 20_000.0, 500.0, 80, 640).unwrap();
    let units = read_units(&source(path), &target).unwrap();
    let centres: Vec<(f64, f64)> =
        (0..80 * 640).map(|at| target.position((at / 640) as f64, (at % 640) as f64)).collect();
    let mut compared = 0;
    for (at, (longitude, latitude)) in carry(&centres, &utm, &geographic).unwrap().into_iter().enumerate() {
        let margins = [longitude - west, east - longitude, latitude - south, north - latitude];
        let least = margins.into_iter().fold(f64::INFINITY, f64::min);
        // A hundredth of a cell is 5 m, 0.00007 degrees of longitude.
        if least.abs() > 7e-5 {
            assert_eq!(units.mask.0[[at / 640, at % 640]], least > 0.0, "{longitude}, {latitude}");
            compared += 1;
        }
    }
    assert!(compared > 50_000, "{compared}");
    // Area of the spherical zone would be off by the ellipsoid; the cells themselves, within their boundary, suffice.
    let cells = units.mask.count() as f64 * target.cell_area();
    assert!((units.area_m2 / cells - 1.0).abs() < 2e-3, "{} against {cells}", units.area_m2);
}

fn merged(folder: &Path, rows: &[Row]) -> Units {
    let path = folder.join("merged.gpkg");
    let _ = std::fs::remove_file(&path);
    write(&path, "GPKG", 32633, OGRwkbGeometryType::wkbUnknown, rows);
    read_units(&source(path), &frame(100.0)).unwrap()
}

#[test]
fn overlaps_count_once_and_shared_borders_are_no_boundaries() {
    let folder = tempfile::tempdir().unwrap();
    // Two squares of 2 km that overlap in 1 km x 1 km: 4 + 4 - 1 km2, boundary 8 + 8 - 4 km.
    let overlapping = [plain(square(1000.0, 1000.0, 2000.0)), plain(square(2000.0, 2000.0, 2000.0))];
    let units = merged(folder.path(), &overlapping);
    assert_eq!((units.mask.count(), units.features), (700, 2));
    assert!((units.area_m2 - 7e6).abs() < 1.0 && (length(&units.outlines) - 12_000.0).abs() < 0.01);
    // Side by side, the second wound the other way: 8 km2, boundary 12 km.
    let mut turned = square(3000.0, 1000.0, 2000.0);
    turned.exterior_mut(|ring| ring.0.reverse());
    let units = merged(folder.path(), &[plain(square(1000.0, 1000.0, 2000.0)), plain(turned)]);
    assert_eq!(units.mask.count(), 800);
    assert!((units.area_m2 - 8e6).abs() < 1.0 && (length(&units.outlines) - 12_000.0).abs() < 0.01);
    // A hole of one that another fills; several parts in one feature; stray lines are passed over.
    let holed = Polygon::new(
        square(1000.0, 1000.0, 4000.0).into_inner().0,
        vec![square(2000.0, 2000.0, 1000.0).into_inner().0],
    );
    let parts = MultiPolygon(vec![square(2000.0, 2000.0, 1000.0), square(8000.0, 8000.0, 1000.0)]);
    let units = merged(folder.path(), &[plain(holed), plain(parts), plain(line(&[(0.0, 0.0), (9000.0, 1.0)]))]);
    assert_eq!((units.mask.count(), units.features), (1700, 2));
    assert!((length(&units.outlines) - 20_000.0).abs() < 0.01, "{}", length(&units.outlines));
}

#[test]
fn borders_on_cell_centres_belong_to_one_neighbour() {
    let folder = tempfile::tempdir().unwrap();
    // Borders along the centres of cells (50 m into each): each cell is counted by exactly one of the two.
    let (left, right) = (square(1050.0, 1050.0, 2000.0), square(3050.0, 1050.0, 2000.0));
    let count = |unit: &Polygon<f64>| merged(folder.path(), &[plain(unit.clone())]).mask.count();
    let both = merged(folder.path(), &[plain(left.clone()), plain(right.clone())]).mask.count();
    assert_eq!((count(&left), count(&right), both), (400, 400, 800));
}

#[test]
fn the_edge_of_the_frame_is_no_boundary() {
    let folder = tempfile::tempdir().unwrap();
    // The western half, drawn beyond the frame, and the same cut exactly at the frame: one boundary of 10 km each.
    let beyond =
        Polygon::new(line(&[(-3000.0, -3000.0), (5000.0, -3000.0), (5000.0, 13_000.0), (-3000.0, 13_000.0)]), vec![]);
    let cut = Polygon::new(line(&[(0.0, 0.0), (5000.0, 0.0), (5000.0, 10_000.0), (0.0, 10_000.0)]), vec![]);
    for unit in [beyond, cut] {
        let units = merged(folder.path(), &[plain(unit)]);
        assert_eq!((units.mask.count(), units.outlines.len()), (5000, 1));
        assert!((length(&units.outlines) - 10_000.0).abs() < 1e-6 && (units.area_m2 - 5e7).abs() < 1.0);
        assert!(units.notes.is_empty());
    }
    let whole = merged(folder.path(), &[plain(square(-1000.0, -1000.0, 12_000.0))]);
    assert!(whole.outlines.is_empty() && whole.mask.count() == 10_000);
    assert_eq!(
        whole.notes,
        ["every cell of the frame lies inside the units, so there is no ground outside to compare with"]
    );
}

#[test]
fn a_filter_may_ask_for_a_value_that_no_feature_has_and_is_told() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("units.gpkg");
    let rows =
        [row(square(1000.0, 1000.0, 1000.0), "granite", 1, 0.0), row(square(4000.0, 4000.0, 2000.0), "gabbro", 2, 0.0)];
    write(&path, "GPKG", 32633, OGRwkbGeometryType::wkbPolygon, &rows);
    let units = read_units(&filtered(&path, "kind", &["granite", "gabro"], &[]), &frame(100.0)).unwrap();
    assert_eq!((units.mask.count(), units.features), (100, 1));
    assert_eq!(units.notes, ["no feature has the value \"gabro\", which the filter asks for"]);
}

#[test]
fn a_filter_that_cannot_work_says_why() {
    let folder = tempfile::tempdir().unwrap();
    let path = four_lines(folder.path()).remove(0);
    let refused = |column: &str, is: &[&str], not: &[&str]| {
        told(read_lines(&filtered(&path, column, is, not), &frame(100.0), 0.0).unwrap_err(), folder.path())
    };
    assert_eq!(
        refused("Kinds", &["dyke"], &[]),
        "faults.gpkg: the filter's column: found \"Kinds\", which the layer \"mapped\" does not have; wanted one of: kind, \
         rank, dip. To mend it: if you meant \"kind\", write that."
    );
    assert_eq!(
        refused("kind", &["Dyke"], &["thrust"]),
        "faults.gpkg: the filter on \"kind\": found none of 4 features left by is \"Dyke\" and not \"thrust\"; wanted values \
         that the file has: \"dyke\", \"dyke; SELECT\", \"it's\", \"thrust\". To mend it: check the spelling, capitals included."
    );
    assert_eq!(
        refused("kind", &[], &[]),
        "faults.gpkg: the filter: found no value under is and none under not; wanted at least one value to keep or to leave \
         out. To mend it: list values under is or not, or take the filter out."
    );
    let many = folder.path().join("many.gpkg");
    let names = ["a", "b", "c", "d", "e", "f", "g", "h", "i", "j", "k", "l"];
    let rows: Vec<Row> = names.map(|name| row(line(&[(0.0, 0.0), (1.0, 1.0)]), name, 1, 0.0)).into();
    write(&many, "GPKG", 32633, OGRwkbGeometryType::wkbLineString, &rows);
    let error = read_lines(&filtered(&many, "kind", &["z"], &[]), &frame(100.0), 0.0).unwrap_err().to_string();
    assert!(error.contains(r#""i", "j", and more. To mend it"#) && !error.contains(r#""k""#), "{error}");
}

#[test]
fn files_without_what_is_wanted_are_refused_in_words() {
    let folder = tempfile::tempdir().unwrap();
    let file = |name: &str, shapes: Vec<Geometry<f64>>| {
        let path = folder.path().join(name);
        let rows: Vec<Row> = shapes.into_iter().map(plain).collect();
        write(&path, "GPKG", 32633, OGRwkbGeometryType::wkbUnknown, &rows);
        source(path)
    };
    let units = |source: &VectorSource| told(read_units(source, &frame(100.0)).unwrap_err(), folder.path());
    let lines = |source: &VectorSource| told(read_lines(source, &frame(100.0), 0.0).unwrap_err(), folder.path());
    let points = file("points.gpkg", vec![Point::new(WEST + 5.0, NORTH - 5.0).into()]);
    assert_eq!(
        lines(&points),
        "points.gpkg: the layer: found points only; wanted lines, or polygons whose outlines count as lines. To mend it: \
         choose another layer or file; known deposits belong under [deposits]."
    );
    assert_eq!(
        units(&points),
        "points.gpkg: the layer: found points only; wanted polygons. To mend it: choose another layer or file; known deposits \
         belong under [deposits]."
    );
    assert_eq!(
        units(&file("lines.gpkg", vec![line(&[(0.0, 0.0), (100.0, 0.0)]).into()])),
        "lines.gpkg: the layer: found lines and no polygon; wanted polygons. To mend it: name the file under [[lines]] \
         instead, or choose another layer."
    );
    let empty = file("empty.gpkg", vec![]);
    assert!(units(&empty).starts_with("empty.gpkg: the layer: found no shape in any feature; wanted polygons."));
    assert!(lines(&empty).starts_with("empty.gpkg: the layer: found no shape in any feature; wanted lines,"));
    assert_eq!(
        units(&file("far.gpkg", vec![square(50_000.0, 0.0, 1000.0).into()])),
        "far.gpkg: the polygons: found none on the frame; wanted at least one polygon that reaches it. To mend it: check the \
         layer and its coordinate system, or leave the units out."
    );
    assert_eq!(
        units(&file("thin.gpkg", vec![square(1010.0, 1010.0, 20.0).into()])),
        "thin.gpkg: the polygons: found 1 on the frame, without a cell centre inside; wanted units at least as wide as a \
         cell. To mend it: choose cells smaller than 100 m, or use the outlines under [[lines]]."
    );
    // The diagonals of a square of 1 km cross at its middle; one far from the frame does no harm.
    let bow = Polygon::new(line(&[(1000.0, 1000.0), (2000.0, 2000.0), (2000.0, 1000.0), (1000.0, 2000.0)]), vec![]);
    assert_eq!(
        units(&file("bow.gpkg", vec![square(5000.0, 5000.0, 1000.0).into(), bow.clone().into()])),
        "bow.gpkg: the polygon of feature 2: found edges that cross at 501500, 5591500; wanted rings that enclose a plain \
         area. To mend it: repair the polygon in the program that drew it, or leave it out with a filter."
    );
    let harmless = file("harmless.gpkg", vec![square(5000.0, 5000.0, 1000.0).into(), bow.translate(9e4, 0.0).into()]);
    assert_eq!(read_units(&harmless, &frame(100.0)).unwrap().features, 1);
    assert_eq!(
        units(&source(folder.path().join("nowhere.gpkg"))),
        "nowhere.gpkg: the file: found nothing at this path; wanted a vector file with polygons. To mend it: check the path; \
         a relative one starts at the folder of the study file."
    );
    let curved = folder.path().join("curved.csv");
    std::fs::write(&curved, "WKT,name\n\"CURVEPOLYGON(CIRCULARSTRING(0 0, 1 1, 2 0, 1 -1, 0 0))\",round\n").unwrap();
    let curved = VectorSource { crs: Some("EPSG:32633".into()), ..source(curved) };
    assert_eq!(
        units(&curved),
        "curved.csv: the shape of feature 1: found CURVEPOLYGON, which is not read; wanted points, lines or polygons with \
         straight edges. To mend it: convert the layer to straight edges first, or leave the feature out with a filter."
    );
}

#[test]
fn a_map_of_many_vertices_is_read_in_a_moment() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("large.gpkg");
    // A hundred stars of 1000 vertices that do not overlap: radius 400 (1 + 0.1 cos 40 t), whose area is
    // pi 400^2 (1 + 0.1^2 / 2) for a smooth curve.
    let star = |k: usize| {
        // Each lies otherwise among the cells, so that the errors along the boundaries do not add up.
        let (x, y) = (
            497.0 + 1000.0 * (k % 10) as f64 + 3.7 * k as f64 % 10.0,
            497.0 + 1000.0 * (k / 10) as f64 + 7.1 * k as f64 % 10.0,
        );
        let point = |i: usize| {
            let t = 2.0 * PI * i as f64 / 1000.0;
            let radius = 400.0 * (1.0 + 0.1 * (40.0 * t).cos());
            (x + radius * t.cos(), y + radius * t.sin())
        };
        plain(Polygon::new(line(&(0..1000).map(point).collect::<Vec<_>>()), vec![]))
    };
    write(&path, "GPKG", 32633, OGRwkbGeometryType::wkbPolygon, &(0..100).map(star).collect::<Vec<_>>());
    let start = Instant::now();
    let units = read_units(&source(path), &frame(10.0)).unwrap();
    let seconds = start.elapsed().as_secs_f64();
    let exact = 100.0 * PI * 160_000.0 * 1.005;
    assert!((units.area_m2 / exact - 1.0).abs() < 0.02, "{}", units.area_m2);
    assert!((units.mask.count() as f64 * 100.0 / units.area_m2 - 1.0).abs() < 2e-3);
    assert_eq!((units.features, units.outlines.len()), (100, 100));
    println!("100,000 vertices on 1000 x 1000 cells: {seconds:.2} s");
    // Far above what it takes, so that a busy machine does not fail it, and far below what comparing all pairs takes.
    assert!(seconds < 20.0, "{seconds} s");
}

#[test]
fn columns_and_their_values_are_described() {
    let folder = tempfile::tempdir().unwrap();
    let path = four_lines(folder.path()).remove(0);
    let text = describe_layers(&path).unwrap().replace(&format!("{}/", folder.path().display()), "");
    let expected = [
        "faults.gpkg: vector file (GPKG)",
        "  layer \"mapped\": 4 features, EPSG:32633, line string (4)",
        "    column \"kind\"  text: \"dyke\" (1), \"dyke; SELECT\" (1), \"it's\" (1), \"thrust\" (1)",
        "    column \"rank\"  whole number",
        "    column \"dip\"   number",
    ];
    assert_eq!(text.lines().collect::<Vec<_>>(), expected);
    let many = folder.path().join("many.gpkg");
    let names = ["a", "b", "c", "d", "e", "f", "g", "h", "i", "j", "k", "l", "m"];
    for (count, listed) in [(12, true), (13, false)] {
        let _ = std::fs::remove_file(&many);
        let rows: Vec<Row> =
            names[..count].iter().map(|name| row(line(&[(0.0, 0.0), (1.0, 1.0)]), name, 1, 0.0)).collect();
        write(&many, "GPKG", 32633, OGRwkbGeometryType::wkbLineString, &rows);
        assert_eq!(describe_layers(&many).unwrap().contains("\"a\" (1)"), listed, "{count}");
    }
}
