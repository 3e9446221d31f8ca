//! Every filter against scipy.fft (tests/reference/make_transform_reference.py makes the expected values).

use std::path::PathBuf;

use ndarray::Array2;
use salband::field::{Direction, MagneticDirections, PreparedField, Regularisation};
use salband::grid::{Frame, Grid};

const PLACES: [(usize, usize); 7] = [(95, 108), (88, 102), (100, 113), (78, 122), (108, 85), (95, 92), (68, 72)];

struct Record {
    range: f64,
    values: Vec<f64>,
}

/// The record of a name: the two keys after it.
fn record(text: &str, name: &str) -> Record {
    let rest = text.split_once(&format!("\"name\": \"{name}\"")).unwrap().1;
    let after = |key: &str| rest.split_once(&format!("\"{key}\":")).unwrap().1;
    let range = after("range").split(',').next().unwrap().trim().parse().unwrap();
    let list = after("values").split_once('[').unwrap().1.split_once(']').unwrap().0;
    Record { range, values: list.split(',').map(|number| number.trim().parse().unwrap()).collect() }
}

#[test]
fn every_filter_is_that_of_scipy() {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/transform_reference.json");
    let text = std::fs::read_to_string(path).unwrap();
    // The layer of the script: a Laguerre polynomial times a Gaussian.
    let layer = Array2::from_shape_fn((193, 216), |(row, col)| {
        let u = ((row as f64 - 95.3).powi(2) + (col as f64 - 107.6).powi(2)) / 32.0;
        (u.powi(4) - 16.0 * u.powi(3) + 72.0 * u * u - 96.0 * u + 24.0) / 24.0 * (-u).exp()
    });
    let field = PreparedField::new(&Grid::new(Frame::local(50.0, 193, 216).unwrap(), layer).unwrap()).unwrap();
    let gradient = field.gradient(0.0).unwrap();
    let second = field.second_derivatives(0.0).unwrap();
    let directions =
        MagneticDirections::with_remanence(Direction::new(-55.0, 12.0).unwrap(), Direction::new(35.0, 140.0).unwrap());
    let values = |field: salband::Result<PreparedField>| field.unwrap().values().unwrap().into_values();
    // What is left is the plane and the padding, which scipy's side of the comparison does not have: next to nothing for
    // smoothing and derivatives, most for division by |k|, which favours the longest waves.
    let products = [
        ("upward 120", 1e-6, field.upward(120.0).unwrap().into_values()),
        ("downward 60 gain 30", 1e-6, values(field.downward(60.0, Regularisation::LargestGain(30.0)))),
        ("low-pass 900", 1e-12, values(field.low_pass(900.0))),
        ("band-pass 600 2000", 1e-12, values(field.band_pass(600.0, 2000.0))),
        ("east", 1e-6, gradient.east().clone()),
        ("north", 1e-6, gradient.north().clone()),
        ("down", 1e-6, gradient.down().clone()),
        ("east east", 1e-6, second.east_east().clone()),
        ("east north", 1e-6, second.east_north().clone()),
        ("east down", 1e-6, second.east_down().clone()),
        ("north north", 1e-6, second.north_north().clone()),
        ("north down", 1e-6, second.north_down().clone()),
        ("down down", 1e-6, second.down_down().clone()),
        ("pole", 1e-4, values(field.to_pole(directions))),
        ("equator", 1e-4, values(field.to_equator(directions))),
        ("magnetic-potential", 1e-3, values(field.to_magnetic_potential(directions.field))),
        ("potential-to-gravity", 1e-4, values(field.potential_to_gravity(directions.magnetisation, 2.5))),
        ("pseudo-gravity", 1e-3, values(field.to_pseudo_gravity(directions, 2.5))),
    ];
    assert_eq!(text.matches("\"name\"").count(), products.len());
    for (name, bound, product) in products {
        let expected = record(&text, name);
        for (place, expected_value) in PLACES.into_iter().zip(&expected.values) {
            let off = (product[place] - expected_value).abs() / expected.range;
            println!("{name} at {place:?}: {off:.1e}");
            assert!(off < bound, "{name} at {place:?}: {} for {expected_value}", product[place]);
        }
    }
}
