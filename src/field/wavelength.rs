//! Filters that keep or drop waves by their length.

use rustfft::num_complex::Complex64;

use super::PreparedField;
use super::check::checked_positive;
use crate::error::{Error, Result};
use crate::grid::Plane;

/// exp(-ln 2 (wavelength / length of the wave)^2): one half at the wavelength, 0.84 at twice and 0.06 at half of it.
fn gauss(wavelength: f64, wavenumber: f64) -> f64 {
    let waves = wavenumber * wavelength / std::f64::consts::TAU;
    (-std::f64::consts::LN_2 * waves * waves).exp()
}

impl PreparedField {
    /// The field with waves shorter than `wavelength` metres weakened: a Gaussian in the wavenumber whose amplitude is one
    /// half at the wavelength, 0.84 at twice and 0.06 at half of it. The plane passes unchanged.
    ///
    /// The roll-off is gentle on purpose. In space the filter is a mean under Gaussian weights, all of them positive
    /// (standard deviation sqrt(ln 2 / 2) / pi = 0.187 wavelengths), so that it cannot overshoot or ring beside a step;
    /// a steep cut-off does both and draws margins where there are none.
    ///
    /// Source: the transform pair of the Gaussian; Blakely (1995), chapter 12, on filters in the wavenumber domain.
    ///
    /// # Errors
    /// A wavelength that is not finite, under two cells or over twice the longer side of the layer.
    pub fn low_pass(&self, wavelength: f64) -> Result<Self> {
        let wavelength = self.checked_wavelength(wavelength)?;
        self.filtered(self.plane(), |wave| Complex64::new(gauss(wavelength, wave.length), 0.0))
    }

    /// The field with waves between `short` and `long` metres: the low pass at `short` less the low pass at `long`
    /// ([`Self::low_pass`]). The amplitude at each end is one half, less (at `short`) the small part
    /// 2^-(long/short)^2 that the second filter still holds there. The plane is dropped.
    ///
    /// Any band pass turns one step into a pair of swings; this one has one on each side of the step and no more.
    ///
    /// # Errors
    /// A wavelength that [`Self::low_pass`] refuses, or `long` that is not longer than `short`.
    pub fn band_pass(&self, short: f64, long: f64) -> Result<Self> {
        let (short, long) = (self.checked_wavelength(short)?, self.checked_wavelength(long)?);
        if long <= short {
            return Err(Error::input("the wavelengths of a band pass")
                .found(format!("a short end of {short} m and a long end of {long} m"))
                .wanted("a long end that is longer than the short end")
                .mend("exchange them, or use a low pass for one wavelength"));
        }
        self.filtered(Plane::flat(0.0), |wave| {
            Complex64::new(gauss(short, wave.length) - gauss(long, wave.length), 0.0)
        })
    }

    /// A wavelength that the layer can hold: two cells to twice the longer side, beyond which a wave is a slope.
    fn checked_wavelength(&self, wavelength: f64) -> Result<f64> {
        let wavelength = checked_positive(wavelength, "the wavelength of a filter", "metres")?;
        let frame = self.frame();
        let (least, most) = (2.0 * frame.cell, 2.0 * frame.cell * frame.rows.max(frame.cols) as f64);
        if !(least..=most).contains(&wavelength) {
            return Err(Error::input("the wavelength of a filter")
                .found(format!("{wavelength} m"))
                .wanted(format!("{least} m (two cells) to {most} m (twice the longer side of the layer)"))
                .mend("choose a wavelength that the layer can hold"));
        }
        Ok(wavelength)
    }
}
