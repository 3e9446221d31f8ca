//! A layer made ready for transforms, and the products that come from it.

use ndarray::{Array2, Zip};
use rustfft::num_complex::Complex64;

use super::Gradient;
use super::check::checked_layer;
use super::gaps::fill_in_place;
use super::plane::regional_plane;
use super::sources;
use super::spectrum::{Spectrum, Wave};
use super::surroundings::Surroundings;
use crate::error::{Error, Result};
use crate::grid::{Frame, Grid, Mask, Plane};

/// The fewest rows and columns that can be transformed.
pub const LEAST_SIDE: usize = 8;

/// A potential field whose gaps are filled, whose plane is set aside and whose spectrum is known.
///
/// ```
/// use ndarray::Array2;
/// use salband::field::PreparedField;
/// use salband::grid::{Frame, Grid};
/// let slope = Array2::from_shape_fn((16, 16), |(_, col)| 0.5 * col as f64);
/// let field = PreparedField::new(&Grid::new(Frame::local(100.0, 16, 16)?, slope)?)?;
/// let gradient = field.gradient(0.0)?;
/// assert!((gradient.horizontal()[[3, 9]] - 0.005).abs() < 1e-9);
/// # Ok::<(), salband::Error>(())
/// ```
#[derive(Debug, Clone)]
pub struct PreparedField {
    frame: Frame,
    footprint: Mask,
    plane: Plane,
    spectrum: Spectrum,
}

impl PreparedField {
    /// Prepares a layer of gravity (mGal), magnetic anomalies (nT) or another potential field.
    ///
    /// Steps: find the plane and the sparse sheet of sources that explain the layer together (the plane starts from the
    /// rim of the footprint); take both off; fill the gaps ([`super::fill_gaps`]); pad to at least twice the side, with the
    /// field of the sources around the layer; one forward transform, which holds the sources again. The plane is put
    /// back where it belongs: its slope into the horizontal derivatives, the whole of it into continued fields.
    ///
    /// Without knowledge of the ground outside, the level and the longest waves of a product remain uncertain near the
    /// edge; derivatives are much less so.
    ///
    /// # Errors
    /// Fewer than 8 rows or columns, no cell that holds a number, or one number throughout.
    pub fn new(grid: &Grid) -> Result<Self> {
        let (rows, cols) = grid.frame().shape();
        if rows.min(cols) < LEAST_SIDE {
            return Err(Error::input("a potential-field layer")
                .found(format!("{rows} rows x {cols} columns"))
                .wanted(format!("at least {LEAST_SIDE} rows and {LEAST_SIDE} columns"))
                .mend("choose a smaller frame.cell or a larger frame"));
        }
        checked_layer(grid)?;
        let frame = grid.frame().clone();
        let (plane, sources) = sources::fit(grid.values(), regional_plane(grid.values()));
        let around = Surroundings::new(frame.shape(), &sources);
        let mut rest = grid.values().clone();
        Zip::indexed(&mut rest).par_for_each(|(row, col), value| *value -= plane.at(row, col));
        around.take_off(&mut rest);
        fill_in_place(&mut rest)?;
        let spectrum = Spectrum::new(&rest, &around, frame.cell)?;
        Ok(Self { footprint: grid.footprint(), frame, plane, spectrum })
    }

    /// The frame of the layer.
    pub fn frame(&self) -> &Frame {
        &self.frame
    }

    /// The cells that held a number; every product is NaN elsewhere.
    pub fn footprint(&self) -> &Mask {
        &self.footprint
    }

    /// The field `height` metres higher: exp(-|k| height) (Blakely 1995, section 12.1).
    ///
    /// # Errors
    /// A height that is negative or not finite.
    pub fn raised(&self, height: f64) -> Result<Self> {
        let height = checked_height(height)?;
        self.filtered(self.plane, |wave| Complex64::new((-wave.length * height).exp(), 0.0))
    }

    /// The field itself, on its footprint.
    ///
    /// # Errors
    /// Only a defect of the transform.
    pub fn values(&self) -> Result<Grid> {
        let values = self.spectrum.layer()?;
        Grid::new(self.frame.clone(), self.masked(values, |row, col| self.plane.at(row, col)))
    }

    /// The field continued upward by `height` metres, on its footprint.
    ///
    /// # Errors
    /// A height that is negative or not finite.
    pub fn upward(&self, height: f64) -> Result<Grid> {
        self.raised(height)?.values()
    }

