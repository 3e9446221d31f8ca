//! What the commands print and write, on a small survey.

mod common;

use std::path::PathBuf;

use common::{CELL, NORTH, Raster, Survey, WEST, stderr, stdout};
use geo::{Distance, Euclidean, Point};

fn data(name: &str) -> String {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data").join(name).display().to_string()
}

#[test]
fn inspect_says_what_a_raster_holds() {
    let survey = Survey::new();
    survey.shaped_raster("half.tif", (4, 5), &Raster::of(&|row, col| if row < 2 { -9999.0 } else { col as f64 + 0.5 }));
    let text = stdout(&survey.salband(&["inspect", "half.tif"]));
    for line in [
        "half.tif: raster (GTiff, Float64)",
        "  cells      4 rows x 5 columns, 1 bands",
        "  system     EPSG:32633",
        "  extent     500000 to 502500 east, 5598000 to 5600000 north, in units of the system",
        "  cell       500 x 500 units of the system, northern row first",
        "  no data    -9999",
        "  band 1     0.5 to 4.5, 50.0 % of cells with data",
    ] {
        assert!(text.lines().any(|printed| printed == line), "{line:?} in\n{text}");
    }
    let volume = stdout(&survey.salband(&["inspect", &data("volume.nc")]));
    assert!(volume.contains("band 3") && volume.contains("at depth 2000 m"), "{volume}");
    let lost = survey.salband(&["inspect", "nowhere.tif"]);
    assert_eq!(lost.status.code(), Some(2));
    assert!(stderr(&lost).contains("nothing at this path"), "{}", stderr(&lost));
}

#[test]
fn new_writes_a_study_that_checks_and_runs() {
    let survey = Survey::new();
    survey.file("deposits.csv", "name,longitude,latitude\n\"=Risky\",15.1,50.4\nFar,30.0,50.4\n");
    let files = ["new", "fresh.toml", "--conductivity", "rho_3000.tif", "rho_1000.tif", "--gravity", "gravity.tif"];
    let made = survey.salband(&[files.as_slice(), &["--deposits", "deposits.csv"]].concat());
    assert!(made.status.success(), "{}", stderr(&made));
    let text = std::fs::read_to_string(survey.path("fresh.toml")).unwrap();
    assert!(text.contains("quantity = \"resistivity\""), "{text}");
    assert!(text.find("depth = 1000.0").unwrap() < text.find("depth = 3000.0").unwrap(), "sorted by depth:\n{text}");
    let again = survey.salband(&files);
    assert_eq!(again.status.code(), Some(2), "an existing study is not overwritten");
    let plan = survey.salband(&["check", "fresh.toml"]);
    assert!(plan.status.success(), "{}", stderr(&plan));
    let plan = stdout(&plan);
    assert!(plan.contains("Frame: EPSG:32633, 80 rows x 80 columns of 500 m"), "{plan}");
    assert!(plan.contains("gravity                  6400 cells (100 %)"), "{plan}");
    assert!(plan.contains("displaced by up to 20 rows and 20 columns, 0.25 of the footprint's sides"), "{plan}");
    assert!(
        plan.contains("a family of up to 16 tests"),
        "two depths x two heights x (3 distances + correlation): {plan}"
    );
    let ran = survey.salband(&["run", "fresh.toml", "--out", "out"]);
    assert!(ran.status.success(), "{}", stderr(&ran));
    assert_eq!(stderr(&ran), "", "nothing but the answer in a pipe");
    let deposits = std::fs::read_to_string(survey.path("out/tables/deposits.csv")).unwrap();
    assert!(deposits.contains("'=Risky"), "a formula is neutralised: {deposits}");
    assert!(deposits.lines().any(|line| line.starts_with("Far,") && line.contains(",no,")), "kept: {deposits}");
}

#[test]
fn magnetics_ask_for_their_angles_before_the_study_runs() {
    let survey = Survey::new();
    let made = survey.salband(&["new", "m.toml", "--conductivity", "rho_1000.tif", "--magnetic", "gravity.tif"]);
    assert!(made.status.success(), "{}", stderr(&made));
    let checked = survey.salband(&["check", "m.toml"]);
    assert_eq!(checked.status.code(), Some(2), "the angles are left for the user to fill in");
    assert!(stderr(&checked).contains("found no inclination"), "{}", stderr(&checked));
    let text =
        std::fs::read_to_string(survey.path("m.toml")).unwrap().replace("# inclination = 0.0", "inclination = 62.0");
    survey.file("m.toml", &text.replace("# declination = 0.0", "declination = 3.0"));
    assert!(survey.salband(&["check", "m.toml"]).status.success());
}

