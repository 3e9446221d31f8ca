//! The fabric of a layer: the direction in which it runs, and how strongly, from the structure tensor.

use ndarray::{Array2, Axis, Zip};
use rayon::prelude::*;

use super::Gradient;
use super::check::checked_positive;
use crate::error::{Error, Result};

/// The window is cut at this many standard deviations, where the weight is 3e-4.
const REACH: f64 = 4.0;

/// Strike and coherence of a layer's fabric; NaN outside the footprint and where the layer has no slope.
#[derive(Debug, Clone)]
pub struct Fabric {
    /// The direction along which the layer changes least, degrees clockwise from grid north in [0, 180).
    pub strike: Array2<f64>,
    /// How far the slopes in the window agree on one axis, in [0, 1]: 1 for parallel contours, 0 for none preferred.
    pub coherence: Array2<f64>,
}

impl Fabric {
    /// The fabric of the field whose gradient is given, under a Gaussian window of standard deviation `window` metres.
    ///
    /// Steps: the products e^2, e n and n^2 of the slopes toward east and north; their means under the window, taken over
    /// the cells that hold a number and divided by the weight of those; the eigenvectors of the 2 x 2 tensor. Strike is
    /// across the larger one, coherence is the difference of the eigenvalues over their sum. Steep parts of the window
    /// count for more, as the square of their slope.
    ///
    /// Cost: two passes, along rows and along columns, each of 8 windows / cell multiplications per cell.
    ///
    /// Source: Bigun & Granlund (1987), First International Conference on Computer Vision, London, 433-438; Weickert (1999),
    /// International Journal of Computer Vision 31, 111-127.
    ///
    /// # Errors
    /// A window that is not positive and finite, under half a cell or over the longer side of the layer; slopes that are
    /// zero throughout (a constant layer) or missing throughout.
    pub fn of(gradient: &Gradient, window: f64) -> Result<Self> {
        let window = checked_positive(window, "the window of a fabric", "metres")?;
        let frame = gradient.frame();
        let (least, most) = (0.5 * frame.cell, frame.cell * frame.rows.max(frame.cols) as f64);
        if !(least..=most).contains(&window) {
            return Err(Error::input("the window of a fabric")
                .found(format!("{window} m"))
                .wanted(format!("{least} m (half a cell) to {most} m (the longer side of the layer)"))
                .mend("choose a window of a few cells"));
        }
        let steepest = Zip::from(gradient.east())
            .and(gradient.north())
            .fold(f64::NAN, |most, east, north| most.max(east.abs().max(north.abs()) + 0.0 * (east + north)));
        if steepest.is_nan() || steepest == 0.0 {
            let found = if steepest == 0.0 { "the layer is constant" } else { "no cell that holds a number" };
            return Err(Error::input("the fabric of a layer")
                .found(found)
                .wanted("a layer that varies")
                .mend("check the layer, its no-data value and its band"));
        }
        let weights = weights(window / frame.cell);
        let mean = |of: &(dyn Fn(f64, f64) -> f64 + Sync)| -> Result<Array2<f64>> {
            // Scaled by the steepest slope, so that squares neither vanish nor overflow.
            let values = Zip::from(gradient.east()).and(gradient.north()).par_map_collect(|east, north| {
                let value = of(east / steepest, north / steepest);
                if (east + north).is_finite() { value } else { 0.0 }
            });
            blurred(&values, &weights)
        };
        // The weight of the cells that hold a number divides out of strike and coherence, which are ratios.
        let (ee, en, nn) = (mean(&|e, _| e * e)?, mean(&|e, n| e * n)?, mean(&|_, n| n * n)?);
        let mut strike = Array2::from_elem(frame.shape(), f64::NAN);
        let mut coherence = strike.clone();
        Zip::indexed(&mut strike).and(&mut coherence).par_for_each(|cell, strike, coherence| {
            let slope = gradient.east()[cell] + gradient.north()[cell];
            let sum = ee[cell] + nn[cell];
            if slope.is_finite() && sum > 0.0 {
                let (cosine, sine) = (ee[cell] - nn[cell], 2.0 * en[cell]);
                // The slope stands at half this angle counter-clockwise from east, the strike a quarter turn farther, which
                // is the negative of the angle when counted clockwise from north.
                let clockwise = -0.5 * sine.atan2(cosine).to_degrees();
                let turned = clockwise.rem_euclid(180.0);
                *strike = if turned < 180.0 { turned } else { 0.0 };
                *coherence = (cosine.hypot(sine) / sum).min(1.0);
            }
        });
        Ok(Self { strike, coherence })
    }
}

/// Half of a Gaussian window with its middle first; `spread` is its standard deviation in cells.
fn weights(spread: f64) -> Vec<f64> {
    let reach = (REACH * spread).ceil() as usize;
    (0..=reach).map(|step| (-0.5 * (step as f64 / spread).powi(2)).exp()).collect()
}

