//! Magnetic reductions of an invented dipole with remanence, beside closed forms.

use ndarray::Array2;
use salband::Result;
use salband::field::{Direction, MagneticDirections, PreparedField};
use salband::grid::{Frame, Grid};

const DEPTH: f64 = 1800.0;

/// The anomaly (nT) along `field` of a dipole of 1e9 A m2 along `moment`; (east, north, down).
fn anomaly(frame: &Frame, field: [f64; 3], moment: [f64; 3]) -> Result<Grid> {
    let dot = |a: [f64; 3], b: [f64; 3]| a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
    let values = Array2::from_shape_fn(frame.shape(), |(row, col)| {
        let (x, y) = frame.position(row as f64, col as f64);
        let r = [x - 12_850.0, y - 12_850.0, -DEPTH];
        let square = dot(r, r);
        1e11 * (3.0 * dot(moment, r) * dot(field, r) / square - dot(moment, field)) / square.powf(1.5)
    });
    Grid::new(frame.clone(), values)
}

fn cosines(inclination: f64, declination: f64) -> [f64; 3] {
    let (dip, bearing) = (f64::to_radians(inclination), f64::to_radians(declination));
    [dip.cos() * bearing.sin(), dip.cos() * bearing.cos(), dip.sin()]
}

fn main() -> Result<()> {
    let frame = Frame::local(200.0, 128, 128)?;
    let measured = anomaly(&frame, cosines(-55.0, 8.0), cosines(40.0, 130.0))?;
    let directions = MagneticDirections::with_remanence(Direction::new(-55.0, 8.0)?, Direction::new(40.0, 130.0)?);
    let field = PreparedField::new(&measured)?;
    let down = [0.0, 0.0, 1.0];
    let pole = anomaly(&frame, down, down)?;
    let level = cosines(0.0, 8.0);
    let equator = anomaly(&frame, level, level)?;

    let cell = [61, 67];
    println!("at one cell (nT)           found  closed form");
    let show = |name: &str, found: f64, exact: f64| println!("{name:<22} {found:>9.3} {exact:>9.3}");
    println!("{:<22} {:>9.3}", "measured", measured.values()[cell]);
    show("reduced to the pole", field.to_pole(directions)?.values()?.values()[cell], pole.values()[cell]);
    show("reduced to the equator", field.to_equator(directions)?.values()?.values()[cell], equator.values()[cell]);

    // Pseudo-gravity of a dipole is the gravity of a point mass: G x 1e5 x mass x z / r^3 mGal, 1 kg/m3 per A/m. Its level is
    // not defined, so that only the difference between two cells has a meaning.
    let heavy = field.to_pseudo_gravity(directions, 1.0)?.values()?;
    let mass = |row: usize, col: usize| {
        let (x, y) = frame.position(row as f64, col as f64);
        let square = (x - 12_850.0).powi(2) + (y - 12_850.0).powi(2) + DEPTH * DEPTH;
        6.6743e-6 * 1e9 * DEPTH / square.powf(1.5)
    };
    let found = heavy.values()[cell] - heavy.values()[[20, 64]];
    println!("pseudo-gravity (mGal)  {found:>9.6} {:>9.6}", mass(61, 67) - mass(20, 64));
    Ok(())
}