#[test]
fn mapped_lines_are_a_reference_like_any_other() {
    let survey = Survey::new();
    // One straight fault along the column at x = 515,200, written in degrees by GeoJSON's own rule.
    let ends = salband::grid::carry(
        &[(515_200.0, NORTH), (515_200.0, NORTH - 40_000.0)],
        &salband::grid::Crs::from_definition("EPSG:32633").unwrap(),
        &salband::grid::Crs::from_definition("EPSG:4326").unwrap(),
    )
    .unwrap();
    let line = format!("[[{},{}],[{},{}]]", ends[0].0, ends[0].1, ends[1].0, ends[1].1);
    survey.file(
        "faults.geojson",
        &format!(
            "{{\"type\":\"FeatureCollection\",\"features\":[{{\"type\":\"Feature\",\"properties\":{{}},\
             \"geometry\":{{\"type\":\"LineString\",\"coordinates\":{line}}}}}]}}"
        ),
    );
    survey.study("[test]", "[[lines]]\nname = \"faults\"\npath = \"faults.geojson\"\n\n[test]");
    let ran = survey.salband(&["run", "study.toml", "--out", "out"]);
    assert!(ran.status.success(), "{}", stderr(&ran));
    let table = std::fs::read_to_string(survey.path("out/tables/distance_profile.csv")).unwrap();
    let header: Vec<&str> = table.lines().next().unwrap().split(',').collect();
    let column = |name: &str| header.iter().position(|column| *column == name).unwrap();
    // Within 1,500 m of x = 515,200 lie the centres 500,250 + 500 k for k from 27 to 32: 6 columns of 80, none nearer to
    // the limit than 50 m.
    let mut seen = 0;
    for row in table.lines().skip(1).map(|line| line.split(',').collect::<Vec<_>>()) {
        if row[column("reference")] == "faults" && row[column("within_m")].parse() == Ok(1500.0) {
            let share: f64 = row[column("ground_share")].parse().unwrap();
            assert!((share - 6.0 / 80.0).abs() < 1e-9, "{share}");
            seen += 1;
        }
    }
    assert_eq!(seen, 2, "two depths");
    // Lines alone will do as well; with no gradient to draw, the map lies over the resistivity.
    let text = std::fs::read_to_string(survey.path("study.toml")).unwrap();
    let (start, end) = (text.find("[[potential]]").unwrap(), text.find("[[lines]]").unwrap());
    survey.file("lines.toml", &format!("{}{}", &text[..start], &text[end..]));
    let ran = survey.salband(&["run", "lines.toml", "--out", "lines"]);
    assert!(ran.status.success(), "{}", stderr(&ran));
    let map = std::fs::read_to_string(survey.path("lines/figures/map_1000.svg")).unwrap();
    assert!(map.contains("Resistivity, log10"), "the legend says what lies underneath");
}

#[test]
fn a_volume_is_read_with_its_depths() {
    let survey = Survey::new();
    std::fs::copy(data("volume.nc"), survey.path("volume.nc")).unwrap();
    survey.file(
        "volume.toml",
        "title = \"Volume\"\n[conductivity]\nquantity = \"log10-resistivity\"\nvolume = \"volume.nc\"\n\
         [[potential]]\nname = \"gravity\"\npath = \"gravity.tif\"\n",
    );
    let plan = stdout(&survey.salband(&["check", "volume.toml"]));
    for depth in ["resistivity 250 m", "resistivity 750 m", "resistivity 2000 m"] {
        assert!(plan.contains(depth), "{depth}: {plan}");
    }
}

#[test]
fn a_closed_pipe_is_no_error() {
    let survey = Survey::new();
    let script =
        format!("'{}' check study.toml | head -c 1 >/dev/null; echo ${{PIPESTATUS[0]}}", env!("CARGO_BIN_EXE_salband"));
    let output =
        std::process::Command::new("bash").args(["-c", &script]).current_dir(survey.path("")).output().unwrap();
    assert_eq!(stdout(&output).trim(), "0", "{}", stderr(&output));
}

