//! Bad input of every kind: the program exits with 2, prints exactly this message, and leaves no output behind.

mod common;

use common::{Raster, STUDY, Survey, gravity, resistivity, stderr};

/// What is wrong, how it comes about, and the message that must be printed.
struct Case {
    name: &'static str,
    spoil: fn(&Survey),
    message: &'static str,
}

fn cases() -> Vec<Case> {
    let case = |name, spoil, message| Case { name, spoil, message };
    vec![
        case("no study file", |s| std::fs::remove_file(s.path("study.toml")).unwrap(), ""),
        case("a study that is not TOML", |s| s.study("seed = 7", "seed = = 7"), ""),
        case("an unknown key", |s| s.study("seed = 7", "sead = 7"), ""),
        case("an unknown key deep down", |s| s.study("kind = \"gravity\"", "knd = \"gravity\""), ""),
        case("no title", |s| s.study("title = \"A small survey\"\n", ""), ""),
        case("an unknown quantity", |s| s.study("quantity = \"resistivity\"", "quantity = \"ohms\""), ""),
        case("an unknown kind", |s| s.study("kind = \"gravity\"", "kind = \"seismic\""), ""),
        case("magnetics without angles", |s| s.study("kind = \"gravity\"", "kind = \"magnetic\""), ""),
        case(
            "magnetics near the equator",
            |s| s.study("kind = \"gravity\"", "kind = \"magnetic\"\ninclination = 4.0\ndeclination = 1.0"),
            "",
        ),
        case(
            "the same name twice",
            |s| s.study("[test]", "[[potential]]\nname = \"gravity\"\npath = \"gravity.tif\"\n\n[test]"),
            "",
        ),
        case("the same depth twice", |s| s.study("depth = 3000.0", "depth = 1000.0"), ""),
        case("a quantile of 80", |s| s.study("quantile = 0.80", "quantile = 80.0"), ""),
        case("a negative distance", |s| s.study("within = [500.0, 1500.0]", "within = [500.0, -1500.0]"), ""),
        case("a level of five", |s| s.study("within = [500.0, 1500.0]", "family = 5.0"), ""),
        case(
            "a control",
            |s| s.file("study.toml", &format!("{STUDY}\n[[control]]\nname = \"c\"\npath = \"c.tif\"\n")),
            "",
        ),
        case(
            "no reference",
            |s| {
                let start = STUDY.find("[[potential]]").unwrap();
                let end = STUDY.find("[test]").unwrap();
                s.file("study.toml", &format!("{}{}", &STUDY[..start], &STUDY[end..]));
            },
            "",
        ),
        case("a missing raster", |s| std::fs::remove_file(s.path("rho_3000.tif")).unwrap(), ""),
        case("not a raster", |s| s.file("rho_3000.tif", "resistivity in words"), ""),
        case("an empty file", |s| s.file("gravity.tif", ""), ""),
        case(
            "a truncated GeoTIFF",
            |s| {
                let bytes = std::fs::read(s.path("gravity.tif")).unwrap();
                std::fs::write(s.path("gravity.tif"), &bytes[..bytes.len() / 2]).unwrap();
            },
            "",
        ),
        case(
            "a raster without a system",
            |s| s.raster("gravity.tif", &Raster { crs: None, ..Raster::of(&gravity) }),
            "",
        ),
        case("a frame in degrees", |s| s.study("EPSG:32633", "EPSG:4326"), ""),
        case("a frame in feet", |s| s.study("EPSG:32633", "EPSG:2263"), ""),
        case("a frame of nowhere", |s| s.study("EPSG:32633", "EPSG:99999999"), ""),
        case("a cell of nothing", |s| s.study("cell = 500.0", "cell = 0.0"), ""),
        case("a frame of too many cells", |s| s.study("cell = 500.0", "cell = 0.001"), ""),
        case(
            "disjoint extents",
            |s| s.raster("gravity.tif", &Raster { origin: (900_000.0, 5_600_000.0), ..Raster::of(&gravity) }),
            "",
        ),
        case("a constant gravity grid", |s| s.raster("gravity.tif", &Raster::of(&|_, _| 3.5)), ""),
        case("a constant slice", |s| s.raster("rho_1000.tif", &Raster::of(&|_, _| 100.0)), ""),
        case("nothing but no data", |s| s.raster("rho_1000.tif", &Raster::of(&|_, _| -9999.0)), ""),
        case(
            "infinite values",
            |s| {
                s.raster(
                    "gravity.tif",
                    &Raster::of(&|row, col| if row == col { f64::INFINITY } else { gravity(row, col) }),
                )
            },
            "",
        ),
        case(
            "negative resistivity",
            |s| s.raster("rho_1000.tif", &Raster::of(&|row, col| if row == 3 { -5.0 } else { resistivity(row, col) })),
            "",
        ),
        case(
            "resistivity called a logarithm",
            |s| s.study("quantity = \"resistivity\"", "quantity = \"log10-resistivity\""),
            "",
        ),
        case("no conductor below the threshold", |s| s.study("quantile = 0.80", "below = 0.001"), ""),
        case("no body of the least area", |s| s.study("quantile = 0.80", "quantile = 0.80, least_area = 1e12"), ""),
        case("a band that is not there", |s| s.study("path = \"gravity.tif\"", "path = \"gravity.tif\"\nband = 2"), ""),
        case(
            "a header of too many cells",
            |s| {
                let header = "ncols 40000\nnrows 40000\nxllcorner 500000\nyllcorner 5560000\ncellsize 1\n1 2 3\n";
                s.file("gravity.asc", header);
                s.study("path = \"gravity.tif\"", "path = \"gravity.asc\"\ncrs = \"EPSG:32633\"");
            },
            "",
        ),
        case(
            "deposits without the columns",
            |s| {
                s.file("deposits.csv", "site,lon,lat\nA,15.1,50.5\n");
                s.study("[test]", "[deposits]\npath = \"deposits.csv\"\n\n[test]");
            },
            "",
        ),
        case(
            "a deposit at no number",
            |s| {
                s.file("deposits.csv", "name,longitude,latitude\nA,15.1,50.5\nB,east,50.5\n");
                s.study("[test]", "[deposits]\npath = \"deposits.csv\"\n\n[test]");
            },
            "",
        ),
        case(
            "lines that are no lines",
            |s| {
                s.file("faults.geojson", "{\"type\": \"FeatureCollection\"");
                s.study("[test]", "[[lines]]\nname = \"faults\"\npath = \"faults.geojson\"\n\n[test]");
            },
            "",
        ),
    ]
}

