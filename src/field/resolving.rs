//! How fine a detail a layer resolves, and what makes two layers equally fine.

use super::PreparedField;
use crate::error::{Error, Result};
use crate::grid::Grid;

/// The share of the horizontal gradient's power that lies in waves longer than twice the resolving length.
const SHARE: f64 = 0.9;

/// Rings between zero and the highest wavenumber of the grid.
const RINGS: usize = 4096;

/// Beyond this share of the highest wavenumber, in the corners of the square, a layer holds noise and little else.
const CORNER: f64 = 0.85;

/// How many times the level of the noise a ring must carry to count.
const CLEAR: f64 = 1.5;

/// A search for a height or a width stops when it knows it to this share.
const PRECISION: f64 = 1e-6;

/// The power of a layer's horizontal gradient, ring by ring of the wavenumber.
///
/// The resolving length of a layer is half the wavelength beyond which nine tenths of that power lie: detail finer than
/// it is faint. For the straight edge of a sheet at depth z, whose gradient is z / (x^2 + z^2), the power falls as
/// exp(-2 k z), so the length is 2 pi z / ln 10 = 2.73 z. The share of nine tenths is our convention. White noise would
/// carry most of that power in the shortest waves, so its level, the mean power in the corners of the wavenumber square, is
/// taken off first, and waves that do not stand half above it count for nothing.
#[derive(Debug, Clone)]
pub struct GradientPower {
    /// Width of a ring, radians per metre.
    step: f64,
    power: Vec<f64>,
}

impl PreparedField {
    /// The power of the layer's horizontal gradient. The layer is taken as it was padded; its plane does not count.
    ///
    /// # Errors
    /// A layer without any gradient, such as a plane.
    pub fn gradient_power(&self) -> Result<GradientPower> {
        let highest = std::f64::consts::SQRT_2 * std::f64::consts::PI / self.frame().cell;
        let step = highest / RINGS as f64;
        // Of each ring the number of waves, their power and that of their gradients.
        let mut rings = vec![(0.0, 0.0, 0.0); RINGS];
        let mut waves = 0.0;
        self.for_each_power(|length, carried| {
            waves += 1.0;
            let ring = &mut rings[((length / step) as usize).min(RINGS - 1)];
            *ring = (ring.0 + 1.0, ring.1 + carried, ring.2 + length * length * carried);
        });
        let corner = &rings[(CORNER * RINGS as f64) as usize..];
        let (count, carried) = corner.iter().fold((0.0, 0.0), |sum, ring| (sum.0 + ring.0, sum.1 + ring.1));
        let floor = if count > 0.0 { carried / count } else { 0.0 };
        let above = |&(count, carried, gradient): &(f64, f64, f64)| {
            if carried > CLEAR * floor * count { gradient * (1.0 - floor * count / carried) } else { 0.0 }
        };
        let power: Vec<f64> = rings.iter().map(above).collect();
        let sum: f64 = power.iter().sum();
        // What a plane leaves behind is rounding, which its own slope measures (Parseval's theorem).
        let rounding = 1e-18 * (waves * self.slope()).powi(2);
        if sum.is_finite() && sum > rounding {
            return Ok(GradientPower { step, power });
        }
        Err(Error::input("the resolving length of a layer").found("no gradient but that of a plane").wanted("detail"))
    }

    /// The layer smoothed by a Gaussian of standard deviation `sigma` metres: exp(-k^2 sigma^2 / 2) in the spectrum.
    ///
    /// # Errors
    /// A width that is negative or not finite.
    pub fn smoothed(&self, sigma: f64) -> Result<Grid> {
        if !(sigma.is_finite() && sigma >= 0.0) {
            return Err(Error::input("the width of a smoothing")
                .found(sigma)
                .wanted("zero or a positive number of metres"));
        }
        self.faded(|length| (-0.5 * (length * sigma).powi(2)).exp())?.values()
    }
}

impl GradientPower {
    /// Half the wavelength, m, beyond which nine tenths of the power lie once each wave is multiplied by `keeps`.
    fn length_under(&self, keeps: impl Fn(f64) -> f64) -> f64 {
        let kept = |ring: usize| {
            let share = keeps((ring as f64 + 0.5) * self.step);
            self.power[ring] * share * share
        };
        let all: f64 = (0..RINGS).map(kept).sum();
        let mut below = 0.0;
        for ring in 0..RINGS {
            let next = below + kept(ring);
            if next >= SHARE * all {
                let part = (SHARE * all - below) / (next - below);
                return std::f64::consts::PI / ((ring as f64 + part) * self.step);
            }
            below = next;
        }
        std::f64::consts::PI / (RINGS as f64 * self.step)
    }

    /// The resolving length, m, of the layer continued upward by `height` metres.
    pub fn resolving_length(&self, height: f64) -> f64 {
        self.length_under(|length| (-length * height).exp())
    }

