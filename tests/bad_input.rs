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
        case(
            "no study file",
            |s| std::fs::remove_file(s.path("study.toml")).unwrap(),
            "salband: study.toml: the study file: found nothing at this path; wanted a readable TOML file. To mend it: check the path, or make one with: salband new.",
        ),
        case(
            "a study that is not TOML",
            |s| s.study("seed = 7", "seed = = 7"),
            "salband: study.toml, line 2: the study file: found extra `=`, expected nothing; wanted a valid value here. To mend it: mend this line; texts stand in quotes, numbers do not.",
        ),
        case(
            "an unknown key",
            |s| s.study("seed = 7", "sead = 7"),
            "salband: study.toml, line 2: a key: found \"sead\", which is not known here; wanted one of: title, seed, frame, conductivity, potential, lines, units, control, deposits, test. To mend it: if you meant \"seed\", write that; otherwise take the key out.",
        ),
        case(
            "an unknown key deep down",
            |s| s.study("kind = \"gravity\"", "knd = \"gravity\""),
            "salband: study.toml, line 16: a key: found \"knd\", which is not known here; wanted one of: name, path, kind, band, variable, crs, heights, inclination, declination, year, magnetisation, noise, contacts. To mend it: if you meant \"kind\", write that; otherwise take the key out.",
        ),
        case(
            "no title",
            |s| s.study("title = \"A small survey\"\n", ""),
            "salband: study.toml, line 1: a key: found no \"title\"; wanted it, since it has no default. To mend it: add a line title = ... here.",
        ),
        case(
            "an unknown quantity",
            |s| s.study("quantity = \"resistivity\"", "quantity = \"ohms\""),
            "salband: study.toml, line 6: conductivity.quantity: found \"ohms\"; wanted one of: resistivity, conductivity, log10-resistivity, log10-conductivity.",
        ),
        case(
            "an unknown kind",
            |s| s.study("kind = \"gravity\"", "kind = \"seismic\""),
            "salband: study.toml, line 16: kind: found \"seismic\"; wanted one of: gravity, magnetic, other.",
        ),
        case(
            "magnetics without angles",
            |s| s.study("kind = \"gravity\"", "kind = \"magnetic\""),
            "salband: study.toml, line 14: potential \"gravity\": found no inclination; wanted inclination and declination in degrees, or the year of the survey, since contacts are picked on pseudo-gravity. To mend it: add inclination = ... and declination = ..., or year = ... such as 2012.5.",
        ),
        case(
            "an inclination beyond the vertical",
            |s| s.study("kind = \"gravity\"", "kind = \"magnetic\"\ninclination = 94.0\ndeclination = 1.0"),
            "salband: study.toml, line 17: inclination: found 94; wanted degrees from -90 to 90.",
        ),
        case(
            "a direction given twice",
            |s| {
                s.study(
                    "kind = \"gravity\"",
                    "kind = \"magnetic\"\ninclination = 60.0\ndeclination = 1.0\nyear = 2012.0",
                )
            },
            "salband: study.toml, line 14: potential \"gravity\": found year beside inclination or declination; wanted inclination and declination in degrees, or the year of the survey, since contacts are picked on pseudo-gravity. To mend it: keep one of the two.",
        ),
        case(
            "a year that the reference model does not cover",
            |s| s.study("kind = \"gravity\"", "kind = \"magnetic\"\nyear = 2031.5"),
            "salband: study.toml, line 17: year: found 2031.5; wanted a year from 1900 to 2025, which IGRF-13 covers. To mend it: give inclination and declination from a model that covers the survey.",
        ),
        case(
            "a magnetisation in gravity",
            |s| s.study("kind = \"gravity\"", "magnetisation = { inclination = 10.0, declination = 2.0 }"),
            "salband: study.toml, line 16: magnetisation: found it in a field of kind \"gravity\"; wanted it in a magnetic field only. To mend it: take it out, or set kind = \"magnetic\".",
        ),
        case(
            "a noise below zero",
            |s| s.study("kind = \"gravity\"", "noise = -0.1"),
            "salband: study.toml, line 16: noise: found -0.1; wanted a positive number of the field's unit.",
        ),
        case(
            "a significance of one",
            |s| s.study("kind = \"gravity\"", "contacts = { significance = 1.0 }"),
            "salband: study.toml, line 16: contacts.significance: found 1; wanted a number above 0 and at most 0.5: the chance that noise alone gives a layer any contact.",
        ),
        case(
            "no height in the list",
            |s| s.study("kind = \"gravity\"", "heights = []"),
            "salband: study.toml: heights: found an empty list; wanted at least one height in metres. To mend it: take the key out to have heights tied to the depths of the slices.",
        ),
        case(
            "a height beyond the frame",
            |s| s.study("kind = \"gravity\"", "heights = [0.0, 50000.0]"),
            "salband: study.toml: heights of potential \"gravity\": found 50000 m; wanted at most the frame's longer side, 40000 m: nothing of the field is left higher up. To mend it: check that heights are in metres.",
        ),
        case(
            "heights beside matching",
            |s| {
                let text = STUDY.replace("kind = \"gravity\"", "heights = [0.0]");
                s.file("study.toml", &text.replace("[test]", "[test]\nresolution = \"matched\""));
            },
            "salband: study.toml: potential \"gravity\": found heights beside test.resolution = \"matched\"; wanted one of them, since matching finds the height of each slice. To mend it: take heights out, or write resolution = \"as-is\".",
        ),
        case(
            "an unknown way with resolution",
            |s| s.study("[test]", "[test]\nresolution = \"equal\""),
            "salband: study.toml, line 19: test.resolution: found \"equal\"; wanted one of: as-is, matched.",
        ),
        case(
            "a height that does not grow with depth",
            |s| s.study("[test]", "[test]\nheight_per_depth = 0.0"),
            "salband: study.toml, line 19: test.height_per_depth: found 0; wanted a positive number of metres up for a metre of depth.",
        ),
        case(
            "lines called as contacts are",
            |s| s.study("[test]", "[[lines]]\nname = \"gravity_0\"\npath = \"f.geojson\"\n\n[test]"),
            "salband: study.toml, line 19: a name: found \"gravity_0\", which bodies or contacts of a field are called; wanted a name of its own, since it stands in tables and file names. To mend it: give it another name.",
        ),
        case(
            "units that are moved beside matching",
            |s| {
                let units = "[[units]]\nname = \"suite\"\npath = \"s.geojson\"\nrole = \"subject\"\n\n[test]\nresolution = \"matched\"";
                s.study("[test]", units);
            },
            "salband: study.toml: units \"suite\": found units that are moved beside test.resolution = \"matched\"; wanted one of them, since matched fields belong to slices and units to none. To mend it: write resolution = \"as-is\", or test the units in a study of their own.",
        ),
        case(
            "a vector file that is not there",
            |s| s.study("[test]", "[[lines]]\nname = \"faults\"\npath = \"f.geojson\"\n\n[test]"),
            "salband: f.geojson: the file: found nothing at this path; wanted a vector file with lines. To mend it: check the path; a relative one starts at the folder of the study file.",
        ),
        case(
            "units with an unknown role",
            |s| s.study("[test]", "[[units]]\nname = \"suite\"\npath = \"suite.geojson\"\nrole = \"target\"\n\n[test]"),
            "salband: study.toml, line 21: role: found \"target\"; wanted one of: reference, subject.",
        ),
        case(
            "a filter that keeps nothing and leaves nothing out",
            |s| {
                s.study(
                    "[test]",
                    "[[lines]]\nname = \"faults\"\npath = \"f.geojson\"\nkeep = { column = \"kind\" }\n\n[test]",
                )
            },
            "salband: study.toml, line 21: keep: found neither is nor not; wanted values to keep or to leave out. To mend it: write keep = { column = \"...\", is = [\"...\"] }.",
        ),
        case(
            "units from a file of lines",
            |s| {
                let line = "{\"type\": \"LineString\", \"coordinates\": [[15.1, 50.5], [15.2, 50.4]]}";
                s.file(
                    "suite.geojson",
                    &format!("{{\"type\": \"Feature\", \"properties\": {{}}, \"geometry\": {line}}}"),
                );
                s.study("[test]", "[[units]]\nname = \"suite\"\npath = \"suite.geojson\"\n\n[test]");
            },
            "salband: suite.geojson: the layer: found lines and no polygon; wanted polygons. To mend it: name the file under [[lines]] instead, or choose another layer.",
        ),
        case(
            "the same name twice",
            |s| s.study("[test]", "[[potential]]\nname = \"gravity\"\npath = \"gravity.tif\"\n\n[test]"),
            "salband: study.toml, line 19: a name: found \"gravity\" a second time; wanted names that differ in more than signs, since they stand in file names. To mend it: give one of them another name.",
        ),
        case(
            "the same depth twice",
            |s| s.study("depth = 3000.0", "depth = 1000.0"),
            "salband: study.toml, line 9: depth: found 1000 m a second time; wanted each depth once. To mend it: leave one of the two slices out.",
        ),
        case(
            "a quantile of 80",
            |s| s.study("quantile = 0.80", "quantile = 80.0"),
            "salband: study.toml, line 11: conductivity.conductors.quantile: found 80; wanted a number above 0 and below 1, counted from the most resistive cell.",
        ),
        case(
            "a negative distance",
            |s| s.study("within = [500.0, 1500.0]", "within = [500.0, -1500.0]"),
            "salband: study.toml, line 19: test.within: found -1500; wanted a positive number of metres.",
        ),
        case(
            "a level of five",
            |s| s.study("within = [500.0, 1500.0]", "family = 5.0"),
            "salband: study.toml, line 19: test.family: found 5; wanted a level from 0.005, the smallest that displacement resolves, to below 1, such as 0.05.",
        ),
        case(
            "distances in kilometres",
            |s| s.study("within = [500.0, 1500.0]", "within = [0.1, 0.5]"),
            "salband: study.toml: test.within: found 0.1 m, less than half a cell of 500 m; wanted distances in metres that the cells can show. To mend it: check that the distances are in metres, or choose a smaller frame.cell.",
        ),
        case(
            "a frame on a web map",
            |s| s.study("EPSG:32633", "EPSG:3857"),
            "salband: study.toml: the frame's coordinate system: found EPSG:3857, in which a metre is 0.638 m on the ground here; wanted a system made for the area, in which a metre is a metre. To mend it: set frame.crs to one, such as the UTM zone.",
        ),
        case(
            "a starting half-space",
            |s| s.raster("rho_3000.tif", &Raster::of(&|row, col| if row < 4 { resistivity(row, col) } else { 100.0 })),
            "salband: rho_3000.tif: the conductors of a slice: found 96 % of the cells at or beyond the 0.8 quantile, because many hold its value, 100.0000 ohm m; wanted about 20 %. To mend it: set a limit in ohm m instead: { below = ... }.",
        ),
        case(
            "a seed too large",
            |s| s.study("seed = 7", "seed = 9223372036854775808"),
            "salband: study.toml, line 2: seed: found 9223372036854775808; wanted a whole number from 0 to 9223372036854775807.",
        ),
        case(
            "a control",
            |s| s.file("study.toml", &format!("{STUDY}\n[[control]]\nname = \"c\"\npath = \"c.tif\"\n")),
            "salband: study.toml, line 21: [[control]]: found a layer to take out; wanted none, since this version cannot take controls out and would answer as if they were not there. To mend it: take [[control]] out and read the answer with the cautions on the page.",
        ),
        case(
            "no reference",
            |s| {
                let start = STUDY.find("[[potential]]").unwrap();
                let end = STUDY.find("[test]").unwrap();
                s.file("study.toml", &format!("{}{}", &STUDY[..start], &STUDY[end..]));
            },
            "salband: study.toml: the study: found no [[potential]], no [[lines]] and no [[units]] that stay; wanted at least one reference to test the conductors against. To mend it: add a [[potential]] with name and path.",
        ),
        case(
            "a missing raster",
            |s| std::fs::remove_file(s.path("rho_3000.tif")).unwrap(),
            "salband: rho_3000.tif: the file: found nothing at this path; wanted a raster file. To mend it: check the path; a relative one starts at the folder of the study file.",
        ),
        case(
            "not a raster",
            |s| s.file("rho_3000.tif", "resistivity in words"),
            "salband: rho_3000.tif: the file: found something that GDAL cannot open as a raster; wanted a raster such as GeoTIFF, ESRI ASCII grid, VRT or NetCDF. To mend it: check that the file is whole and of a raster format.",
        ),
        case(
            "an empty file",
            |s| s.file("gravity.tif", ""),
            "salband: gravity.tif: the file: found something that GDAL cannot open as a raster; wanted a raster such as GeoTIFF, ESRI ASCII grid, VRT or NetCDF. To mend it: check that the file is whole and of a raster format.",
        ),
        case(
            "a truncated GeoTIFF",
            |s| {
                let bytes = std::fs::read(s.path("gravity.tif")).unwrap();
                std::fs::write(s.path("gravity.tif"), &bytes[..bytes.len() / 2]).unwrap();
            },
            "salband: gravity.tif: reading band 1: found data that cannot be read; wanted a whole file. To mend it: copy or write the file again; it may be cut short.",
        ),
        case(
            "a raster without a system",
            |s| s.raster("gravity.tif", &Raster { crs: None, ..Raster::of(&gravity) }),
            "salband: gravity.tif: the coordinate system: found none in the file; wanted one that places the grid on the earth. To mend it: state crs = \"EPSG:...\" beside the path in the study, if you know it.",
        ),
        case(
            "a frame in degrees",
            |s| s.study("EPSG:32633", "EPSG:4326"),
            "salband: study.toml: the frame's coordinate system: found EPSG:4326, which is in degrees; wanted a projected system in metres, because distances and derivatives are taken on the frame. To mend it: set frame.crs to a projected system that suits the area, such as its UTM zone.",
        ),
        case(
            "a frame in feet",
            |s| s.study("EPSG:32633", "EPSG:2263"),
            "salband: study.toml: the frame's coordinate system: found EPSG:2263, whose unit is 0.30480060960121924 m; wanted a projected system in metres. To mend it: set frame.crs to a metric system; layers in other units are placed onto it.",
        ),
        case(
            "a frame of nowhere",
            |s| s.study("EPSG:32633", "EPSG:99999999"),
            "salband: study.toml: the coordinate system: found \"EPSG:99999999\", which is not understood; wanted a code such as EPSG:32633, WKT or a PROJ string. To mend it: check the code.",
        ),
        case(
            "a cell of nothing",
            |s| s.study("cell = 500.0", "cell = 0.0"),
            "salband: study.toml, line 3: frame.cell: found 0; wanted a positive number of metres.",
        ),
        case(
            "a frame of too many cells",
            |s| s.study("cell = 500.0", "cell = 0.001"),
            "salband: study.toml: the frame's shape: found 40000000 rows x 40000000 columns; wanted at most 268435456 cells. To mend it: choose a larger frame.cell.",
        ),
        case(
            "disjoint extents",
            |s| s.raster("gravity.tif", &Raster { origin: (900_000.0, 5_600_000.0), ..Raster::of(&gravity) }),
            "salband: gravity.tif: the extent: found 900000 to 940000 east, 5560000 to 5600000 north in EPSG:32633; wanted some overlap with the conductivity model at 500000 to 540000 east, 5560000 to 5600000 north. To mend it: check the coordinate systems of both, or leave the layer out.",
        ),
        case(
            "a constant gravity grid",
            |s| s.raster("gravity.tif", &Raster::of(&|_, _| 3.5)),
            "salband: gravity.tif: the potential field \"gravity\": found the value 3.5 in every cell that the frame covers; wanted a layer that varies. To mend it: check the file and the band.",
        ),
        case(
            "a constant slice",
            |s| s.raster("rho_1000.tif", &Raster::of(&|_, _| 100.0)),
            "salband: rho_1000.tif: the slice at 1000 m, in log10 ohm m: found the value 2 in every cell that the frame covers; wanted a layer that varies. To mend it: check the file and the band.",
        ),
        case(
            "nothing but no data",
            |s| s.raster("rho_1000.tif", &Raster::of(&|_, _| -9999.0)),
            "salband: rho_1000.tif: band 1: found no data in any cell that the frame covers; wanted numbers. To mend it: check the no-data value and the extent.",
        ),
        case(
            "infinite values",
            |s| {
                s.raster(
                    "gravity.tif",
                    &Raster::of(&|row, col| if row == col { f64::INFINITY } else { gravity(row, col) }),
                )
            },
            "salband: gravity.tif: band 1: found 80 infinite values; wanted finite numbers, or no data. To mend it: mark those cells as no data.",
        ),
        case(
            "negative resistivity",
            |s| s.raster("rho_1000.tif", &Raster::of(&|row, col| if row == 3 { -5.0 } else { resistivity(row, col) })),
            "salband: rho_1000.tif: resistivity: found 80 cells such as -5; wanted positive values. To mend it: check conductivity.quantity: the values may be logarithms; or mark those cells as no data.",
        ),
        case(
            "resistivity called a logarithm",
            |s| s.study("quantity = \"resistivity\"", "quantity = \"log10-resistivity\""),
            "salband: rho_1000.tif: log10-resistivity: found 6361 cells such as 25.074795265918222; wanted logarithms between -12 and 12. To mend it: check conductivity.quantity: the values may not be logarithms; or mark those cells as no data.",
        ),
        case(
            "no conductor below the threshold",
            |s| s.study("quantile = 0.80", "below = 0.001"),
            "salband: study.toml: the conductors: found no cell of any slice beyond the threshold in a body of the least area; wanted at least one conductor. To mend it: check conductivity.quantity, or change the threshold or least_area of conductors.",
        ),
        case(
            "no body of the least area",
            |s| s.study("quantile = 0.80", "quantile = 0.80, least_area = 1e12"),
            "salband: study.toml: the conductors: found no cell of any slice beyond the threshold in a body of the least area; wanted at least one conductor. To mend it: check conductivity.quantity, or change the threshold or least_area of conductors.",
        ),
        case(
            "a band that is not there",
            |s| s.study("path = \"gravity.tif\"", "path = \"gravity.tif\"\nband = 2"),
            "salband: gravity.tif: the band: found band 2 asked for, 1 in the file; wanted a band from 1 to 1. To mend it: set band.",
        ),
        case(
            "a header of too many cells",
            |s| {
                let header = "ncols 40000\nnrows 40000\nxllcorner 500000\nyllcorner 5560000\ncellsize 1\n1 2 3\n";
                s.file("gravity.asc", header);
                s.study("path = \"gravity.tif\"", "path = \"gravity.asc\"\ncrs = \"EPSG:32633\"");
            },
            "salband: gravity.asc: the raster's header: found 40000 x 40000 cells in each of 1 bands, claimed by a file of 76 bytes; wanted no more cells than the file could hold. To mend it: write the file again; its header is wrong or it is cut short.",
        ),
        case(
            "deposits without the columns",
            |s| {
                s.file("deposits.csv", "site,lon,lat\nA,15.1,50.5\n");
                s.study("[test]", "[deposits]\npath = \"deposits.csv\"\n\n[test]");
            },
            "salband: deposits.csv: the table's columns: found no \"longitude\" among site, lon, lat; wanted columns for x, y and name. To mend it: set deposits.columns = { x = \"...\", y = \"...\", name = \"...\" }.",
        ),
        case(
            "a deposit at no number",
            |s| {
                s.file("deposits.csv", "name,longitude,latitude\nA,15.1,50.5\nB,east,50.5\n");
                s.study("[test]", "[deposits]\npath = \"deposits.csv\"\n\n[test]");
            },
            "salband: deposits.csv, line 3: column \"longitude\": found \"east\"; wanted a number.",
        ),
        case(
            "lines that are no lines",
            |s| {
                s.file("faults.geojson", "{\"type\": \"FeatureCollection\"");
                s.study("[test]", "[[lines]]\nname = \"faults\"\npath = \"faults.geojson\"\n\n[test]");
            },
            "salband: faults.geojson: the file: found something that GDAL cannot open as a vector file; wanted lines in GeoPackage, GeoJSON, shapefile or the like. To mend it: check that the file is whole.",
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
    refused(
        "taken",
        &[],
        "salband: taken: the output folder: found a file; wanted a folder, or nothing yet. To mend it: choose another --out.",
    );
    refused(
        "taken/below",
        &[],
        "salband: taken: the parent of the output folder cannot be written (File exists (os error 17)). To mend it: choose another --out, or change the permissions of its parent.",
    );
    refused(
        "other",
        &[],
        "salband: other: the output folder already exists. To mend it: choose another --out, or add --replace to put the new results in its place.",
    );
    refused(
        "other",
        &["--replace"],
        "salband: other: the output folder: found a folder without provenance.json, so not one that salband wrote; wanted an earlier output folder to replace. To mend it: choose another --out, or remove the folder yourself.",
    );
    refused(
        "/proc/out",
        &[],
        "salband: /proc: the parent of the output folder cannot be written (No such file or directory (os error 2)). To mend it: choose another --out, or change the permissions of its parent.",
    );
    assert_eq!(std::fs::read_to_string(survey.path("other/precious.txt")).unwrap(), "keep me");
    assert_eq!(run("out", &[]).0, Some(0));
    refused(
        "out",
        &[],
        "salband: out: the output folder already exists. To mend it: choose another --out, or add --replace to put the new results in its place.",
    );
    assert_eq!(run("out", &["--replace"]).0, Some(0), "what salband wrote it may replace");
    refused("out2", &["--threads", "0"], "salband: --threads: found 0; wanted 1 or more.");
}

#[test]
fn the_survey_itself_runs() {
    let survey = Survey::new();
    let output = survey.salband(&["run", "study.toml", "--out", "out"]);
    assert_eq!(output.status.code(), Some(0), "{}", stderr(&output));
    assert!(survey.path("out/report.html").exists());
}