/// GDAL's own words change with its version, so they are not compared.
fn without_gdal(message: &str) -> String {
    let Some((before, rest)) = message.split_once(" (GDAL: ") else { return message.to_string() };
    let end = rest.find("). To mend").or_else(|| rest.rfind(").")).unwrap();
    format!("{before}{}", &rest[end + 1..])
}

#[test]
fn each_bad_input_is_refused_in_words() {
    let mut wrong = Vec::new();
    let cases = cases();
    for case in &cases {
        let survey = Survey::new();
        (case.spoil)(&survey);
        let output = survey.salband(&["run", "study.toml", "--out", "out"]);
        let message = without_gdal(&stderr(&output));
        let left: Vec<_> = std::fs::read_dir(survey.path("")).unwrap().filter_map(Result::ok).collect();
        let left = left.iter().filter(|entry| entry.file_name().to_string_lossy().contains("out")).count();
        if output.status.code() != Some(2) || message.trim_end() != case.message || left > 0 {
            wrong.push(format!(
                "{}: exit {:?}, {left} left\n  {}",
                case.name,
                output.status.code(),
                message.trim_end()
            ));
        }
    }
    assert!(wrong.is_empty(), "{} of {} cases:\n{}", wrong.len(), cases.len(), wrong.join("\n"));
}

#[test]
fn an_output_that_cannot_be_written_is_refused_before_any_work() {
    let survey = Survey::new();
    survey.file("taken", "a file");
    std::fs::create_dir(survey.path("other")).unwrap();
    std::fs::write(survey.path("other/precious.txt"), "keep me").unwrap();
    let run = |out: &str, more: &[&str]| {
        let output = survey.salband(&[&["run", "study.toml", "--out", out], more].concat());
        (output.status.code(), stderr(&output).trim_end().to_string())
    };
    let refused = |out: &str, more: &[&str], message: &str| assert_eq!(run(out, more), (Some(2), message.to_string()));
    refused("taken", &[], "X1");
    refused("taken/below", &[], "X2");
    refused("other", &[], "X3");
    refused("other", &["--replace"], "X4");
    refused("/proc/out", &[], "X5");
    assert_eq!(std::fs::read_to_string(survey.path("other/precious.txt")).unwrap(), "keep me");
    assert_eq!(run("out", &[]).0, Some(0));
    refused("out", &[], "X6");
    assert_eq!(run("out", &["--replace"]).0, Some(0), "what salband wrote it may replace");
    refused("out2", &["--threads", "0"], "X7");
}

#[test]
fn the_survey_itself_runs() {
    let survey = Survey::new();
    let output = survey.salband(&["run", "study.toml", "--out", "out"]);
    assert_eq!(output.status.code(), Some(0), "{}", stderr(&output));
    assert!(survey.path("out/report.html").exists());
}
