//! An invented body on an invented regional: what a polynomial of each degree leaves of it.

use std::collections::BTreeMap;

use ndarray::Array2;
use salband::Result;
use salband::field::{Transform, derive, regional};
use salband::grid::{Frame, Grid};

/// The regional: a bowl on a slope, mGal; coordinates in kilometres.
fn bowl(x: f64, y: f64) -> f64 {
    -30.0 + 0.4 * x - 0.2 * y + 0.015 * x * x - 0.01 * x * y
}

/// The body: a hill of 6 mGal and 1 km width.
fn hill(x: f64, y: f64) -> f64 {
    6.0 * (-((x - 14.0).powi(2) + (y - 10.0).powi(2)) / 2.0).exp()
}

fn main() -> Result<()> {
    let frame = Frame::local(200.0, 120, 140)?;
    let layer = |of: &dyn Fn(f64, f64) -> f64| {
        let values = Array2::from_shape_fn(frame.shape(), |(row, col)| {
            let (x, y) = frame.position(row as f64, col as f64);
            of(x / 1000.0, y / 1000.0)
        });
        Grid::new(frame.clone(), values)
    };
    let both = layer(&|x, y| bowl(x, y) + hill(x, y))?;
    let cell = [69, 69];
    println!("degree   residual over the body   without a body, largest residual");
    for degree in 1..=3 {
        let parts = regional(&both, degree)?;
        let bare = regional(&layer(&bowl)?, degree)?.residual;
        let largest = bare.values().iter().fold(0.0_f64, |most, value| most.max(value.abs()));
        println!("{degree:>6} {:>18.3} mGal {largest:>25.1e} mGal", parts.residual.values()[cell]);
    }
    let (x, y) = frame.position(69.0, 69.0);
    println!("truth  {:>18.3} mGal", hill(x / 1000.0, y / 1000.0));

    // The same by name, as a command line would ask for it.
    let given = BTreeMap::from([("degree".to_string(), 2.0)]);
    let transform = Transform::named("residual", &given)?;
    let product = derive(&both, &transform)?;
    println!("by name {:>17.3} {}", product.values()[cell], transform.product_unit("mGal"));
    Ok(())
}
