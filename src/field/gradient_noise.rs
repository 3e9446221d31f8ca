//! What white noise in a layer becomes in its horizontal gradient, and how strong a crest it can feign.

use std::f64::consts::{LN_10, PI, TAU};

use super::LEAST_EXACT_INCLINATION;
use super::direction::MagneticDirections;
use super::spectrum::Wave;
use crate::error::{Error, Result};

/// Sectors of the angular integral, each with a five-point Gauss-Legendre rule; a multiple of 8, so that the corners of the
/// wavenumber square fall between them.
const SECTORS: usize = 64;

/// Nodes and weights of the Gauss-Legendre rule of five points on [-1, 1] (Abramowitz & Stegun 1964, table 25.4).
const RULE: [(f64, f64); 5] = [
    (-0.906_179_845_938_664, 0.236_926_885_056_189),
    (-0.538_469_310_105_683, 0.478_628_670_499_366),
    (0.0, 0.568_888_888_888_889),
    (0.538_469_310_105_683, 0.478_628_670_499_366),
    (0.906_179_845_938_664, 0.236_926_885_056_189),
];

/// The noise of a horizontal gradient that comes from white noise in the layer: independent, Gaussian, of one standard
/// deviation in all cells.
///
/// A component has the variance
///
/// sigma^2 (cell / 2 pi)^2 times the integral of |F(k)|^2 k_east^2 exp(-2 |k| height) over |k_east|, |k_north| < pi / cell,
///
/// F being the product that the gradient is taken of (1 for the field itself). Its radial part is an incomplete gamma
/// function in closed form; the angular part is integrated numerically. Under F = 1 and height 0 it is
/// sigma^2 pi^2 / (3 cell^2). If both components have the standard deviation s, the magnitude has the tail of Rayleigh
/// (1880), exp(-t^2 / 2 s^2); where they differ, s is that of the noisiest direction and the tail an upper bound.
#[derive(Debug, Clone, PartialEq)]
pub struct GradientNoise {
    pub(super) sigma: f64,
    component: f64,
    /// Mean squared wavenumber of the noise along one axis, times the area of a cell.
    bend: f64,
    cell: f64,
    height: f64,
    /// Excess of the variance inside the northern, southern, western and eastern edge, by the distance from it in cells; the
    /// last holds from there on.
    pub(super) excess: [Vec<f64>; 4],
}

impl GradientNoise {
    /// For the gradient of the field itself, `height` metres up. `sigma` is the noise in each cell in units of the field,
    /// `cell` the side of a cell, m.
    ///
    /// # Errors
    /// A `sigma` or height that is negative or not finite, a cell that is not positive and finite.
    pub fn of_field(sigma: f64, cell: f64, height: f64) -> Result<Self> {
        Self::new(sigma, cell, height, 1, |_| 1.0)
    }

    /// For the gradient of the first vertical derivative.
    ///
    /// # Errors
    /// As [`Self::of_field`].
    pub fn of_vertical(sigma: f64, cell: f64, height: f64) -> Result<Self> {
        Self::new(sigma, cell, height, 2, |_| 1.0)
    }

    /// For the gradient of a magnetic layer (noise in nT) reduced to the pole.
    ///
    /// # Errors
    /// As [`Self::of_field`].
    pub fn of_pole(sigma: f64, cell: f64, height: f64, directions: MagneticDirections) -> Result<Self> {
        Self::new(sigma, cell, height, 1, |wave| directions.to_pole(wave, LEAST_EXACT_INCLINATION).norm_sqr())
    }

    /// For the gradient of the pseudo-gravity (mGal) of a magnetic layer (noise in nT); `ratio` in kg/m3 per A/m.
    ///
    /// # Errors
    /// As [`Self::of_field`].
    pub fn of_pseudo_gravity(
        sigma: f64,
        cell: f64,
        height: f64,
        directions: MagneticDirections,
        ratio: f64,
    ) -> Result<Self> {
        Self::of_magnetics((sigma, cell, height), 0, directions, ratio)
    }

    /// For the gradient of the first vertical derivative of the pseudo-gravity, mGal/m, of a magnetic layer.
    ///
    /// # Errors
    /// As [`Self::of_pseudo_gravity`].
    pub fn of_vertical_pseudo_gravity(
        sigma: f64,
        cell: f64,
        height: f64,
        directions: MagneticDirections,
        ratio: f64,
    ) -> Result<Self> {
        Self::of_magnetics((sigma, cell, height), 1, directions, ratio)
    }