#[test]
fn the_contacts_of_the_small_survey_surround_its_bodies() {
    // The plateaus of the invented gravity field rise steepest at 9, 14 and 7 rows from their middles: known by
    // construction, 1 / (1 + exp(distance)) is steepest at distance zero.
    let survey = Survey::new();
    assert!(survey.salband(&["run", "study.toml", "--out", "out"]).status.success());
    let dataset = gdal::Dataset::open(survey.path("out/gis/salband.gpkg")).unwrap();
    let mut layer = dataset.layer_by_name("contacts").unwrap();
    let mut lines = Vec::new();
    for feature in gdal::vector::LayerAccess::features(&mut layer) {
        let Ok(geo::Geometry::LineString(line)) = feature.geometry().unwrap().to_geo() else { panic!("a line") };
        lines.push(line);
    }
    let place = |row: f64, col: f64| Point::new(WEST + (col + 0.5) * CELL, NORTH - (row + 0.5) * CELL);
    for (row, col) in [(11.0, 22.0), (29.0, 22.0), (41.0, 52.0), (69.0, 52.0), (17.0, 62.0), (24.0, 71.0)] {
        let nearest = lines.iter().map(|line| Euclidean.distance(&place(row, col), line)).fold(f64::INFINITY, f64::min);
        assert!(nearest < 0.5 * CELL, "the rim at row {row}, column {col}: {nearest} m to the nearest contact");
    }
}

#[test]
fn the_study_as_understood_gives_the_same_tables() {
    let survey = Survey::new();
    assert!(survey.salband(&["run", "study.toml", "--out", "first"]).status.success());
    let record: serde_json::Value =
        serde_json::from_slice(&std::fs::read(survey.path("first/provenance.json")).unwrap()).unwrap();
    let spelled = record["study"].as_str().unwrap();
    for key in [
        "least_area",
        "profile",
        "distance_cap",
        "height_per_depth",
        "resolution",
        "significance",
        "strong",
        "weak",
        "least_length",
        "band",
        "seed",
    ] {
        assert!(spelled.contains(&format!("{key} = ")), "{key} is spelled out in\n{spelled}");
    }
    survey.file("spelled.toml", spelled);
    let again = survey.salband(&["run", "spelled.toml", "--out", "second"]);
    assert!(again.status.success(), "{}", stderr(&again));
    for table in ["coincidence", "distance_profile", "conductors", "contacts", "layers"] {
        let bytes = |out: &str| std::fs::read(survey.path(&format!("{out}/tables/{table}.csv"))).unwrap();
        assert_eq!(bytes("first"), bytes("second"), "{table}");
    }
}

#[test]
fn two_populations_are_told_apart_by_a_mixture() {
    // A third of the ground at about 10 ohm m, the rest at about 1,000: the threshold must fall between.
    let survey = Survey::new();
    let two = |row: usize, col: usize| {
        let base = if (row / 10 + col / 10).is_multiple_of(3) { 1.0 } else { 3.0 };
        10f64.powf(base + 0.03 * common::bumps(row, col, 5.0))
    };
    survey.raster("rho_1000.tif", &Raster::of(&two));
    survey.raster("rho_3000.tif", &Raster::of(&two));
    survey.study("quantile = 0.80", "mixture = true");
    let ran = survey.salband(&["run", "study.toml", "--out", "out"]);
    assert!(ran.status.success(), "{}", stderr(&ran));
    let table = std::fs::read_to_string(survey.path("out/tables/conductors.csv")).unwrap();
    let header: Vec<&str> = table.lines().next().unwrap().split(',').collect();
    let cells = header.iter().position(|name| *name == "cells").unwrap();
    let count: usize =
        table.lines().skip(1).map(|line| line.split(',').nth(cells).unwrap().parse::<usize>().unwrap()).sum();
    // 8 x 8 blocks of 100 cells, those whose block numbers add up to a multiple of 3: 21 of 64, at two depths.
    assert_eq!(count, 2 * 21 * 100);
}

#[test]
fn a_footprint_too_small_to_shift_is_told_in_words() {
    // Cells of 5 km leave 8 x 8 of them: shifts of up to two cells, 13 in the disc, fewer than 1/.05 ranks need.
    let survey = Survey::new();
    let study = common::STUDY.replace("cell = 500.0", "cell = 5000.0");
    let study = study.replace("within = [500.0, 1500.0]", "within = [5000.0, 10000.0]");
    survey.file("study.toml", &study.replace("quantile = 0.80", "quantile = 0.80, least_area = 1.0"));
    let ran = survey.salband(&["run", "study.toml", "--out", "out"]);
    assert!(ran.status.success(), "{}", stderr(&ran));
    assert!(stdout(&ran).starts_with("The data cannot tell"), "{}", stdout(&ran));
    let table = std::fs::read_to_string(survey.path("out/tables/coincidence.csv")).unwrap();
    let header: Vec<&str> = table.lines().next().unwrap().split(',').collect();
    let p = header.iter().position(|name| *name == "p_family").unwrap();
    for row in table.lines().skip(1) {
        assert_eq!(row.split(',').nth(p), Some(""), "{row}");
    }
    assert!(table.contains("cannot tell: this footprint holds"), "{table}");
}