    /// The three derivatives `height` metres up, per metre: i k_east, i k_north and |k| (positive downward, so that
    /// gravity over a dense body has a positive vertical derivative).
    ///
    /// # Errors
    /// A height that is negative or not finite.
    pub fn gradient(&self, height: f64) -> Result<Gradient> {
        let height = checked_height(height)?;
        let fade = |length: f64| if height == 0.0 { 1.0 } else { (-length * height).exp() };
        let east = self.spectrum.layer_under(|wave| Complex64::new(0.0, wave.east * fade(wave.length)))?;
        let north = self.spectrum.layer_under(|wave| Complex64::new(0.0, wave.north * fade(wave.length)))?;
        let down = self.spectrum.layer_under(|wave| Complex64::new(wave.length * fade(wave.length), 0.0))?;
        Gradient::new(
            self.frame.clone(),
            self.masked(east, |_, _| self.plane.right / self.frame.cell),
            self.masked(north, |_, _| -self.plane.down / self.frame.cell),
            self.masked(down, |_, _| 0.0),
        )
    }

    /// The plane that was set aside.
    pub(super) fn plane(&self) -> Plane {
        self.plane
    }

    /// The field with each wave multiplied by a number that depends on its length (radians per metre) alone; the plane
    /// passes unchanged.
    pub(super) fn faded(&self, keeps: impl Fn(f64) -> f64 + Sync) -> Result<Self> {
        self.filtered(self.plane, |wave| Complex64::new(keeps(wave.length), 0.0))
    }

    /// Slope of the plane that was set aside, units of the field per metre.
    pub(super) fn slope(&self) -> f64 {
        self.plane.right.hypot(self.plane.down) / self.frame.cell
    }

    /// Tells the length of each wavenumber, radians per metre, and the power that it carries.
    pub(super) fn for_each_power(&self, tell: impl FnMut(f64, f64)) {
        self.spectrum.for_each_power(tell);
    }

    /// The field under a filter, with the plane that goes with it.
    pub(super) fn filtered(&self, plane: Plane, filter: impl Fn(Wave) -> Complex64 + Sync) -> Result<Self> {
        Ok(Self {
            frame: self.frame.clone(),
            footprint: self.footprint.clone(),
            plane,
            spectrum: self.spectrum.filtered(filter)?,
        })
    }

    /// The layer under a filter, without the plane, on the footprint.
    pub(super) fn product(&self, filter: impl Fn(Wave) -> Complex64 + Sync) -> Result<Array2<f64>> {
        Ok(self.masked(self.spectrum.layer_under(filter)?, |_, _| 0.0))
    }

    /// The values with what `more` says for each (row, column) added, NaN outside the footprint.
    fn masked(&self, mut values: Array2<f64>, more: impl Fn(usize, usize) -> f64 + Sync) -> Array2<f64> {
        Zip::indexed(&mut values).and(&self.footprint.0).par_for_each(|(row, col), value, &inside| {
            *value = if inside { *value + more(row, col) } else { f64::NAN };
        });
        values
    }
}

pub(super) fn checked_height(height: f64) -> Result<f64> {
    if height.is_finite() && height >= 0.0 {
        return Ok(height);
    }
    Err(Error::input("the height of a continued field")
        .found(height)
        .wanted("zero or a positive number of metres, upward")
        .mend("give heights such as 0 and 1000; downward continuation is a transform of its own"))
}

/// A field continued upward by `height` metres; for several products of one layer use [`PreparedField`].
///
/// # Errors
/// As [`PreparedField::new`] and [`PreparedField::upward`].
pub fn upward_continuation(grid: &Grid, height: f64) -> Result<Grid> {
    PreparedField::new(grid)?.upward(height)
}

/// The horizontal gradient magnitude of a field, units of the field per metre.
///
/// # Errors
/// As [`PreparedField::new`].
pub fn horizontal_gradient_magnitude(grid: &Grid) -> Result<Grid> {
    grid.with(PreparedField::new(grid)?.gradient(0.0)?.horizontal())
}

/// The first vertical derivative of a field, positive downward, units of the field per metre.
///
/// # Errors
/// As [`PreparedField::new`].
pub fn vertical_derivative(grid: &Grid) -> Result<Grid> {
    grid.with(PreparedField::new(grid)?.gradient(0.0)?.down().clone())
}

