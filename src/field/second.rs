//! Vertical and second derivatives of a potential field.

use ndarray::{Array2, Zip};
use rustfft::num_complex::Complex64;

use super::prepare::checked_height;
use super::spectrum::Wave;
use super::{PreparedField, Toward};
use crate::error::Result;
use crate::grid::{Frame, Plane};

/// The six second derivatives of a field on a frame, in units of the field per square metre; NaN outside the footprint.
///
/// Directions are east, grid north and down. A second derivative along one axis does not depend on the sense of the axis:
/// down-down is the second derivative toward the sky as well, and is positive over the middle of a shallow dense body.
/// A potential field away from its sources obeys Laplace's equation, so that [`Self::laplacian`] vanishes.
#[derive(Debug, Clone)]
pub struct SecondDerivatives {
    frame: Frame,
    parts: [Array2<f64>; 6],
}

impl SecondDerivatives {
    /// The frame.
    pub fn frame(&self) -> &Frame {
        &self.frame
    }

    /// Toward east twice.
    pub fn east_east(&self) -> &Array2<f64> {
        &self.parts[0]
    }

    /// Toward east and grid north.
    pub fn east_north(&self) -> &Array2<f64> {
        &self.parts[1]
    }

    /// Toward east and downward.
    pub fn east_down(&self) -> &Array2<f64> {
        &self.parts[2]
    }

    /// Toward grid north twice.
    pub fn north_north(&self) -> &Array2<f64> {
        &self.parts[3]
    }

    /// Toward grid north and downward.
    pub fn north_down(&self) -> &Array2<f64> {
        &self.parts[4]
    }

    /// Downward twice.
    pub fn down_down(&self) -> &Array2<f64> {
        &self.parts[5]
    }

    /// east-east + north-north + down-down, which is zero but for rounding: a check on the transform, not on the data.
    pub fn laplacian(&self) -> Array2<f64> {
        Zip::from(self.east_east())
            .and(self.north_north())
            .and(self.down_down())
            .par_map_collect(|east, north, down| east + north + down)
    }
}

impl PreparedField {
    /// The first vertical derivative (|k|, positive downward) as a field of its own, units of the field per metre: a start
    /// for edge strengths of the derivative, such as the tilt of vertical gravity gradient. The plane is dropped, as it has
    /// no vertical derivative.
    ///
    /// Source: Blakely (1995), Potential Theory in Gravity and Magnetic Applications, section 12.2.
    ///
    /// # Errors
    /// Only a defect of the transform.
    pub fn vertical(&self) -> Result<Self> {
        self.filtered(Plane::flat(0.0), |wave| Complex64::new(wave.length, 0.0))
    }

    /// The six second derivatives `height` metres up, per square metre: products of i k_east, i k_north and |k|. The plane
    /// has none. Waves at the highest wavenumber of an axis, two cells long, are left out, so that the six belong together.
    ///
    /// Second derivatives magnify short waves by k^2: on data with noise, raise the field by a cell or more.
    ///
    /// Source: Blakely (1995), section 12.2.
    ///
    /// # Errors
    /// A height that is negative or not finite.
    pub fn second_derivatives(&self, height: f64) -> Result<SecondDerivatives> {
        let height = checked_height(height)?;
        let part = |first, second| self.product(|wave| step(wave, first) * step(wave, second) * fade(wave, height));
        let (east, north, down) = (Toward::East, Toward::North, Toward::Down);
        let parts = [
            part(east, east)?,
            part(east, north)?,
            part(east, down)?,
            part(north, north)?,
            part(north, down)?,
            part(down, down)?,
        ];
        Ok(SecondDerivatives { frame: self.frame().clone(), parts })
    }

    /// One of [`Self::second_derivatives`], along one axis, without the cost of the others.
    ///
    /// # Errors
    /// A height that is negative or not finite.
    pub fn second_derivative(&self, toward: Toward, height: f64) -> Result<Array2<f64>> {
        let height = checked_height(height)?;
        self.product(|wave| step(wave, toward) * step(wave, toward) * fade(wave, height))
    }
}

/// The filter of one derivative.
fn step(wave: Wave, toward: Toward) -> Complex64 {
    match toward {
        Toward::East => Complex64::new(0.0, wave.east),
        Toward::North => Complex64::new(0.0, wave.north),
        Toward::Down => Complex64::new(wave.east.hypot(wave.north), 0.0),
    }
}

/// The filter of upward continuation.
fn fade(wave: Wave, height: f64) -> f64 {
    (-wave.length * height).exp()
}
