//! Downward continuation, which needs a regularisation.

use rustfft::num_complex::Complex64;

use super::PreparedField;
use super::check::checked_positive;
use crate::error::{Error, Result};

/// The search for a parameter ends when the misfit is this share from the noise.
const CLOSE: f64 = 0.01;

/// The most steps of that search; those seen took 3 to 7.
const MOST_STEPS: usize = 60;

/// Above this gain a stated noise level is not believed: on layers tried, a level 20 % too low asks for over 1,000.
const MOST_GAIN: f64 = 100.0;

/// How downward continuation is kept from blowing up the noise.
///
/// Tikhonov's solution of "the field that, continued upward by the depth, gives the data, and is not large itself":
/// exp(k h) / (1 + a exp(2 k h)). The parameter a follows from one number that a user can know.
///
/// Source: Tikhonov & Arsenin (1977), Solutions of Ill-Posed Problems; for downward continuation see Pasteka, Karcol,
/// Kusnirak & Mojzes (2012), Computers & Geosciences 49, 278-289, who use the same family.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Regularisation {
    /// No wave is magnified more than this many times (more than 1): a = 1 / (4 gain^2). A wave whose true gain is g comes
    /// out too weak by the factor 1 / (1 + g^2 / (4 gain^2)).
    LargestGain(f64),
    /// The standard deviation of the layer's noise, in its own unit: a is the number for which the result, continued
    /// upward again, misses the data by just that much (root mean square over the footprint; discrepancy principle,
    /// Morozov 1966). It errs on the smooth side. Rather state the noise too high than too low: on the field of a prism
    /// with 1 % of white noise, taken down four cells, the error was 0.0091 of the range (the best gain gives 0.0083), 0.0105
    /// with noise stated 20 % too high, and 0.17 with noise stated 10 % too low. Where the stated noise would let waves be
    /// magnified more than 100 times, it is refused.
    Noise(f64),
}

impl PreparedField {
    /// The field `depth` metres lower. The plane passes unchanged.
    ///
    /// Valid only above the sources: below the top of the shallowest one the result means nothing, whatever the
    /// regularisation. Cost: one transform for a largest gain, about eight for a noise level.
    ///
    /// # Errors
    /// A depth that is not positive and finite; a gain that is not a finite number above 1; a noise level that is not
    /// positive, so large that the layer holds nothing else, or so small that waves would be magnified over 100 times.
    pub fn downward(&self, depth: f64, regularisation: Regularisation) -> Result<Self> {
        let depth = checked_positive(depth, "the depth of a downward continuation", "metres")?;
        let parameter = match regularisation {
            Regularisation::LargestGain(gain) => parameter_of_gain(gain)?,
            Regularisation::Noise(noise) => self.believed(depth, noise, self.parameter_of_noise(depth, noise)?)?,
        };
        self.filtered(self.plane(), |wave| {
            // exp(k h) / (1 + a exp(2 k h)), written with exp(-k h) so that nothing overflows.
            let fade = (-wave.length * depth).exp();
            Complex64::new(fade / (fade * fade + parameter), 0.0)
        })
    }

    /// The parameter, if the gain that it allows can come from the noise of a layer. The steepest wave of the grid bounds
    /// the gain as well.
    fn believed(&self, depth: f64, noise: f64, parameter: f64) -> Result<f64> {
        let steepest = std::f64::consts::SQRT_2 * std::f64::consts::PI / self.frame().cell;
        let gain = (0.5 / parameter.sqrt()).min((steepest * depth).exp());
        if gain <= MOST_GAIN {
            return Ok(parameter);
        }
        Err(Error::input("the noise of a layer for downward continuation")
            .found(format!("{noise}, which would magnify the shortest waves {gain:.0} times"))
            .wanted(format!("a noise level that asks for a gain of at most {MOST_GAIN}"))
            .mend("state a higher noise level, or, if the layer is that clean, say how much gain it bears"))
    }

    /// The parameter under which upward continuation of the result misses the data by `noise`.
    fn parameter_of_noise(&self, depth: f64, noise: f64) -> Result<f64> {
        let noise = checked_positive(noise, "the noise of a layer", "its unit (standard deviation)")?;
        let misfit = |power: f64| -> Result<f64> {
            let parameter = power.exp();
            // The data less the result raised again: 1 - 1 / (1 + a exp(2 k h)).
            let rest = self.product(|wave| {
                let fade = (-wave.length * depth).exp();
                Complex64::new(parameter / (fade * fade + parameter), 0.0)
            })?;
            let (sum, count) = rest
                .iter()
                .filter(|value| value.is_finite())
                .fold((0.0, 0.0), |(sum, count), value| (sum + value * value, count + 1.0));
            Ok(((sum / count).sqrt() / noise).ln())
        };
        // The misfit grows with the parameter from 0 to the whole layer.
        let (mut low, mut high) = (1e-16_f64.ln(), 1e4_f64.ln());
        let (mut below, mut above) = (misfit(low)?, misfit(high)?);
        if above < 0.0 {
            return Err(Error::input("the noise of a layer for downward continuation")
                .found(noise)
                .wanted("less than the variation of the layer about its plane")
                .mend("give the standard deviation of the noise alone, in the unit of the layer"));
        }
        if below > 0.0 {
            // Noise smaller than what rounding leaves of the deepest waves: a lower parameter would only magnify rounding.
            return Ok(low.exp());
        }
        // False position, with the Illinois weight on an end that stays (Dowell & Jarratt 1971).
        let mut last = 0.0;
        for _ in 0..MOST_STEPS {
            let middle = (low * above - high * below) / (above - below);
            let found = misfit(middle)?;
            if found.abs() <= CLOSE {
                return Ok(middle.exp());
            }
            if found < 0.0 {
                (low, below) = (middle, found);
                if last < 0.0 {
                    above /= 2.0;
                }
            } else {
                (high, above) = (middle, found);
                if last > 0.0 {
                    below /= 2.0;
                }
            }
            last = found;
        }
        Err(Error::ours("the regularisation of a downward continuation")
            .found(format!("no parameter after {MOST_STEPS} steps"))
            .wanted(format!("a misfit of {noise}")))
    }
}

fn parameter_of_gain(gain: f64) -> Result<f64> {
    if gain.is_finite() && gain > 1.0 {
        return Ok(0.25 / (gain * gain));
    }
    Err(Error::input("the largest gain of a downward continuation")
        .found(gain)
        .wanted("a finite number above 1")
        .mend("say how many times a wave may be magnified, such as 20, or give the noise of the layer instead"))
}
