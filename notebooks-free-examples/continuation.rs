//! Upward and downward continuation and a low pass of an invented layer, beside closed forms.

use ndarray::Array2;
use salband::Result;
use salband::field::{PreparedField, Regularisation};
use salband::grid::{Frame, Grid};

/// Gravity (any unit) of a mass `depth` metres under the middle of the frame.
fn layer(frame: &Frame, depth: f64) -> Result<Grid> {
    let values = Array2::from_shape_fn(frame.shape(), |(row, col)| {
        let (x, y) = frame.position(row as f64, col as f64);
        1e9 * depth / ((x - 12_800.0).powi(2) + (y - 12_800.0).powi(2) + depth * depth).powf(1.5)
    });
    Grid::new(frame.clone(), values)
}

fn main() -> Result<()> {
    let frame = Frame::local(200.0, 128, 128)?;
    let field = PreparedField::new(&layer(&frame, 2000.0)?)?;
    let cell = [64, 70];
    println!("at one cell              found  closed form");
    let show = |name: &str, found: f64, exact: f64| println!("{name:<20} {found:>9.3} {exact:>9.3}");

    // A field seen from 1,000 m higher is that of a source 1,000 m deeper.
    show("1,000 m up", field.upward(1000.0)?.values()[cell], layer(&frame, 3000.0)?.values()[cell]);
    let lower = field.downward(600.0, Regularisation::LargestGain(200.0))?.values()?;
    show("600 m down", lower.values()[cell], layer(&frame, 1400.0)?.values()[cell]);

    // A low pass takes half of a wave of its own wavelength; 3,200 m fits the frame eight times.
    let wave = Array2::from_shape_fn(frame.shape(), |(_, col)| (col as f64 * std::f64::consts::TAU / 16.0).cos());
    let middle = wave[[64, 64]];
    let smooth = PreparedField::new(&Grid::new(frame, wave)?)?.low_pass(3200.0)?.values()?;
    show("low pass of a wave", smooth.values()[[64, 64]], 0.5 * middle);

    // Downward continuation without a bound on its gain is refused.
    if let Err(error) = field.downward(600.0, Regularisation::LargestGain(f64::INFINITY)) {
        println!("{error}");
    }
    Ok(())
}
