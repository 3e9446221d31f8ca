//! Whether a crest stands out from its own flanks, and not only from zero.

use ndarray::Array2;

use crate::field::Gradient;

/// How many cells the field is followed across a crest on each side.
const REACH: usize = 64;

/// What is asked of the values across a crest.
#[derive(Debug, Clone, Copy)]
pub(super) struct Prominence {
    /// By how much the magnitude must fall on each side of a crest, units of the field per metre.
    pub fall: f64,
    /// By how much it may rise above the crest before it has fallen that far.
    pub rise: f64,
    /// What holds where the data end before either has happened.
    pub at_end: bool,
}

impl Prominence {
    /// True if the gradient magnitude, followed from a crest up and down the slope of the field, falls by `fall` on both
    /// sides, within 64 cells and before it rises by more than `rise`, both times `growth`.
    ///
    /// On the flank of a strong anomaly the gradient is far from zero, so that any bump of noise there is a crest of a
    /// significant gradient; but uphill of it the magnitude only rises.
    pub fn holds(&self, gradient: &Gradient, strength: &Array2<f64>, cell: (usize, usize), growth: f64) -> bool {
        let (east, north, top) = (gradient.east()[cell], gradient.north()[cell], strength[cell]);
        let (down, across) = (-north / top, east / top);
        [1.0, -1.0].into_iter().all(|side| {
            for step in 1..=REACH {
                let by = side * step as f64;
                let row = cell.0.wrapping_add_signed((by * down).round() as isize);
                let col = cell.1.wrapping_add_signed((by * across).round() as isize);
                match strength.get((row, col)) {
                    Some(value) if value.is_finite() => {
                        if *value > top + growth * self.rise {
                            return false;
                        }
                        if *value < top - growth * self.fall {
                            return true;
                        }
                    }
                    _ => return self.at_end,
                }
            }
            false
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::grid::Frame;

    #[test]
    fn a_bump_on_a_flank_does_not_stand_out() {
        // A ridge along column 20 that falls by 1 in each cell, with a bump of 2.5 on its eastern flank.
        let mut east = Array2::from_shape_fn((9, 41), |(_, col)| 30.0 - (col as f64 - 20.0).abs());
        east[[4, 26]] += 2.5;
        let zero = || Array2::zeros((9, 41));
        let gradient = Gradient::new(Frame::local(1.0, 9, 41).unwrap(), east.clone(), zero(), zero()).unwrap();
        let asked = |fall, rise, at_end| Prominence { fall, rise, at_end };
        assert!(asked(5.0, 0.0, false).holds(&gradient, &east, (4, 20), 1.0));
        assert!(!asked(5.0, 0.0, false).holds(&gradient, &east, (4, 26), 1.0));
        assert!(asked(1.0, 0.0, false).holds(&gradient, &east, (4, 26), 1.0));
        // The ridge falls by 20 before the data end.
        assert!(!asked(21.0, 0.0, false).holds(&gradient, &east, (4, 20), 1.0));
        assert!(asked(21.0, 0.0, true).holds(&gradient, &east, (4, 20), 1.0));
        // One cell beside the ridge the magnitude rises by 1.
        assert!(!asked(0.0, 0.5, false).holds(&gradient, &east, (4, 21), 1.0));
        assert!(asked(3.0, 1.5, false).holds(&gradient, &east, (4, 21), 1.0));
    }
}
