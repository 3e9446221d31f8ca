//! References of a study: units that stay or are moved, heights tied to depth, resolutions matched.

mod common;

use common::{CELL, NORTH, Raster, SIDE, STUDY, Survey, WEST, resistivity, stderr};

/// A run's table as rows of (column, value).
fn table(survey: &Survey, name: &str) -> Vec<std::collections::BTreeMap<String, String>> {
    let text = std::fs::read_to_string(survey.path(&format!("out/tables/{name}.csv"))).unwrap();
    let mut lines = text.lines();
    let names: Vec<&str> = lines.next().unwrap().split(',').collect();
    let row = |line: &str| {
        let mut cells: Vec<String> = vec![String::new()];
        let mut quoted = false;
        for letter in line.chars() {
            match letter {
                '"' => quoted = !quoted,
                ',' if !quoted => cells.push(String::new()),
                _ => cells.last_mut().unwrap().push(letter),
            }
        }
        names.iter().map(|name| (*name).to_string()).zip(cells).collect()
    };
    lines.map(row).collect()
}

fn run(survey: &Survey) {
    let ran = survey.salband(&["run", "study.toml", "--out", "out", "--replace"]);
    assert!(ran.status.success(), "{}", stderr(&ran));
}

/// A square of ground, in cells, as a GeoJSON feature.
fn square(age: &str, (top, left, bottom, right): (f64, f64, f64, f64)) -> String {
    let at = |row: f64, col: f64| format!("[{}, {}]", WEST + col * CELL, NORTH - row * CELL);
    let corners = [at(top, left), at(bottom, left), at(bottom, right), at(top, right), at(top, left)];
    format!(
        "{{\"type\": \"Feature\", \"properties\": {{\"age\": \"{age}\"}}, \"geometry\": {{\"type\": \"Polygon\", \
         \"coordinates\": [[{}]]}}}}",
        corners.join(", ")
    )
}

fn units(survey: &Survey, features: &[String]) {
    let text = format!(
        "{{\"type\": \"FeatureCollection\", \"crs\": {{\"type\": \"name\", \"properties\": {{\"name\": \
         \"urn:ogc:def:crs:EPSG::32633\"}}}}, \"features\": [{}]}}",
        features.join(", ")
    );
    survey.file("suites.geojson", &text);
}

/// Twelve small squares scattered over the survey by a rule without pattern.
fn scattered() -> Vec<(f64, f64, f64, f64)> {
    (0..12)
        .map(|k| {
            let (row, col) = ((k * 29 % 67) as f64 + 3.0, (k * 43 % 71) as f64 + 2.0);
            (row, col, row + 6.0, col + 5.0)
        })
        .collect()
}

#[test]
fn resistors_inside_a_mapped_suite_are_found_and_the_filter_decides() {
    let survey = Survey::new();
    let squares = scattered();
    let mut features: Vec<String> = squares.iter().map(|square_of| square("old", *square_of)).collect();
    features.push(square("young", (0.0, 0.0, 80.0, 80.0)));
    units(&survey, &features);
    let inside = move |row: usize, col: usize| {
        let (row, col) = (row as f64 + 0.5, col as f64 + 0.5);
        squares
            .iter()
            .any(|(top, left, bottom, right)| (*top..*bottom).contains(&row) && (*left..*right).contains(&col))
    };
    let covered = (0..SIDE * SIDE).filter(|at| inside(at / SIDE, at % SIDE)).count();
    // Resistive where the old suite is mapped, and nowhere else beyond the background.
    survey.raster(
        "rho_1000.tif",
        &Raster::of(&|row, col| 10f64.powf(2.0 + 0.02 * common::bumps(row, col, 11.0) + f64::from(inside(row, col)))),
    );
    let keep = "[[units]]\nname = \"old suite\"\npath = \"suites.geojson\"\nkeep = { column = \"age\", is = [\"old\"] }\n\n[test]";
    let text = STUDY.replace("[test]", keep).replace(
        "conductors = { quantile = 0.80 }",
        "conductors = { quantile = 0.80 }\nresistors = { quantile = 0.05, least_area = 250000.0 }",
    );
    survey.file("study.toml", &text);
    run(&survey);
    let told = table(&survey, "units");
    assert_eq!(told.len(), 1);
    assert_eq!(told[0]["features"], "12");
    let area: f64 = told[0]["area_km2"].parse().unwrap();
    assert!((area - covered as f64 * 0.25).abs() < 1e-6, "{area} km2 against {covered} cells");
    let rows = table(&survey, "coincidence");
    let of_resistors: Vec<_> = rows
        .iter()
        .filter(|row| row["reference"] == "old suite" && row["subject"] == "resistors" && row["depth_m"] == "1000.0")
        .collect();
    let within: Vec<&str> = of_resistors.iter().map(|row| row["within_m"].as_str()).collect();
    assert_eq!(within, ["0.0", "500.0", "1500.0", ""], "inside first, then the distances, then the mean distance");
    assert_eq!(of_resistors[0]["subject_share"], "1.0", "every resistor lies inside");
    let ground: f64 = of_resistors[0]["ground_share"].parse().unwrap();
    assert!((ground - covered as f64 / 6400.0).abs() < 1e-9);
    let observed: f64 = of_resistors[0]["observed"].parse().unwrap();
    assert!((observed - 6400.0 / covered as f64).abs() < 1e-9, "enrichment is one over the share of the ground");
    assert!(of_resistors[0]["verdict"].starts_with("beyond chance"), "{}", of_resistors[0]["verdict"]);
    let deep = rows
        .iter()
        .find(|row| row["reference"] == "old suite" && row["subject"] == "resistors" && row["depth_m"] == "3000.0");
    assert!(!deep.unwrap()["verdict"].starts_with("beyond chance, the family"), "the deep slice knows nothing of it");
}

