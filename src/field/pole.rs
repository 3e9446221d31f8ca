//! Reduction to the pole and to the equator, magnetic potential and pseudo-gravity of total-field anomalies.

use rustfft::num_complex::Complex64;

use super::PreparedField;
use super::check::checked_positive;
use super::direction::{Direction, MagneticDirections};
use super::spectrum::Wave;
use crate::error::{Error, Result};
use crate::grid::Plane;

/// The least inclination, degrees up or down, whose own amplitude is used; below it the amplitude is that of this
/// inclination, and only the phase is exact.
pub const LEAST_EXACT_INCLINATION: f64 = 20.0;

/// Newton's constant 6.6743e-11 m3/kg/s2 (CODATA 2018) over mu0 / 4 pi = 1e-7, times 1e-9 T/nT and 1e5 mGal per m/s2.
const MILLIGAL_PER_NANOTESLA: f64 = 6.6743e-11 / 1e-7 * 1e-9 * 1e5;

impl MagneticDirections {
    /// 1 / (A_field A_magnetisation), each under the guard; 1 for the level.
    pub(super) fn to_pole(self, wave: Wave, guard: f64) -> Complex64 {
        if wave.length == 0.0 {
            return Complex64::new(1.0, 0.0);
        }
        self.field.inverse(wave, guard) * self.magnetisation.inverse(wave, guard)
    }

    /// A_level^2 / (A_field A_magnetisation), with A_level that of the field's declination at inclination 0.
    fn to_equator(self, wave: Wave) -> Complex64 {
        if wave.length == 0.0 {
            return Complex64::default();
        }
        let level = self.field.levelled().along(wave);
        // For magnetisation along the field the ratio is at most 1, so that it needs no guard.
        let guard = if self.field == self.magnetisation { 0.0 } else { LEAST_EXACT_INCLINATION };
        level * level * self.field.inverse(wave, guard) * self.magnetisation.inverse(wave, guard)
    }
}

/// - 1 / (|k| A_field), metres; 0 for the level, which is not defined.
fn to_potential(field: Direction, wave: Wave) -> Complex64 {
    if wave.length == 0.0 {
        return Complex64::default();
    }
    -field.inverse(wave, LEAST_EXACT_INCLINATION) / wave.length
}

/// - C ratio / A_magnetisation, mGal per nT m; 0 for the level.
fn to_gravity(magnetisation: Direction, ratio: f64, wave: Wave) -> Complex64 {
    if wave.length == 0.0 {
        return Complex64::default();
    }
    -magnetisation.inverse(wave, LEAST_EXACT_INCLINATION) * (MILLIGAL_PER_NANOTESLA * ratio)
}

impl MagneticDirections {
    /// Pseudo-gravity from total-field anomalies, mGal per nT; 0 for the level.
    pub(super) fn to_pseudo_gravity(self, ratio: f64, wave: Wave) -> Complex64 {
        to_potential(self.field, wave) * to_gravity(self.magnetisation, ratio, wave)
    }
}

/// The ratio of density to magnetisation, if it can be used.
pub(super) fn checked_ratio(ratio: f64) -> Result<f64> {
    checked_positive(ratio, "the ratio of density to magnetisation", "kg/m3 per A/m (1 if only the shape matters)")
}

impl PreparedField {
    /// Total-field anomalies (nT) reduced to the pole, nT: the anomaly of the same bodies under a vertical field and
    /// with vertical magnetisation of the same strength. The plane passes unchanged.
    ///
    /// Each of the two directions contributes 1 / A, A = sin I + i cos I cos(D - azimuth of the wave). Where a direction
    /// is less steep than [`LEAST_EXACT_INCLINATION`], the amplitude of its factor is that of this steeper inclination
    /// and its phase is kept, so that noise along the declination is not blown up without bound. The price is that waves
    /// along the magnetic equator's blind direction come out too weak.
    ///
    /// Measured on a prism of 5 x 5 km, 0.8 to 3 km deep, on 128 x 128 cells of 250 m, declination 5: the root mean square
    /// error over the interior as a share of the range of the exact answer, without noise and with white noise of 1 % of
    /// the range of the anomaly (tests/field_magnetics.rs holds these numbers and chose the guard).
    ///
    /// | inclination | guard 20 | with noise | no guard | with noise |
    /// | --- | --- | --- | --- | --- |
    /// | 5 | 0.055 | 0.065 | 0.031 | 0.335 |
    /// | 15 | 0.026 | 0.046 | 0.008 | 0.059 |
    /// | 30 | 0.002 | 0.027 | 0.002 | 0.027 |
    /// | 60 | 0.0004 | 0.015 | 0.0004 | 0.015 |
    ///
    /// Source: Baranov (1957), Geophysics 22, 359-382; Blakely (1995), section 12.3.1; the guard: Grant & Dodds (1972,
    /// unpublished) as given by MacLeod, Jordan & Li (1993), Exploration Geophysics 24.
    ///
    /// # Errors
    /// Only a defect of the transform.
    pub fn to_pole(&self, directions: MagneticDirections) -> Result<Self> {
        self.to_pole_guarded(directions, LEAST_EXACT_INCLINATION)
    }