    /// For pseudo-gravity after `order` vertical derivatives.
    fn of_magnetics(
        (sigma, cell, height): (f64, f64, f64),
        order: i32,
        directions: MagneticDirections,
        ratio: f64,
    ) -> Result<Self> {
        let ratio = super::pole::checked_ratio(ratio)?;
        Self::new(sigma, cell, height, order, |wave| directions.to_pseudo_gravity(ratio, wave).norm_sqr())
    }

    /// For |F|^2 |k|^2 = gain(direction) |k|^(2 order), where `gain` is given waves of unit length.
    fn new(sigma: f64, cell: f64, height: f64, order: i32, gain: impl Fn(Wave) -> f64) -> Result<Self> {
        for (name, value, positive) in [
            ("the noise of a layer", sigma, false),
            ("the height of a noise", height, false),
            ("the cell of a noise", cell, true),
        ] {
            if !(value.is_finite() && value >= 0.0 && !(positive && value == 0.0)) {
                return Err(Error::input(name)
                    .found(value)
                    .wanted(if positive { "a positive number" } else { "zero or a positive number" })
                    .mend("give the noise in units of the layer, heights and cells in metres"));
            }
        }
        // Wavenumbers in radians per cell from here on.
        let decay = 2.0 * height / cell;
        let (mut east, mut north, mut both, mut next) = (0.0, 0.0, 0.0, 0.0);
        for sector in 0..SECTORS {
            for (node, weight) in RULE {
                let half = TAU / SECTORS as f64 / 2.0;
                let angle = (2 * sector + 1) as f64 * half + node * half;
                let (sin, cos) = angle.sin_cos();
                let reach = PI / sin.abs().max(cos.abs());
                let share = half * weight * gain(Wave { east: cos, north: sin, length: 1.0 });
                let power = share * radial(2 * order + 1, decay, reach);
                east += cos * cos * power;
                north += sin * sin * power;
                both += sin * cos * power;
                next += share * radial(2 * order + 3, decay, reach);
            }
        }
        // The larger eigenvalue of the covariance of the two components.
        let largest = (east + north) / 2.0 + ((east - north) / 2.0).hypot(both);
        let variance = largest * cell.powi(2 - 2 * order) / (TAU * TAU) / (cell * cell);
        Ok(Self {
            sigma,
            component: sigma * variance.sqrt(),
            bend: next / (east + north) / 2.0,
            cell,
            height,
            excess: [vec![0.0], vec![0.0], vec![0.0], vec![0.0]],
        })
    }

    /// Standard deviation of a horizontal component, units of the field per metre (of the noisiest direction).
    pub fn component(&self) -> f64 {
        self.component
    }

    /// The height that it holds for, m.
    pub fn height(&self) -> f64 {
        self.height
    }

    /// log10 of the chance that noise alone gives at least this magnitude in a given cell; minus infinity for a layer
    /// without noise. `strength` in units of the field per metre.
    pub fn log10_p(&self, strength: f64) -> f64 {
        if strength <= 0.0 { 0.0 } else { -(strength / self.component).powi(2) / (2.0 * LN_10) }
    }

    /// As [`Self::log10_p`], for the strongest of a layer of `cells` cells: at most 0.
    pub fn log10_p_layer(&self, strength: f64, cells: usize) -> f64 {
        (self.log10_p(strength) + self.independent_cells(strength, cells).log10()).min(0.0)
    }

    /// How many independent cells a layer of `cells` cells counts for at this magnitude.
    ///
    /// At u = strength / component it is cells x cell^2 x m (u^2 - 1) / 2 pi, with m the mean squared wavenumber of the
    /// noise along an axis: the expected Euler characteristic of where the magnitude exceeds u is that number times the
    /// Rayleigh tail (Worsley 1994, Advances in Applied Probability 26, 13-42, from memory). Never more than `cells`, which
    /// is the plain bound of Bonferroni, nor less than one.
    pub fn independent_cells(&self, strength: f64, cells: usize) -> f64 {
        let u = strength / self.component;
        let cells = cells as f64;
        if u.is_finite() {
            (cells * self.bend * (u * u - 1.0) / TAU).clamp(1.0, cells.max(1.0))
        } else {
            cells.max(1.0)
        }
    }

    /// The magnitude that noise alone exceeds in a given cell with the chance `level` (between 0 and 1).
    pub fn pointwise_bound(&self, level: f64) -> f64 {
        self.component * (-2.0 * level.ln()).max(0.0).sqrt()
    }

