//! The demonstration finds the association where truth.json says it was built, and not where it was not.

mod common;

use std::path::Path;

use common::{salband_in, stderr, stdout};
use polars::prelude::{CsvReadOptions, DataFrame, SerReader};

fn table(path: &Path) -> DataFrame {
    let reader = CsvReadOptions::default().with_has_header(true).try_into_reader_with_file_path(Some(path.into()));
    reader.unwrap().finish().unwrap()
}

fn texts(table: &DataFrame, name: &str) -> Vec<String> {
    let column = table.column(name).unwrap().str().unwrap().iter();
    column.map(|text| text.unwrap_or_default().to_string()).collect()
}

fn numbers(table: &DataFrame, name: &str) -> Vec<f64> {
    let column = table.column(name).unwrap().cast(&polars::prelude::DataType::Float64).unwrap();
    column.f64().unwrap().iter().map(|number| number.unwrap_or(f64::NAN)).collect()
}

#[test]
fn found_where_it_was_built_and_not_where_it_was_not() {
    let source = Path::new(env!("CARGO_MANIFEST_DIR"));
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("demo");
    let output = salband_in(source, &["demo", "--out", out.to_str().unwrap()]);
    assert!(output.status.success(), "{}", stderr(&output));
    assert!(stdout(&output).starts_with("Yes, at 1,500 m, 2,500 m and 4,000 m: "), "{}", stdout(&output));
    let truth: serde_json::Value =
        serde_json::from_slice(&std::fs::read(source.join("demo-grids/truth.json")).unwrap()).unwrap();
    let planted: Vec<f64> =
        truth["planted_depths_m"].as_array().unwrap().iter().map(|depth| depth.as_f64().unwrap()).collect();
    assert_eq!(planted.len(), 3);
    let tests = table(&out.join("tables/coincidence.csv"));
    let (subject, reference, measure) =
        (texts(&tests, "subject"), texts(&tests, "reference"), texts(&tests, "measure"));
    let (depth, height, within, p) = (
        numbers(&tests, "depth_m"),
        numbers(&tests, "height_m"),
        numbers(&tests, "within_m"),
        numbers(&tests, "p_family"),
    );
    let effect = numbers(&tests, "effect");
    let mut seen = 0;
    for row in 0..depth.len() {
        let built = planted.contains(&depth[row]);
        if measure[row] == "enrichment" && subject[row] == "conductors" {
            if !built {
                assert!(p[row].is_nan() || p[row] > 0.05, "row {row}: p {} at {} m", p[row], depth[row]);
                assert!((0.6..1.5).contains(&effect[row]), "row {row}: {} at {} m", effect[row], depth[row]);
            } else if reference[row] == "gravity contacts" && height[row] == 0.0 && within[row] <= 1000.0 {
                assert!(p[row] <= 0.05 && effect[row] > 1.5, "row {row}: p {}, effect {}", p[row], effect[row]);
                seen += 1;
            }
        } else if subject[row] == "resistors" {
            assert!(p[row].is_nan() || p[row] > 0.05, "row {row}: resistors were not built anywhere: p {}", p[row]);
        }
    }
    let record = std::fs::read_to_string(out.join("provenance.json")).unwrap();
    for file in ["rho_0400.vrt", "rho_0400_west.tif", "rho_0400_east.tif", "rho_0800.prj"] {
        assert!(record.contains(&format!("\"path\": \"{file}\"")), "{file} is an input, with its hash");
    }
    assert_eq!(seen, 6, "three depths at two distances");
    assert_eq!(table(&out.join("tables/deposits.csv")).height(), 15, "every deposit is kept");
}
