//! Derivatives of the gravity of an invented point mass, beside their closed forms.

use ndarray::Array2;
use salband::Result;
use salband::field::PreparedField;
use salband::grid::{Frame, Grid};

const DEPTH: f64 = 1500.0;

/// Gravity 1e9 z / r^3 (any unit) of a mass 1,500 m under the place (10,000, 10,000).
fn gravity(x: f64, y: f64) -> f64 {
    1e9 * DEPTH / ((x - 10_000.0).powi(2) + (y - 10_000.0).powi(2) + DEPTH * DEPTH).powf(1.5)
}

fn main() -> Result<()> {
    let frame = Frame::local(200.0, 100, 100)?;
    let values = Array2::from_shape_fn(frame.shape(), |(row, col)| {
        let (x, y) = frame.position(row as f64, col as f64);
        gravity(x, y)
    });
    let field = PreparedField::new(&Grid::new(frame.clone(), values)?)?;
    let gradient = field.gradient(0.0)?;
    let second = field.second_derivatives(0.0)?;

    // One cell, 1,900 m east and 100 m south of the mass; all closed forms follow from r.
    let (row, col) = (50, 59);
    let (east, north) = frame.position(row as f64, col as f64);
    let (x, y) = (east - 10_000.0, north - 10_000.0);
    let r = (x * x + y * y + DEPTH * DEPTH).sqrt();
    println!("derivative                found      closed form");
    let show = |name: &str, found: f64, exact: f64| println!("{name:<20} {found:>12.4e} {exact:>12.4e}");
    show("east", gradient.east()[[row, col]], -3e9 * DEPTH * x / r.powi(5));
    show("north", gradient.north()[[row, col]], -3e9 * DEPTH * y / r.powi(5));
    show("down", gradient.down()[[row, col]], 1e9 * (3.0 * DEPTH * DEPTH - r * r) / r.powi(5));
    show("east east", second.east_east()[[row, col]], 3e9 * DEPTH * (5.0 * x * x - r * r) / r.powi(7));
    show("east north", second.east_north()[[row, col]], 15e9 * DEPTH * x * y / r.powi(7));
    let down = 3e9 * DEPTH * (5.0 * DEPTH * DEPTH - 3.0 * r * r) / r.powi(7);
    show("down down", second.down_down()[[row, col]], down);
    show("laplacian", second.laplacian()[[row, col]], 0.0);
    Ok(())
}