    /// The resolving length, m, of the layer smoothed by a Gaussian of standard deviation `sigma` metres.
    pub fn smoothed_length(&self, sigma: f64) -> f64 {
        self.length_under(|length| (-0.5 * (length * sigma).powi(2)).exp())
    }

    /// The height of upward continuation, m, at which the layer's resolving length reaches `length`; 0 if it is as long
    /// already.
    pub fn height_for(&self, length: f64) -> f64 {
        search(length, |height| self.resolving_length(height))
    }

    /// The standard deviation, m, of the Gaussian under which the layer's resolving length reaches `length`; 0 if it is as
    /// long already.
    pub fn sigma_for(&self, length: f64) -> f64 {
        search(length, |sigma| self.smoothed_length(sigma))
    }
}

/// Where a growing function reaches a length, between 0 and four times that length; bisection, since rings make it uneven.
fn search(length: f64, grows: impl Fn(f64) -> f64) -> f64 {
    let (mut low, mut high) = (0.0, 4.0 * length);
    if grows(low) >= length {
        return 0.0;
    }
    while high - low > PRECISION * length {
        let middle = 0.5 * (low + high);
        if grows(middle) < length {
            low = middle;
        } else {
            high = middle;
        }
    }
    high
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Frame;
    use ndarray::Array2;
    use std::f64::consts::PI;

    fn layer(of: impl Fn(f64, f64) -> f64) -> PreparedField {
        let frame = Frame::local(100.0, 256, 256).unwrap();
        let values = Array2::from_shape_fn((256, 256), |(row, col)| {
            let (x, y) = frame.position(row as f64, col as f64);
            of(x - 12_800.0, y - 12_800.0)
        });
        PreparedField::new(&Grid::new(frame, values).unwrap()).unwrap()
    }

    /// Gravity of a point mass at depth z: z / r^3.
    fn point(depth: f64) -> PreparedField {
        layer(|x, y| depth / (x * x + y * y + depth * depth).powf(1.5))
    }

    #[test]
    fn a_point_source_has_the_length_of_its_depth() {
        // Source: the spectrum of z / r^3 is 2 pi exp(-k z); the power of its gradient in a ring goes as k^3 exp(-2 k z), whose
        // share up to k is 1 - exp(-u)(1 + u + u^2/2 + u^3/6) with u = 2 k z (the gamma distribution of shape 4); nine tenths
        // lie below u = 6.6808 (scipy.stats.gamma(4).ppf(0.9) = 6.68078), so the length is pi 2 z / 6.6808.
        for depth in [600.0, 1000.0, 1800.0] {
            let expected = 2.0 * PI * depth / 6.680_78;
            let found = point(depth).gradient_power().unwrap().resolving_length(0.0);
            assert!((found / expected - 1.0).abs() < 0.02, "{depth}: {found} against {expected}");
        }
    }

    #[test]
    fn continuation_lengthens_as_depth_does_and_the_search_inverts_it() {
        // Source: a point source seen from higher up is a deeper one.
        let power = point(600.0).gradient_power().unwrap();
        let raised = power.resolving_length(700.0);
        assert!((raised / point(1300.0).gradient_power().unwrap().resolving_length(0.0) - 1.0).abs() < 0.02);
        let height = power.height_for(raised);
        assert!((height - 700.0).abs() < 1.0, "{height}");
        let sigma = power.sigma_for(raised);
        assert!((power.smoothed_length(sigma) / raised - 1.0).abs() < 1e-3);
        assert_eq!((power.height_for(10.0), power.sigma_for(10.0)), (0.0, 0.0));
    }

    #[test]
    fn smoothing_is_a_gaussian() {
        // Source: a Gaussian hill of width a under a Gaussian of width s is one of width sqrt(a^2 + s^2), its height times
        // a^2 / (a^2 + s^2).
        let (a, s) = (800.0_f64, 600.0_f64);
        let hill = |x: f64, y: f64, width: f64| (-(x * x + y * y) / (2.0 * width * width)).exp();
        let smooth = layer(|x, y| hill(x, y, a)).smoothed(s).unwrap();
        let wide = a.hypot(s);
        for ((row, col), value) in smooth.values().indexed_iter() {
            let (x, y) = smooth.frame().position(row as f64, col as f64);
            let expected = hill(x - 12_800.0, y - 12_800.0, wide) * (a / wide).powi(2);
            assert!((value - expected).abs() < 1e-4, "{row} {col}: {value} {expected}");
        }
        for bad in [f64::NAN, f64::INFINITY, -1.0] {
            assert!(point(600.0).smoothed(bad).is_err());
        }
    }

    #[test]
    fn a_plane_has_no_length() {
        let error = layer(|x, y| 0.5 * x - y).gradient_power().map(|_| ()).unwrap_err().to_string();
        assert!(error.contains("no gradient"), "{error}");
    }
}
