//! Contacts of bodies whose gradient is known in closed form: place, length, strike and dense side.

use geo::{Coord, LineString};
use ndarray::Array2;
use salband::contact::{Contact, ContactSettings, find_contacts};
use salband::field::Gradient;
use salband::grid::Frame;

const CELL: f64 = 100.0;

/// The gradient of a field from its value's derivatives at (x, y) relative to the middle of the frame, m.
fn gradient(side: usize, of: impl Fn(f64, f64) -> (f64, f64)) -> Gradient {
    let frame = Frame::local(CELL, side, side).unwrap();
    let half = CELL * side as f64 / 2.0;
    let at = |(row, col): (usize, usize)| {
        let (x, y) = frame.position(row as f64, col as f64);
        of(x - half, y - half)
    };
    let east = Array2::from_shape_fn((side, side), |cell| at(cell).0);
    let north = Array2::from_shape_fn((side, side), |cell| at(cell).1);
    Gradient::new(frame, east, north, Array2::zeros((side, side))).unwrap()
}

fn contacts(gradient: &Gradient) -> Vec<Contact> {
    find_contacts(gradient, &ContactSettings::new(0.6, 0.3, 10.0 * CELL).unwrap()).unwrap()
}

/// dg/ds of a semi-infinite horizontal sheet whose edge lies at depth `z` under s = 0: g = 2 G sigma (pi/2 + atan(s/z)),
/// so dg/ds = 2 G sigma z / (s^2 + z^2), largest over the edge. Source: Telford, Geldart & Sheriff (1990), Applied
/// Geophysics, section 2.7 (from memory); scaled to 1 over the edge.
fn sheet_edge(s: f64, z: f64) -> f64 {
    z * z / (s * s + z * z)
}

fn axial_difference(a: f64, b: f64) -> f64 {
    let turn = (a - b).rem_euclid(180.0);
    turn.min(180.0 - turn)
}

#[test]
fn a_straight_edge_is_placed_at_every_strike() {
    let (mut worst_place, mut worst_bias, mut worst_strike) = (0.0_f64, 0.0_f64, 0.0_f64);
    for strike in (0..180).step_by(5).map(f64::from) {
        for offset in [0.0, 0.23 * CELL, 0.5 * CELL] {
            let (sin, cos) = strike.to_radians().sin_cos();
            // The normal (cos, -sin) points to the right of the strike: the dense side.
            let field = gradient(80, |x, y| {
                let rise = sheet_edge(x * cos - y * sin - offset, 300.0);
                (rise * cos, -rise * sin)
            });
            let found = contacts(&field);
            assert_eq!(found.len(), 1, "strike {strike}, offset {offset}");
            let contact = &found[0];
            let half = 40.0 * CELL;
            let off: Vec<f64> =
                contact.line.0.iter().map(|at| ((at.x - half) * cos - (at.y - half) * sin - offset) / CELL).collect();
            worst_place = off.iter().fold(worst_place, |worst, value| worst.max(value.abs()));
            worst_bias = worst_bias.max((off.iter().sum::<f64>() / off.len() as f64).abs());
            worst_strike = worst_strike.max(axial_difference(contact.strike_deg, strike));
            // The chord of the window of crest cells: at least a side less a few cells, at most its diagonal.
            let chord = 78.0 * CELL / sin.abs().max(cos.abs());
            assert!((contact.length_m / chord - 1.0).abs() < 0.05, "strike {strike}: {} {chord}", contact.length_m);
            let turn = (contact.dense_side_deg - strike - 90.0).rem_euclid(360.0);
            assert!(turn.min(360.0 - turn) < 1.0, "strike {strike}: dense side {}", contact.dense_side_deg);
            // The line runs with the dense side on its right, that is along the strike itself.
            let run = contact.line.0[contact.line.0.len() - 1] - contact.line.0[0];
            assert!(run.x * sin + run.y * cos > 0.0, "strike {strike}");
            assert!((contact.mean_strength - 1.0).abs() < 0.02);
        }
    }
    println!("worst place {worst_place:.4}, bias {worst_bias:.4} cells, strike {worst_strike:.4} degrees");
    assert!(worst_place < 0.1 && worst_bias < 0.05 && worst_strike < 0.2);
}

/// A field that rises inward across an ellipse with half axes a and b (m) at strike `strike` of the long axis: its gradient
/// magnitude has its crest on the ellipse.
fn ellipse(a: f64, b: f64, strike: f64, inward: f64) -> Gradient {
    let (sin, cos) = strike.to_radians().sin_cos();
    gradient(120, move |x, y| {
        let (u, v) = (x * sin + y * cos, x * cos - y * sin);
        let radius = ((u / a).powi(2) + (v / b).powi(2)).sqrt().max(1e-9);
        // d(radius)/d(u, v), turned into a unit normal so that the crest follows the ellipse.
        let (nu, nv) = (u / (a * a * radius), v / (b * b * radius));
        let steep = nu.hypot(nv).max(1e-12);
        let rise = -inward * sheet_edge((radius - 1.0) / steep, 300.0) / steep;
        let (du, dv) = (rise * nu, rise * nv);
        (du * sin + dv * cos, du * cos - dv * sin)
    })
}

/// Ramanujan's second approximation to the perimeter of an ellipse (1914, from memory), good to 1e-7 at these shapes.
fn perimeter(a: f64, b: f64) -> f64 {
    let h = ((a - b) / (a + b)).powi(2);
    std::f64::consts::PI * (a + b) * (1.0 + 3.0 * h / (10.0 + (4.0 - 3.0 * h).sqrt()))
}

#[test]
fn circles_and_ellipses_have_their_length() {
    let mut worst = 0.0_f64;
    for (a, b) in [(3000.0, 3000.0), (1500.0, 1500.0), (4500.0, 2500.0), (4000.0, 1800.0)] {
        for strike in [0.0, 17.0, 45.0, 80.0, 130.0] {
            for (inward, side) in [(1.0, "inside"), (-1.0, "outside")] {
                let found = contacts(&ellipse(a, b, strike, inward));
                let contact = &found[0];
                assert!(contact.closed, "{a} {b} {strike}");
                assert_eq!(contact.dense_side(), side);
                assert!(contact.dense_side_deg.is_nan());
                assert_eq!(contact.line.0.first(), contact.line.0.last());
                worst = worst.max((contact.length_m / perimeter(a, b) - 1.0).abs());
                if a > 1.5 * b {
                    let turn = axial_difference(contact.strike_deg, strike);
                    assert!(turn < 1.0, "{a} {b} {strike}: {}", contact.strike_deg);
                }
            }
        }
    }
    println!("worst length off by {:.3} %", 100.0 * worst);
    assert!(worst < 0.02, "{worst}");
}

#[test]
fn the_same_field_gives_the_same_lines() {
    let field = ellipse(4500.0, 2500.0, 33.0, 1.0);
    let pool = rayon::ThreadPoolBuilder::new().num_threads(1).build().unwrap();
    let lines = |found: Vec<Contact>| found.into_iter().map(|contact| contact.line).collect::<Vec<LineString<f64>>>();
    let first: Vec<Coord<f64>> = lines(contacts(&field)).into_iter().flat_map(|line| line.0).collect();
    let second: Vec<Coord<f64>> =
        lines(pool.install(|| contacts(&field))).into_iter().flat_map(|line| line.0).collect();
    assert!(first.len() > 100);
    assert_eq!(first, second);
}