#[test]
fn units_that_are_moved_are_a_subject_without_depth() {
    let survey = Survey::new();
    units(&survey, &scattered().into_iter().map(|of| square("old", of)).collect::<Vec<_>>());
    let moved = "[[units]]\nname = \"old suite\"\npath = \"suites.geojson\"\nrole = \"subject\"\n\n[test]";
    survey.study("[test]", moved);
    run(&survey);
    let rows = table(&survey, "coincidence");
    let own: Vec<_> = rows.iter().filter(|row| row["subject"] == "old suite").collect();
    assert_eq!(own.len(), 3, "two distances and the mean distance, against gravity as it is");
    for row in own {
        assert_eq!((row["depth_m"].as_str(), row["height_m"].as_str()), ("", "0.0"));
        assert_eq!(row["subject_cells"], (12 * 30).to_string());
    }
    let page = std::fs::read_to_string(survey.path("out/report.html")).unwrap();
    assert!(page.contains("Old suite, the mapped units that were moved"));
}

#[test]
fn heights_follow_the_depth_unless_they_are_listed() {
    let survey = Survey::new();
    run(&survey);
    let heights = |survey: &Survey| {
        let mut seen: Vec<(String, String)> = Vec::new();
        for row in table(survey, "coincidence") {
            let pair = (row["depth_m"].clone(), row["height_m"].clone());
            if !seen.contains(&pair) {
                seen.push(pair);
            }
        }
        seen
    };
    let pair = |depth: &str, height: &str| (depth.to_string(), height.to_string());
    assert_eq!(
        heights(&survey),
        [pair("1000.0", "0.0"), pair("1000.0", "500.0"), pair("3000.0", "0.0"), pair("3000.0", "1500.0")]
    );
    survey.study("kind = \"gravity\"", "kind = \"gravity\"\nheights = [750.0]");
    run(&survey);
    assert_eq!(heights(&survey), [pair("1000.0", "750.0"), pair("3000.0", "750.0")]);
    survey.study("[test]", "[test]\nheight_per_depth = 0.1");
    run(&survey);
    assert_eq!(
        heights(&survey),
        [pair("1000.0", "0.0"), pair("3000.0", "0.0"), pair("3000.0", "300.0")],
        "100 m is less than half a cell, which is height 0"
    );
}

#[test]
fn matched_layers_resolve_the_same_length_at_each_depth() {
    let survey = Survey::new();
    // The shallow slice is finer than gravity, the deep one much smoother.
    survey.raster("rho_1000.tif", &Raster::of(&|row, col| resistivity(5 * row, 5 * col)));
    survey.raster(
        "rho_3000.tif",
        &Raster::of(&|row, col| {
            let wave = |turn: f64| (0.05 * (row as f64 * turn.sin() + col as f64 * turn.cos()) + turn).cos();
            10f64.powf(2.0 + 0.3 * (0..9).map(|k| wave(2.4 * f64::from(k))).sum::<f64>())
        }),
    );
    survey.study("[test]", "[test]\nresolution = \"matched\"");
    run(&survey);
    let rows = table(&survey, "coincidence");
    let mut raised = 0;
    for row in &rows {
        let length = |name: &str| row[name].parse::<f64>().unwrap();
        let (subject, reference) = (length("subject_resolves_m"), length("reference_resolves_m"));
        assert!((subject / reference - 1.0).abs() < 0.001, "{} m: {subject} {reference}", row["depth_m"]);
        raised += usize::from(row["depth_m"] == "3000.0" && length("height_m") > 0.0);
    }
    assert!(raised > 0, "gravity is raised to the smooth slice");
    let layers = table(&survey, "layers");
    let smoothed: f64 = layers[0]["smoothed_by_m"].parse().unwrap();
    assert!(smoothed > 0.0, "the fine slice is smoothed");
    assert_eq!(layers[1]["smoothed_by_m"], "0.0", "the smooth one is not");
}