/// Sums under the window along the rows, then along the columns; cells outside the array count for nothing.
fn blurred(values: &Array2<f64>, weights: &[f64]) -> Result<Array2<f64>> {
    let (rows, cols) = values.dim();
    let mut along = Array2::zeros((rows, cols));
    along.axis_iter_mut(Axis(0)).into_par_iter().zip(values.axis_iter(Axis(0))).for_each(|(mut out, line)| {
        for (col, sum) in out.iter_mut().enumerate() {
            *sum = weights[0] * line[col];
            for (step, weight) in weights.iter().enumerate().skip(1) {
                let left = col.checked_sub(step).map_or(0.0, |at| line[at]);
                let right = line.get(col + step).copied().unwrap_or(0.0);
                *sum += weight * (left + right);
            }
        }
    });
    let mut across = Array2::zeros((rows, cols));
    across.axis_iter_mut(Axis(0)).into_par_iter().enumerate().for_each(|(row, mut out)| {
        out.assign(&along.row(row));
        out *= weights[0];
        for (step, weight) in weights.iter().enumerate().skip(1) {
            for at in [row.checked_sub(step), Some(row + step).filter(|at| *at < rows)].into_iter().flatten() {
                out.scaled_add(*weight, &along.row(at));
            }
        }
    });
    Ok(across)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Frame;

    /// A plane wave whose crests strike `strike` degrees, as its gradient.
    fn waves(strike: f64) -> Gradient {
        let frame = Frame::local(50.0, 60, 70).unwrap();
        let (sine, cosine) = strike.to_radians().sin_cos();
        // Across the strike: a quarter turn clockwise of it.
        let (east, north) = (cosine, -sine);
        let slope = |row: usize, col: usize| {
            let (x, y) = frame.position(row as f64, col as f64);
            ((east * x + north * y) / 130.0).cos() / 130.0
        };
        let part = |by: f64| Array2::from_shape_fn((60, 70), |(row, col)| by * slope(row, col));
        Gradient::new(frame.clone(), part(east), part(north), Array2::zeros((60, 70))).unwrap()
    }

    #[test]
    fn a_plane_wave_strikes_along_its_crests_at_every_angle() {
        // Source: the gradient of sin(n.x / 130) is along n everywhere.
        for step in 0..36 {
            let strike = 5.0 * step as f64;
            let fabric = Fabric::of(&waves(strike), 200.0).unwrap();
            for (found, coherence) in fabric.strike.iter().zip(&fabric.coherence) {
                let off = (found - strike + 90.0).rem_euclid(180.0) - 90.0;
                assert!(off.abs() < 1e-9 && (coherence - 1.0).abs() < 1e-12, "{strike}: {found} {coherence}");
                assert!((0.0..180.0).contains(found));
            }
        }
    }

    #[test]
    fn two_crossing_waves_have_the_coherence_of_their_strengths() {
        // Source: the tensor of a 3 : 1 mixture of two crossed slopes, diag(9, 1) / 2 on average: (9 - 1) / (9 + 1) = 0.8.
        let frame = Frame::local(10.0, 80, 80).unwrap();
        let part = |size: f64, toward_east: bool| {
            Array2::from_shape_fn((80, 80), |(row, col)| {
                let at = if toward_east { col } else { row };
                size * (std::f64::consts::TAU * at as f64 / 4.0 + 0.3).cos()
            })
        };
        let gradient = Gradient::new(frame, part(3.0, true), part(1.0, false), Array2::zeros((80, 80))).unwrap();
        let fabric = Fabric::of(&gradient, 60.0).unwrap();
        assert!((fabric.coherence[[40, 40]] - 0.8).abs() < 1e-6, "{}", fabric.coherence[[40, 40]]);
        assert!(fabric.strike[[40, 40]].min(180.0 - fabric.strike[[40, 40]]) < 1e-6);
    }

    #[test]
    fn gaps_neither_spread_nor_turn_the_fabric() {
        let whole = waves(35.0);
        let mut east = whole.east().clone();
        east.slice_mut(ndarray::s![20..30, 10..40]).fill(f64::NAN);
        let holed = Gradient::new(whole.frame().clone(), east, whole.north().clone(), whole.down().clone()).unwrap();
        let fabric = Fabric::of(&holed, 200.0).unwrap();
        for ((cell, strike), slope) in fabric.strike.indexed_iter().zip(holed.east()) {
            assert_eq!(strike.is_nan(), slope.is_nan(), "{cell:?}");
            assert!(slope.is_nan() || (strike - 35.0).abs() < 1e-9);
        }
    }

    #[test]
    fn each_bad_window_is_refused() {
        for window in [f64::NAN, f64::INFINITY, 0.0, -50.0, 24.0, 3501.0] {
            assert!(
                Fabric::of(&waves(0.0), window).unwrap_err().to_string().contains("window of a fabric"),
                "{window}"
            );
        }
    }

    #[test]
    fn a_constant_and_an_empty_layer_are_refused() {
        let flat = |value: f64| {
            let part = Array2::from_elem((9, 9), value);
            Gradient::new(Frame::local(1.0, 9, 9).unwrap(), part.clone(), part.clone(), part).unwrap()
        };
        assert!(Fabric::of(&flat(0.0), 2.0).unwrap_err().to_string().contains("the layer is constant"));
        assert!(Fabric::of(&flat(f64::NAN), 2.0).unwrap_err().to_string().contains("no cell that holds a number"));
    }
}
