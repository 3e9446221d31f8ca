//! Reduction to the pole and pseudo-gravity of total-field magnetic anomalies.

use rustfft::num_complex::Complex64;

use super::spectrum::Wave;
use crate::error::{Error, Result};

/// The direction of the inducing field, along which the bodies are taken to be magnetised.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct InducingField {
    /// Direction cosines toward east, north and down.
    east: f64,
    north: f64,
    down: f64,
}

impl InducingField {
    /// The least inclination, degrees up or down, at which a reduction is made. Below it the operator magnifies waves
    /// along the magnetic declination by more than 1 / sin^2 15 = 15, and noise takes over.
    pub const LEAST_INCLINATION: f64 = 15.0;

    /// A direction by its inclination (degrees, positive downward, -90 to 90) and declination (degrees clockwise from
    /// grid north, -360 to 360).
    ///
    /// # Errors
    /// An angle outside its range or not a number; an inclination less steep than [`Self::LEAST_INCLINATION`].
    pub fn new(inclination: f64, declination: f64) -> Result<Self> {
        if !(-90.0..=90.0).contains(&inclination) {
            return Err(Error::input("the inclination of the magnetic field")
                .found(inclination)
                .wanted("degrees between -90 and 90, positive downward")
                .mend("take it from a geomagnetic reference model for the place and date of the survey"));
        }
        if !(-360.0..=360.0).contains(&declination) {
            return Err(Error::input("the declination of the magnetic field")
                .found(declination)
                .wanted("degrees between -360 and 360, clockwise from grid north")
                .mend("take it from a geomagnetic reference model for the place and date of the survey"));
        }
        if inclination.abs() < Self::LEAST_INCLINATION {
            return Err(Error::input("the inclination of the magnetic field")
                .found(format!("{inclination} degrees"))
                .wanted(format!(
                    "at least {} degrees up or down, because reduction to the pole is unstable at low latitudes",
                    Self::LEAST_INCLINATION
                ))
                .mend("leave this layer out, or give it as a grid that is already reduced, with kind \"other\""));
        }
        let (dip, bearing) = (inclination.to_radians(), declination.to_radians());
        Ok(Self { east: dip.cos() * bearing.sin(), north: dip.cos() * bearing.cos(), down: dip.sin() })
    }

    /// 1 / Theta^2 with Theta = down + i (east k_east + north k_north) / |k|; 1 for the level.
    ///
    /// Source: Blakely (1995), Potential Theory in Gravity and Magnetic Applications, section 12.3.1, for magnetisation
    /// along the field.
    pub(super) fn to_pole(self, wave: Wave) -> Complex64 {
        if wave.length == 0.0 {
            return Complex64::new(1.0, 0.0);
        }
        let along = (self.east * wave.east + self.north * wave.north) / wave.length;
        let theta = Complex64::new(self.down, along);
        (theta * theta).inv()
    }

    /// mGal per nT: the reduction to the pole, integrated along the vertical (1 / |k|) and scaled by Poisson's relation;
    /// 0 for the level, which is not defined. `ratio` is density over magnetisation, kg/m3 per A/m.
    ///
    /// Source: Baranov (1957), Geophysics 22, 359-382; Blakely (1995), section 12.3.2.
    pub(super) fn to_pseudo_gravity(self, wave: Wave, ratio: f64) -> Complex64 {
        if wave.length == 0.0 {
            return Complex64::new(0.0, 0.0);
        }
        self.to_pole(wave) * (MILLIGAL_PER_NANOTESLA * ratio / wave.length)
    }
}

/// Newton's constant 6.6743e-11 m3/kg/s2 (CODATA 2018) over mu0 / 4 pi = 1e-7, times 1e-9 T/nT and 1e5 mGal per m/s2.
const MILLIGAL_PER_NANOTESLA: f64 = 6.6743e-11 / 1e-7 * 1e-9 * 1e5;

/// The ratio of density to magnetisation, if it can be used.
pub(super) fn checked_ratio(ratio: f64) -> Result<f64> {
    if ratio.is_finite() && ratio > 0.0 {
        return Ok(ratio);
    }
    Err(Error::input("the ratio of density to magnetisation for pseudo-gravity")
        .found(ratio)
        .wanted("a positive number of kg/m3 per A/m")
        .mend("use 1 if only the shape matters"))
}

#[cfg(test)]
mod tests {
    use super::*;

    const WAVE: Wave = Wave { east: 3e-4, north: -4e-4, length: 5e-4 };

    #[test]
    fn each_bad_angle_is_refused() {
        for inclination in [f64::NAN, f64::INFINITY, 90.1, -91.0] {
            let error = InducingField::new(inclination, 0.0).unwrap_err().to_string();
            assert!(error.contains("between -90 and 90"), "{error}");
        }
        for declination in [f64::NAN, f64::NEG_INFINITY, 360.5] {
            let error = InducingField::new(60.0, declination).unwrap_err().to_string();
            assert!(error.contains("declination"), "{error}");
        }
        for inclination in [0.0, 14.9, -14.9] {
            let error = InducingField::new(inclination, 0.0).unwrap_err().to_string();
            assert!(error.contains("at least 15 degrees"), "{error}");
        }
        assert!(InducingField::new(-15.0, 360.0).is_ok());
    }

    #[test]
    fn each_bad_ratio_is_refused() {
        for ratio in [f64::NAN, f64::INFINITY, 0.0, -1.0] {
            assert!(checked_ratio(ratio).unwrap_err().to_string().contains("kg/m3 per A/m"));
        }
    }

    #[test]
    fn at_the_poles_nothing_is_left_to_reduce() {
        for inclination in [90.0, -90.0] {
            let factor = InducingField::new(inclination, 20.0).unwrap().to_pole(WAVE);
            assert!((factor - 1.0).norm() < 1e-12);
        }
    }

    #[test]
    fn the_operator_is_the_closed_form() {
        // Blakely (1995), section 12.3.1, by hand for I = 30, D = 90: Theta = 0.5 + i 0.8660254 x 0.6.
        let factor = InducingField::new(30.0, 90.0).unwrap().to_pole(WAVE);
        let theta = Complex64::new(0.5, 0.866_025_403_784_438_6 * 0.6);
        assert!((factor * theta * theta - 1.0).norm() < 1e-12);
    }
}
