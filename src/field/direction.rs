//! Directions of the geomagnetic field and of magnetisation.

use rustfft::num_complex::Complex64;

use super::spectrum::Wave;
use crate::error::{Error, Result};

/// A direction in space, by inclination and declination.
///
/// ```
/// use salband::field::Direction;
/// assert!(Direction::new(-61.0, 6.5).is_ok());
/// assert!(Direction::new(95.0, 0.0).is_err());
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Direction {
    inclination: f64,
    declination: f64,
    /// Direction cosines.
    east: f64,
    north: f64,
    down: f64,
}

impl Direction {
    /// A direction by its inclination (degrees, positive downward, -90 to 90) and declination (degrees clockwise from
    /// grid north, -360 to 360; a declination from true north needs the convergence of the meridian added first).
    ///
    /// # Errors
    /// An angle outside its range or not a number.
    pub fn new(inclination: f64, declination: f64) -> Result<Self> {
        if !(-90.0..=90.0).contains(&inclination) {
            return Err(Error::input("the inclination of a magnetic direction")
                .found(inclination)
                .wanted("degrees between -90 and 90, positive downward")
                .mend("take it from a geomagnetic reference model for the place and date of the survey"));
        }
        if !(-360.0..=360.0).contains(&declination) {
            return Err(Error::input("the declination of a magnetic direction")
                .found(declination)
                .wanted("degrees between -360 and 360, clockwise from grid north")
                .mend("take it from a geomagnetic reference model for the place and date of the survey"));
        }
        let (dip, bearing) = (inclination.to_radians(), declination.to_radians());
        Ok(Self {
            inclination,
            declination,
            east: dip.cos() * bearing.sin(),
            north: dip.cos() * bearing.cos(),
            down: dip.sin(),
        })
    }

    /// Degrees below the horizontal, negative above it.
    pub fn inclination(&self) -> f64 {
        self.inclination
    }

    /// Degrees clockwise from grid north.
    pub fn declination(&self) -> f64 {
        self.declination
    }

    /// down + i (east k_east + north k_north) / |k|, which times |k| is the derivative along the direction; `wave` is
    /// not the level.
    ///
    /// Source: Blakely (1995), Potential Theory in Gravity and Magnetic Applications, section 12.3.1.
    pub(super) fn along(self, wave: Wave) -> Complex64 {
        Complex64::new(self.down, (self.east * wave.east + self.north * wave.north) / wave.length)
    }

    /// The horizontal direction with the same declination.
    pub(super) fn levelled(self) -> Self {
        let bearing = self.declination.to_radians();
        Self { inclination: 0.0, declination: self.declination, east: bearing.sin(), north: bearing.cos(), down: 0.0 }
    }

    /// The inverse of [`Self::along`], whose amplitude is that of a direction at least `guard` degrees steep:
    /// conj(A) / (|A| |A_guard|), with A that of the direction itself and A_guard that of the same declination at the
    /// guard. Exact where the direction is as steep as the guard; 0 for a wave that the direction does not see at all.
    pub(super) fn inverse(self, wave: Wave, guard: f64) -> Complex64 {
        let along = self.along(wave);
        let size = along.norm();
        if size == 0.0 {
            return Complex64::default();
        }
        if self.inclination.abs() >= guard {
            return along.inv();
        }
        // |A|^2 = sin^2 I + cos^2 I c^2, c the cosine between declination and wave; cos I > 0 as I is below the guard.
        let seen = along.im / self.inclination.to_radians().cos();
        let (sine, cosine) = guard.to_radians().sin_cos();
        along.conj() / (size * sine.hypot(cosine * seen))
    }
}

/// The pair of directions that shapes a total-field anomaly: the geomagnetic field, along which it is measured, and the
/// total magnetisation of the bodies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MagneticDirections {
    /// The geomagnetic field at the place and date of the survey.
    pub field: Direction,
    /// The total magnetisation: the sum of the induced and the remanent part.
    pub magnetisation: Direction,
}

impl MagneticDirections {
    /// Bodies magnetised along the field, by induction alone.
    pub fn induced(field: Direction) -> Self {
        Self { field, magnetisation: field }
    }

    /// Bodies whose total magnetisation (induced and remanent together) has a direction of its own.
    pub fn with_remanence(field: Direction, magnetisation: Direction) -> Self {
        Self { field, magnetisation }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const WAVE: Wave = Wave { east: 3e-4, north: -4e-4, length: 5e-4 };

    #[test]
    fn each_bad_angle_is_refused() {
        for inclination in [f64::NAN, f64::INFINITY, 90.1, -91.0] {
            let error = Direction::new(inclination, 0.0).unwrap_err().to_string();
            assert!(error.contains("between -90 and 90"), "{error}");
        }
        for declination in [f64::NAN, f64::NEG_INFINITY, 360.5] {
            let error = Direction::new(60.0, declination).unwrap_err().to_string();
            assert!(error.contains("declination"), "{error}");
        }
        assert!(Direction::new(0.0, 360.0).is_ok() && Direction::new(-90.0, -360.0).is_ok());
    }

    #[test]
    fn the_guard_keeps_the_phase_and_lowers_the_amplitude() {
        // Source: MacLeod, Jordan & Li (1993), squared for induction: (sin I - i cos I c)^2 /
        // [(sin^2 Ia + cos^2 Ia c^2) (sin^2 I + cos^2 I c^2)], c = cos(D - azimuth), by hand for I = 5, Ia = 20, D = 90,
        // for which c = 0.6.
        let direction = Direction::new(5.0, 90.0).unwrap();
        let (i, a): (f64, f64) = (5.0_f64.to_radians(), 20.0_f64.to_radians());
        let top = Complex64::new(i.sin(), -i.cos() * 0.6);
        let square = |angle: f64| angle.sin().powi(2) + angle.cos().powi(2) * 0.36;
        let published = top * top / (square(a) * square(i));
        let found = direction.inverse(WAVE, 20.0) * direction.inverse(WAVE, 20.0);
        assert!((found - published).norm() < 1e-12, "{found} {published}");
        let exact = direction.inverse(WAVE, 0.0);
        assert!((exact * direction.along(WAVE) - 1.0).norm() < 1e-12);
        let steep = Direction::new(-20.0, 90.0).unwrap();
        assert_eq!(steep.inverse(WAVE, 20.0), steep.along(WAVE).inv());
        assert!(found.norm() < exact.norm_sqr());
    }

    #[test]
    fn a_wave_that_a_level_direction_does_not_see_is_left_out() {
        let north = Direction::new(0.0, 0.0).unwrap();
        let across = Wave { east: 1e-3, north: 0.0, length: 1e-3 };
        assert_eq!(north.inverse(across, 20.0), Complex64::default());
    }
}
