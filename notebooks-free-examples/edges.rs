//! Edge strengths between two invented bodies and the fabric of an invented field of ridges, beside closed forms.

use ndarray::Array2;
use salband::Result;
use salband::field::{Fabric, Gradient, PreparedField};
use salband::grid::{Frame, Grid};

fn main() -> Result<()> {
    // Two masses of opposite sign far apart, 2,000 m deep; the tilt between them crosses zero once, midway.
    let frame = Frame::local(250.0, 120, 120)?;
    let mass = |x: f64, y: f64, east: f64| 2e9 * 2000.0 / ((x - east).powi(2) + (y - 15_125.0).powi(2) + 4e6).powf(1.5);
    let values = Array2::from_shape_fn(frame.shape(), |(row, col)| {
        let (x, y) = frame.position(row as f64, col as f64);
        mass(x, y, 12_125.0) - mass(x, y, 18_125.0)
    });
    let field = PreparedField::new(&Grid::new(frame.clone(), values)?)?;
    let gradient = field.gradient(0.0)?;
    let (row, col) = (59, 60);
    // By symmetry the derivative downward vanishes midway, 3,000 m from each mass: tilt 0, theta 1, and the horizontal
    // gradient is twice that of one mass, 3 D x / r^5.
    let r = 3000.0_f64.hypot(2000.0);
    println!("midway                       found  closed form");
    println!("tilt (degrees)           {:>9.3} {:>9.3}", gradient.tilt()[[row, col]], 0.0);
    println!("theta                    {:>9.4} {:>9.4}", gradient.theta()[[row, col]], 1.0);
    let exact = 2.0 * 2e9 * 3.0 * 2000.0 * 3000.0 / r.powi(5);
    println!("horizontal gradient      {:>9.5} {exact:>9.5}", gradient.horizontal()[[row, col]]);
    // The tilt there changes as d(down)/dx over the horizontal gradient; for one mass d(down)/dx is 3 x (r^2 - 5 D^2) / r^7.
    let slope = 2.0 * 2e9 * 3.0 * 3000.0 * (5.0 * 4e6 - r * r).abs() / r.powi(7) / exact;
    let found = gradient.tilt_gradient(&field.second_derivatives(0.0)?)?[[row, col]];
    println!("tilt gradient (rad/km)   {:>9.4} {:>9.4}", 1000.0 * found, 1000.0 * slope);

    // Ridges that strike 30 degrees, given by their gradient.
    let (sine, cosine) = 30.0_f64.to_radians().sin_cos();
    let swing = Array2::from_shape_fn(frame.shape(), |(row, col)| {
        let (x, y) = frame.position(row as f64, col as f64);
        ((cosine * x - sine * y) / 600.0).cos()
    });
    let ridges = Gradient::new(frame, &swing * cosine, &swing * -sine, swing)?;
    let fabric = Fabric::of(&ridges, 1000.0)?;
    println!("fabric strike (degrees)  {:>9.3} {:>9.3}", fabric.strike[[row, col]], 30.0);
    println!("fabric coherence         {:>9.4} {:>9.4}", fabric.coherence[[row, col]], 1.0);
    Ok(())
}
