//! Transforms against the exact fields of one prism (tests/data/fields/README.md).

use std::path::PathBuf;

use geo::{Distance, Euclidean, LineString, Point};
use ndarray::Array2;
use salband::contact::{ContactSettings, find_contacts};
use salband::field::{Direction, MagneticDirections, PreparedField};
use salband::grid::{Frame, Grid};

fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/fields")
}

/// A reader for ASCII grids, enough for these files.
fn read(name: &str) -> Grid {
    let text = std::fs::read_to_string(folder().join(format!("A_single_{name}.asc"))).unwrap();
    let (header, body): (Vec<&str>, Vec<&str>) =
        text.lines().partition(|line| line.trim_start().starts_with(|first: char| first.is_ascii_alphabetic()));
    let head = |key: &str| -> f64 {
        let line = header.iter().find(|line| line.to_lowercase().starts_with(key)).unwrap();
        line.split_whitespace().nth(1).unwrap().parse().unwrap()
    };
    let (rows, cols) = (head("nrows") as usize, head("ncols") as usize);
    let numbers: Vec<f64> =
        body.iter().flat_map(|line| line.split_whitespace()).map(|word| word.parse().unwrap()).collect();
    assert_eq!((rows, cols, numbers.len()), (128, 128, 128 * 128));
    Grid::new(
        Frame::local(head("cellsize"), rows, cols).unwrap(),
        Array2::from_shape_vec((rows, cols), numbers).unwrap(),
    )
    .unwrap()
}

/// Root mean square error over the interior, divided by the range of the exact answer; `levelled` takes out the mean first.
fn error(found: &Array2<f64>, exact: &Grid, levelled: bool) -> f64 {
    let (low, high) = exact.range().unwrap();
    let ring = exact.frame().cols / 10;
    let inner = ndarray::s![ring..exact.frame().rows - ring, ring..exact.frame().cols - ring];
    let difference = &found.slice(inner) - &exact.values().slice(inner);
    let mean = if levelled { difference.mean().unwrap() } else { 0.0 };
    difference.mapv(|value| (value - mean).powi(2)).mean().unwrap().sqrt() / (high - low)
}

/// The error of a plain transform, from plain_padding_error.json.
fn plain(record: &str) -> f64 {
    let text = std::fs::read_to_string(folder().join("plain_padding_error.json")).unwrap();
    let rest = text.split_once(&format!("\"{record}\"")).unwrap().1;
    let number = rest.split_once("\"rms_interior_rel_to_range\":").unwrap().1;
    number.split(',').next().unwrap().trim().parse().unwrap()
}

fn check(name: &str, found: &Array2<f64>, bound: f64) {
    let error = error(found, &read(name), false);
    println!("{name}: error {error:.3e}, bound {bound:.3e}");
    assert!(error <= bound, "{name}: {error:e} is over {bound:e}");
}

/// A check that also asks for at most half the error of a plain transform.
fn check_against_plain(name: &str, found: &Array2<f64>, bound: f64, record: &str) {
    check(name, found, bound);
    check(name, found, 0.5 * plain(record));
}

#[test]
fn gravity_is_far_better_than_a_plain_transform() {
    let field = PreparedField::new(&read("gz")).unwrap();
    let gradient = field.gradient(0.0).unwrap();
    check_against_plain("gz_up1000", field.upward(1000.0).unwrap().values(), 0.0024, "up1000_gz");
    check_against_plain("gzx", gradient.east(), 1e-4, "dx_gz");
    check_against_plain("gzy", gradient.north(), 1e-4, "dy_gz");
    check_against_plain("gzz", gradient.down(), 0.0031, "vd_gz");
    check("gzz_up1000", field.gradient(1000.0).unwrap().down(), 0.0031);
}

#[test]
fn edge_strengths_follow_the_exact_ones() {
    let gradient = PreparedField::new(&read("gz")).unwrap().gradient(0.0).unwrap();
    // Bounds: the error of the derivatives that each is made of; far from the body, where the field is weak, the angles
    // magnify it, hence a wider one for theta, and one for tilt where the gradient is not weak.
    check("hgm", &gradient.horizontal(), 1e-4);
    check("as3d", &gradient.total(), 0.0031);
    check("theta_cos", &gradient.theta(), 0.02);
    let (tilt, exact, total) = (gradient.tilt(), read("tilt_deg"), read("as3d"));
    let least = total.range().unwrap().1 / 100.0;
    let off = tilt.iter().zip(exact.values()).zip(total.values());
    let strong: Vec<f64> =
        off.filter(|(_, total)| **total > least).map(|((found, exact), _)| (found - exact).abs()).collect();
    let worst = strong.iter().copied().fold(0.0, f64::max);
    println!("tilt: off by at most {worst:.3} degrees in {} of {} cells", strong.len(), tilt.len());
    assert!(strong.len() > 4000 && worst < 2.0, "{worst} degrees in {} cells", strong.len());
}

#[test]
fn reduction_to_the_pole_is_far_better_than_a_plain_transform() {
    let inducing = MagneticDirections::induced(Direction::new(-60.0, 5.0).unwrap());
    let reduced = PreparedField::new(&read("tmi")).unwrap().to_pole(inducing).unwrap();
    check_against_plain("rtp", reduced.values().unwrap().values(), 0.0021, "rtp_from_tmi");
}

#[test]
fn pseudo_gravity_is_gravity_by_poissons_relation() {
    // Magnetisation = susceptibility x field / mu0; density contrast 300 kg/m3 (tests/data/fields/README.md).
    let magnetisation = 0.02 * 57_000e-9 / (4e-7 * std::f64::consts::PI);
    let inducing = MagneticDirections::induced(Direction::new(-60.0, 5.0).unwrap());
    let field = PreparedField::new(&read("tmi")).unwrap().to_pseudo_gravity(inducing, 300.0 / magnetisation).unwrap();
    let levelled = error(field.values().unwrap().values(), &read("gz"), true);
    let strength = error(&field.gradient(0.0).unwrap().horizontal(), &read("hgm"), false);
    println!("pseudo-gravity: error {levelled:.3e} after the level, hgm {strength:.3e}");
    // The level is not defined, and the longest waves are the least certain.
    assert!(levelled < 0.006 && strength < 0.003, "{levelled:e} {strength:e}");
}

#[test]
fn the_margin_of_the_prism_is_found() {
    let gradient = PreparedField::new(&read("gz")).unwrap().gradient(0.0).unwrap();
    let found = find_contacts(&gradient, &ContactSettings::new(0.6, 0.3, 2000.0).unwrap()).unwrap();
    assert_eq!(found.len(), 1);
    assert!(found[0].closed);
    assert_eq!(found[0].dense_side(), "inside");
    // The prism's outline (tests/data/fields/README.md). Over a body with steep sides the crest stands over the margin and
    // cuts its corners by less than the depth to the top, 800 m (Grauch & Cordell 1987, from memory).
    let corners = [(13e3, 14e3), (18e3, 14e3), (18e3, 19e3), (13e3, 19e3), (13e3, 14e3)];
    let outline = LineString::from(corners.to_vec());
    let mut off: Vec<f64> =
        found[0].line.0.iter().map(|place| Euclidean.distance(&Point::from(*place), &outline)).collect();
    off.sort_by(f64::total_cmp);
    assert!(off[off.len() / 2] < 125.0, "the middle one is {} m off, more than half a cell", off[off.len() / 2]);
    assert!(off[off.len() - 1] < 800.0, "{}", off[off.len() - 1]);
}