    /// [`Self::to_pole`] with a guard of its own: the least inclination, degrees, whose own amplitude is used; 0 for none.
    ///
    /// # Errors
    /// A guard outside 0 to 90 degrees.
    pub fn to_pole_guarded(&self, directions: MagneticDirections, guard: f64) -> Result<Self> {
        if !(0.0..=90.0).contains(&guard) {
            return Err(Error::input("the guard of a reduction to the pole")
                .found(guard)
                .wanted("degrees from 0 (no guard) to 90")
                .mend(format!("use {LEAST_EXACT_INCLINATION} unless the noise of the layer asks for more")));
        }
        self.filtered(self.plane(), |wave| directions.to_pole(wave, guard))
    }

    /// Total-field anomalies (nT) reduced to the equator, nT: the anomaly of the same bodies under a horizontal field of
    /// the same declination, magnetised along it. The level and the plane are dropped.
    ///
    /// For induced magnetisation the operator is at most 1 and exact at every inclination. With a magnetisation of its
    /// own the guard of [`Self::to_pole`] holds for both factors.
    ///
    /// Measured as there, without and with noise: 0.0012 and 0.011 at inclination 5, 0.0010 and 0.012 at 15, 0.0005 and 0.013
    /// at 30. Below about 20 degrees it is the safer reduction.
    ///
    /// Source: as for [`Self::to_pole`]; MacLeod, Jordan & Li (1993) discuss its use at low latitudes.
    ///
    /// # Errors
    /// Only a defect of the transform.
    pub fn to_equator(&self, directions: MagneticDirections) -> Result<Self> {
        self.filtered(Plane::flat(0.0), |wave| directions.to_equator(wave))
    }

    /// Total-field anomalies (nT) turned into the scalar magnetic potential V of the bodies, nT m, for which the anomalous
    /// field is - grad V and a dipole of moment m has V = mu0 / 4 pi  m.r / r^3. `field` is the direction along which the
    /// anomaly was measured; the direction of magnetisation stays as it is. Plane and level are dropped. The guard of
    /// [`Self::to_pole`] holds.
    ///
    /// Source: Blakely (1995), chapters 5 and 12: the anomaly is - f.grad V along the field f.
    ///
    /// # Errors
    /// Only a defect of the transform.
    pub fn to_magnetic_potential(&self, field: Direction) -> Result<Self> {
        self.filtered(Plane::flat(0.0), |wave| to_potential(field, wave))
    }

    /// Scalar magnetic potential (nT m) of bodies magnetised along `magnetisation` turned into the vertical gravity of the
    /// same bodies, mGal, if each A/m of magnetisation stood for `ratio` kg/m3 of density contrast. Level and plane are
    /// dropped. For vertical magnetisation it is a mere change of scale.
    ///
    /// Source: Poisson's relation V = - (mu0 / 4 pi) M / (G rho) g_m, g_m the component of gravity along the magnetisation
    /// (Poisson 1826; Blakely 1995, chapter 5).
    ///
    /// # Errors
    /// A ratio that is not positive and finite.
    pub fn potential_to_gravity(&self, magnetisation: Direction, ratio: f64) -> Result<Self> {
        let ratio = checked_ratio(ratio)?;
        self.filtered(Plane::flat(0.0), |wave| to_gravity(magnetisation, ratio, wave))
    }

    /// Total-field anomalies (nT) turned into pseudo-gravity (mGal): the vertical gravity of the same bodies if each
    /// A/m of magnetisation stood for `ratio` kg/m3 of density contrast. It is [`Self::to_magnetic_potential`] followed by
    /// [`Self::potential_to_gravity`] in one step. The plane is dropped, as Poisson's relation gives it no meaning, so the
    /// level is arbitrary. The guard of [`Self::to_pole`] holds.
    ///
    /// Source: Baranov (1957), Geophysics 22, 359-382; Blakely (1995), section 12.3.2.
    ///
    /// # Errors
    /// A ratio that is not positive and finite.
    pub fn to_pseudo_gravity(&self, directions: MagneticDirections, ratio: f64) -> Result<Self> {
        let ratio = checked_ratio(ratio)?;
        self.filtered(Plane::flat(0.0), |wave| {
            to_potential(directions.field, wave) * to_gravity(directions.magnetisation, ratio, wave)
        })
    }
}