/// The tilt angle of a field, degrees (Miller & Singh 1994).
///
/// # Errors
/// As [`PreparedField::new`].
pub fn tilt_derivative(grid: &Grid) -> Result<Grid> {
    grid.with(PreparedField::new(grid)?.gradient(0.0)?.tilt())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::{Direction, MagneticDirections};

    fn layer(rows: usize, cols: usize, of: impl Fn(f64, f64) -> f64) -> Grid {
        let frame = Frame::local(100.0, rows, cols).unwrap();
        let values = Array2::from_shape_fn((rows, cols), |(row, col)| {
            let (x, y) = frame.position(row as f64, col as f64);
            of(x, y)
        });
        Grid::new(frame, values).unwrap()
    }

    fn bumps() -> Grid {
        layer(50, 64, |x, y| (x / 700.0).sin() * (y / 900.0).cos() + (x + y) / 3000.0)
    }

    #[test]
    fn each_layer_that_cannot_be_used_is_refused() {
        let refused = |grid: &Grid| PreparedField::new(grid).unwrap_err().to_string();
        assert!(refused(&layer(20, 20, |_, _| 980_123.4)).contains("the layer is constant"));
        assert!(refused(&layer(20, 20, |_, _| 0.0)).contains("the layer is constant"));
        assert!(refused(&layer(20, 20, |_, _| f64::NAN)).contains("no cell that holds a number"));
        assert!(refused(&layer(7, 20, |x, _| x)).contains("7 rows"));
        assert!(refused(&layer(20, 7, |x, _| x)).contains("7 columns"));
    }

    #[test]
    fn each_bad_height_is_refused() {
        let field = PreparedField::new(&bumps()).unwrap();
        for height in [f64::NAN, f64::INFINITY, -1.0] {
            assert!(field.upward(height).unwrap_err().to_string().contains("height"));
            assert!(field.gradient(height).unwrap_err().to_string().contains("height"));
        }
    }

    #[test]
    fn a_linear_field_has_its_own_slope() {
        // Source: the derivative of 0.03 x - 0.04 y + 9, whose gradient has length 0.05.
        let grid = layer(33, 40, |x, y| 0.03 * x - 0.04 * y + 9.0);
        let gradient = PreparedField::new(&grid).unwrap().gradient(500.0).unwrap();
        for ((row, col), magnitude) in gradient.horizontal().indexed_iter() {
            assert!((magnitude - 0.05).abs() < 1e-12);
            assert!((gradient.north()[[row, col]] + 0.04).abs() < 1e-12);
            assert!(gradient.down()[[row, col]].abs() < 1e-12);
        }
        let up = upward_continuation(&grid, 800.0).unwrap();
        assert!(up.values().iter().zip(grid.values()).all(|(a, b)| (a - b).abs() < 1e-9));
    }

    #[test]
    fn continuation_in_two_steps_is_continuation_in_one() {
        // Source: exp(-k a) exp(-k b) = exp(-k (a + b)).
        let field = PreparedField::new(&bumps()).unwrap();
        let twice = field.raised(150.0).unwrap().raised(250.0).unwrap().values().unwrap();
        let once = field.upward(400.0).unwrap();
        assert!(twice.values().iter().zip(once.values()).all(|(a, b)| (a - b).abs() < 1e-12));
        assert!(once.values().iter().zip(bumps().values()).any(|(a, b)| (a - b).abs() > 0.05));
    }

    #[test]
    fn nothing_done_gives_the_layer_back() {
        let back = PreparedField::new(&bumps()).unwrap().values().unwrap();
        assert!(back.values().iter().zip(bumps().values()).all(|(a, b)| (a - b).abs() < 1e-12));
    }

    #[test]
    fn a_layer_with_gaps_keeps_its_footprint() {
        let mut values = bumps().into_values();
        values.slice_mut(ndarray::s![..12, ..20]).fill(f64::NAN);
        values.slice_mut(ndarray::s![30..33, 40..50]).fill(f64::NAN);
        let grid = bumps().with(values).unwrap();
        let field = PreparedField::new(&grid).unwrap();
        let gradient = field.gradient(100.0).unwrap();
        let directions = MagneticDirections::induced(Direction::new(60.0, 3.0).unwrap());
        for product in [
            field.upward(100.0).unwrap().into_values(),
            gradient.horizontal(),
            gradient.tilt(),
            field.to_pole(directions).unwrap().values().unwrap().into_values(),
            field.to_pseudo_gravity(directions, 1.0).unwrap().values().unwrap().into_values(),
            field.vertical().unwrap().values().unwrap().into_values(),
            field.second_derivatives(0.0).unwrap().down_down().clone(),
        ] {
            assert_eq!(Mask::of_finite(&product), grid.footprint());
        }
    }

    #[test]
    fn the_free_functions_are_the_methods() {
        let gradient = PreparedField::new(&bumps()).unwrap().gradient(0.0).unwrap();
        assert_eq!(horizontal_gradient_magnitude(&bumps()).unwrap().values(), &gradient.horizontal());
        assert_eq!(vertical_derivative(&bumps()).unwrap().values(), gradient.down());
        assert_eq!(tilt_derivative(&bumps()).unwrap().values(), &gradient.tilt());
    }
}