    /// The magnitude that noise alone exceeds anywhere in a layer of `cells` cells with a chance of at most `level`.
    pub fn layer_bound(&self, level: f64, cells: usize) -> f64 {
        // The bound falls as the magnitude grows; 40 standard deviations lie beyond any layer.
        let (mut low, mut high) = (0.0, 40.0);
        for _ in 0..60 {
            let middle = (low + high) / 2.0;
            if self.component > 0.0 && self.log10_p_layer(middle * self.component, cells) > level.log10() {
                low = middle;
            } else {
                high = middle;
            }
        }
        high * self.component
    }

    /// The deviation in a cell of a layer of `shape` over [`Self::component`]: 1 unless [`Self::near_edges`] has measured more.
    pub(crate) fn growth(&self, (rows, cols): (usize, usize), (row, col): (usize, usize)) -> f64 {
        // What the four edges share in the middle counts once, what each adds near it is added.
        let (mut shared, mut added) = (0.0_f64, 0.0);
        for (excess, from_edge) in self.excess.iter().zip([row, rows - 1 - row, col, cols - 1 - col]) {
            let last = excess[excess.len() - 1];
            shared = shared.max(last);
            added += excess[from_edge.min(excess.len() - 1)] - last;
        }
        (1.0 + shared + added).sqrt()
    }

    /// Cells along the edge of the frame where no line may start, because what lies outside is made up from what lies
    /// inside: the noise of the gradient is larger there.
    pub(crate) fn edge(&self) -> usize {
        2 + (self.height / self.cell).ceil() as usize
    }
}

