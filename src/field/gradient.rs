//! The gradient of a potential field and the edge strengths made from it.

use ndarray::{Array2, Zip};

use super::SecondDerivatives;
use crate::error::{Error, Result};
use crate::grid::Frame;

/// The three first derivatives of a field on a frame, in units of the field per metre; NaN outside the footprint.
#[derive(Debug, Clone)]
pub struct Gradient {
    frame: Frame,
    east: Array2<f64>,
    north: Array2<f64>,
    down: Array2<f64>,
}

impl Gradient {
    /// Joins derivatives toward east, toward grid north and downward.
    ///
    /// # Errors
    /// When a shape is not the frame's.
    pub fn new(frame: Frame, east: Array2<f64>, north: Array2<f64>, down: Array2<f64>) -> Result<Self> {
        for part in [&east, &north, &down] {
            if part.dim() != frame.shape() {
                return Err(Error::ours("joining derivatives with a frame")
                    .found(format!("{:?} values", part.dim()))
                    .wanted(format!("{:?}", frame.shape())));
            }
        }
        Ok(Self { frame, east, north, down })
    }

    /// The frame.
    pub fn frame(&self) -> &Frame {
        &self.frame
    }

    /// The derivative toward east.
    pub fn east(&self) -> &Array2<f64> {
        &self.east
    }

    /// The derivative toward grid north.
    pub fn north(&self) -> &Array2<f64> {
        &self.north
    }

    /// The derivative downward: positive over a dense body for gravity.
    pub fn down(&self) -> &Array2<f64> {
        &self.down
    }

    /// The horizontal gradient magnitude, units of the field per metre.
    ///
    /// Source: Cordell & Grauch (1985); Blakely & Simpson (1986), Geophysics 51, 1494-1498.
    pub fn horizontal(&self) -> Array2<f64> {
        Zip::from(&self.east).and(&self.north).par_map_collect(|east, north| east.hypot(*north))
    }

    /// The tilt angle atan2(down, horizontal), degrees in [-90, 90]: positive over a body, near zero at its margin.
    ///
    /// Source: Miller & Singh (1994), Journal of Applied Geophysics 32, 213-217.
    pub fn tilt(&self) -> Array2<f64> {
        Zip::from(&self.east)
            .and(&self.north)
            .and(&self.down)
            .par_map_collect(|east, north, down| down.atan2(east.hypot(*north)).to_degrees())
    }

    /// The length of the three-dimensional gradient (3-D analytic signal), units of the field per metre.
    ///
    /// Source: Roest, Verhoef & Pilkington (1992), Geophysics 57, 116-125.
    pub fn total(&self) -> Array2<f64> {
        Zip::from(&self.east)
            .and(&self.north)
            .and(&self.down)
            .par_map_collect(|east, north, down| east.hypot(*north).hypot(*down))
    }

    /// The cosine of the angle between gradient and horizontal (theta map), in [0, 1]: near 1 at a margin; NaN where the
    /// gradient vanishes.
    ///
    /// Source: Wijns, Perez & Kowalczyk (2005), Geophysics 70, L39-L43.
    pub fn theta(&self) -> Array2<f64> {
        self.horizontal() / self.total()
    }

    /// The horizontal gradient magnitude of the tilt angle, radians per metre: a crest over a margin, of height 1 / depth
    /// over a vertical contact, whatever its contrast. NaN where the horizontal gradient vanishes, as the tilt has a kink
    /// there.
    ///
    /// `second` holds the second derivatives of the same field at the same height. With h the horizontal gradient
    /// magnitude and d the derivative downward, the slope of tilt is (h grad d - d grad h) / (h^2 + d^2), and grad h comes
    /// from the second derivatives, so that no difference between cells is taken.
    ///
    /// Source: Verduzco, Fairhead, Green & MacKenzie (2004), The Leading Edge 23, 116-119.
    ///
    /// # Errors
    /// When the second derivatives stand on another frame.
    pub fn tilt_gradient(&self, second: &SecondDerivatives) -> Result<Array2<f64>> {
        if second.frame() != &self.frame {
            return Err(Error::ours("the gradient of the tilt")
                .found(format!("second derivatives of {:?} cells on another frame", second.frame().shape()))
                .wanted(format!("those of the same field, {:?} cells", self.frame.shape())));
        }
        let mut slope = Array2::from_elem(self.frame.shape(), f64::NAN);
        Zip::indexed(&mut slope).par_for_each(|cell, slope| {
            let (east, north, down) = (self.east[cell], self.north[cell], self.down[cell]);
            let level = east.hypot(north);
            if level > 0.0 {
                let across = |along: f64, other: f64, toward_down: f64| {
                    let change = (east * along + north * other) / level;
                    (level * toward_down - down * change) / (level * level + down * down)
                };
                let mixed = second.east_north()[cell];
                let toward_east = across(second.east_east()[cell], mixed, second.east_down()[cell]);
                let toward_north = across(mixed, second.north_north()[cell], second.north_down()[cell]);
                *slope = toward_east.hypot(toward_north);
            }
        });
        Ok(slope)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    fn example() -> Gradient {
        let frame = Frame::local(1.0, 1, 2).unwrap();
        Gradient::new(frame, array![[3.0, f64::NAN]], array![[4.0, 0.0]], array![[-5.0, 1.0]]).unwrap()
    }

    #[test]
    fn edge_strengths_of_a_right_triangle() {
        // Source: 3, 4, 5 and a 45 degree triangle; missing stays missing.
        let gradient = example();
        assert_eq!(gradient.horizontal()[[0, 0]], 5.0);
        assert!((gradient.tilt()[[0, 0]] + 45.0).abs() < 1e-12);
        assert!((gradient.total()[[0, 0]] - 50.0_f64.sqrt()).abs() < 1e-12);
        assert!((gradient.theta()[[0, 0]] - 0.5_f64.sqrt()).abs() < 1e-12);
        for strength in [gradient.horizontal(), gradient.tilt(), gradient.total(), gradient.theta()] {
            assert!(strength[[0, 1]].is_nan());
        }
    }

    #[test]
    fn shapes_must_agree() {
        let frame = Frame::local(1.0, 2, 2).unwrap();
        let (right, wrong) = (Array2::zeros((2, 2)), Array2::zeros((2, 3)));
        assert!(Gradient::new(frame, right.clone(), right, wrong).is_err());
    }
}