/// The integral of k^power exp(-decay k) from 0 to `reach`, for odd `power` from 1 to 7.
fn radial(power: i32, decay: f64, reach: f64) -> f64 {
    let x = decay * reach;
    if x < 1.0 {
        // The exponential as a series, term by term.
        let (mut term, mut sum) = (reach.powi(power + 1), 0.0);
        for n in 0..30 {
            sum += term / f64::from(power + 1 + n);
            term *= -x / f64::from(n + 1);
        }
        return sum;
    }
    // power! / decay^(power + 1) times (1 - exp(-x) times the first terms of exp(x)).
    let (mut term, mut first, mut factorial) = (1.0, 1.0, 1.0);
    for n in 1..=power {
        term *= x / f64::from(n);
        first += term;
        factorial *= f64::from(n);
    }
    factorial / decay.powi(power + 1) * (1.0 - (-x).exp() * first)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::field::Direction;
    use crate::field::PreparedField;
    use crate::field::chance::gaussian;
    use crate::grid::{Frame, Grid};

    const CELL: f64 = 50.0;

    #[test]
    fn each_bad_number_is_refused() {
        let refused = |sigma, cell, height| GradientNoise::of_field(sigma, cell, height).unwrap_err().to_string();
        for bad in [f64::NAN, f64::INFINITY, -1.0] {
            assert!(refused(bad, 1.0, 0.0).contains("the noise of a layer"));
            assert!(refused(1.0, bad, 0.0).contains("the cell"));
            assert!(refused(1.0, 1.0, bad).contains("the height"));
        }
        assert!(refused(1.0, 0.0, 0.0).contains("the cell"));
        let field = MagneticDirections::induced(Direction::new(60.0, 0.0).unwrap());
        assert!(GradientNoise::of_pseudo_gravity(1.0, 1.0, 0.0, field, f64::NAN).is_err());
    }

    #[test]
    fn without_continuation_the_integral_is_known() {
        // Source: the mean of k_east^2 over the square is (pi / cell)^2 / 3; that of k_east^2 k^2 is
        // (pi / cell)^4 (1/5 + 1/9).
        let plain = GradientNoise::of_field(2.0, CELL, 0.0).unwrap().component();
        assert!((plain / (2.0 * PI / CELL / 3.0_f64.sqrt()) - 1.0).abs() < 1e-9, "{plain}");
        let vertical = GradientNoise::of_vertical(2.0, CELL, 0.0).unwrap().component();
        assert!((vertical / (2.0 * (PI / CELL).powi(2) * (14.0_f64 / 45.0).sqrt()) - 1.0).abs() < 1e-9, "{vertical}");
    }

    #[test]
    fn far_up_the_square_is_as_good_as_the_plane() {
        // Source: over the whole plane the integral of k_east^2 exp(-2 k h) is pi 3! / (2 h)^4.
        let height = 12.0 * CELL;
        let exact = CELL / TAU * (6.0 * PI).sqrt() / (2.0 * height).powi(2);
        let found = GradientNoise::of_field(1.0, CELL, height).unwrap();
        assert!((found.component() / exact - 1.0).abs() < 1e-9);
        // <k^2> / 2 = 5! / (2 h)^6 over 3! / (2 h)^4, halved: 2.5 / h^2.
        assert!((found.bend / (2.5 / 144.0) - 1.0).abs() < 1e-9);
    }

    #[test]
    fn the_two_forms_of_the_radial_integral_meet() {
        for power in [1, 3, 5, 7] {
            let (below, above) = (radial(power, 0.999_999_999, 1.0), radial(power, 1.0, 1.0));
            assert!((below / above - 1.0).abs() < 1e-6, "{power}: {below} {above}");
        }
    }

    #[test]
    fn transforms_of_noise_have_the_stated_spread() {
        // Source: Monte Carlo; the interior of one layer of 512 x 512 cells whose noise fades toward the edge, so that the
        // padding, which is no part of the formula, has nothing to carry outward.
        let frame = Frame::local(CELL, 512, 512).unwrap();
        let mut values = gaussian((512, 512), 11) * 3.0;
        for ((row, col), value) in values.indexed_iter_mut() {
            let inside = row.min(col).min(511 - row).min(511 - col);
            *value *= (inside as f64 / 40.0).min(1.0);
        }
        let layer = PreparedField::new(&Grid::new(frame, values).unwrap()).unwrap();
        let inducing = MagneticDirections::induced(Direction::new(50.0, 20.0).unwrap());
        let inner = ndarray::s![60..452, 60..452];
        for cells_up in [0.0, 1.0, 3.0] {
            let height = cells_up * CELL;
            let products = [
                (layer.clone(), GradientNoise::of_field(3.0, CELL, height)),
                (layer.to_pole(inducing).unwrap(), GradientNoise::of_pole(3.0, CELL, height, inducing)),
                (
                    layer.to_pseudo_gravity(inducing, 2.0).unwrap(),
                    GradientNoise::of_pseudo_gravity(3.0, CELL, height, inducing, 2.0),
                ),
            ];
            for (at, (product, noise)) in products.into_iter().enumerate() {
                let gradient = product.gradient(height).unwrap();
                let (east, north) = (gradient.east().slice(inner), gradient.north().slice(inner));
                let count = east.len() as f64;
                let over = |a: &ndarray::ArrayView2<f64>, b: &ndarray::ArrayView2<f64>| (a * b).sum() / count;
                let (ee, nn, en) = (over(&east, &east), over(&north, &north), over(&east, &north));
                let measured = ((ee + nn) / 2.0 + ((ee - nn) / 2.0).hypot(en)).sqrt();
                let ratio = measured / noise.unwrap().component();
                println!("product {at}, {cells_up} cells up: measured over stated {ratio:.4}");
                assert!((ratio - 1.0).abs() < 0.03, "product {at}, {cells_up} cells up: {ratio}");
            }
        }
    }

    #[test]
    fn the_bounds_hold_their_levels() {
        // Source: the tail of Rayleigh, exp(-u^2 / 2), and the bound of Bonferroni.
        let noise = GradientNoise::of_field(1.0, 1.0, 0.0).unwrap();
        let u = noise.pointwise_bound(0.05) / noise.component();
        assert!(((-u * u / 2.0).exp() - 0.05).abs() < 1e-12);
        let u = noise.layer_bound(0.05, 10_000) / noise.component();
        assert!((10_000.0 * (-u * u / 2.0).exp() - 0.05).abs() < 1e-9);
        assert!((noise.log10_p_layer(u * noise.component(), 10_000) - 0.05_f64.log10()).abs() < 1e-9);
        let above = GradientNoise::of_field(1.0, 1.0, 20.0).unwrap();
        assert!(above.layer_bound(0.05, 10_000) / above.component() < u);
        let none = GradientNoise::of_field(0.0, 1.0, 0.0).unwrap();
        assert_eq!((none.layer_bound(0.05, 10_000), none.pointwise_bound(0.05)), (0.0, 0.0));
        assert_eq!((none.log10_p(1e-9), none.log10_p_layer(1e-9, 100)), (f64::NEG_INFINITY, f64::NEG_INFINITY));
        assert_eq!(none.log10_p(0.0), 0.0);
    }
}
