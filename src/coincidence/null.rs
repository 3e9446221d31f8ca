//! The distribution of a statistic over all admissible shifts, and where the observed value stands in it.

use ndarray::{Array2, Zip};

use crate::quantile::quantile_in_place;

/// The smallest p-value that the shift null resolves: below it the true rate was measured at up to twice the nominal.
pub const SMALLEST_P: f64 = 0.005;

/// Scores closer than this count as tied, so that rounding never decides a rank.
const TIE: f64 = 1e-9;

/// A statistic under the null of variance-corrected shifts without wrapping.
///
/// With T(s) the statistic at shift s, n(s) the cells in the overlap and the mean taken over all admissible shifts, the
/// one of zero included, the score is (T(s) - mean T) sqrt(n(s)), here divided by its own root mean square
/// (Mrkvicka, Dvorak, Gonzalez & Mateu 2021, doi:10.1016/j.spasta.2020.100430).
#[derive(Debug, Clone)]
pub struct ShiftNull {
    /// The statistic at no shift.
    pub observed: f64,
    /// Its mean over all admissible shifts.
    pub mean: f64,
    /// The 2.5 % point of the statistic under the null, for the overlap at no shift.
    pub low: f64,
    /// The 97.5 % point.
    pub high: f64,
    /// The score at no shift, in root mean squares.
    pub score: f64,
    /// (1 + number of shifts that score at least as high) / (1 + number of shifts).
    pub p: f64,
    /// How many admissible shifts there are where the statistic is defined, the one of zero left out.
    pub shifts: usize,
    /// The score at each shift, NaN where it is not admissible or not defined.
    pub scores: Array2<f64>,
}

impl ShiftNull {
    /// Builds the null from the statistic at each shift (NaN where not defined; larger means closer), the overlap in
    /// cells at each shift, and the admissible shifts; the shift of zero is at the centre of each array.
    ///
    /// Returns `None` where the statistic is not defined at no shift, has no other shift, or does not vary.
    pub fn new(statistic: &Array2<f64>, overlap: &Array2<f64>, allowed: &Array2<bool>) -> Option<Self> {
        let zero = [statistic.nrows() / 2, statistic.ncols() / 2];
        let observed = statistic[zero];
        let (mut count, mut mean) = (0usize, 0.0);
        Zip::from(statistic).and(allowed).for_each(|&value, &allowed| {
            if allowed && value.is_finite() {
                count += 1;
                mean += value;
            }
        });
        if !observed.is_finite() || !allowed[zero] || count < 2 {
            return None;
        }
        mean /= count as f64;
        let mut scores = Array2::from_elem(statistic.dim(), f64::NAN);
        let mut square = 0.0;
        Zip::from(&mut scores).and(statistic).and(overlap).and(allowed).for_each(|score, &value, &cells, &allowed| {
            if allowed && value.is_finite() {
                *score = (value - mean) * cells.sqrt();
                square += *score * *score;
            }
        });
        let spread = (square / count as f64).sqrt();
        let room = overlap[zero].sqrt();
        // Rounding leaves some 1e-16 of the size of the statistic where it does not vary at all.
        if spread.is_nan() || spread <= 1e-11 * room * mean.abs().max(observed.abs()) {
            return None;
        }
        scores.mapv_inplace(|score| score / spread);
        let mut finite: Vec<f64> = scores.iter().copied().filter(|score| score.is_finite()).collect();
        let score = scores[zero];
        Some(Self {
            observed,
            mean,
            low: mean + quantile_in_place(&mut finite, 0.025)? * spread / room,
            high: mean + quantile_in_place(&mut finite, 0.975)? * spread / room,
            score,
            p: rank_p(&finite, score),
            shifts: finite.len() - 1,
            scores,
        })
    }
}

/// p-value of a score against the scores of a null, the observed one being among them: (1 + b) / (1 + m).
pub(super) fn rank_p(scores: &[f64], score: f64) -> f64 {
    let as_high = scores.iter().filter(|other| **other >= score - TIE).count();
    as_high.max(1) as f64 / scores.len().max(1) as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    #[test]
    fn ranks_ties_and_the_overlap_are_counted_as_defined() {
        // Nine shifts of equal overlap; by hand: mean 2/3, three values reach the observed 2 (itself and two ties).
        let statistic = array![[0.0, 0.0, 2.0], [0.0, 2.0, 0.0], [2.0, 0.0, 0.0]];
        let null = ShiftNull::new(&statistic, &Array2::from_elem((3, 3), 25.0), &Array2::from_elem((3, 3), true));
        let null = null.unwrap();
        assert_eq!(null.shifts, 8);
        assert!((null.p - 3.0 / 9.0).abs() < 1e-15);
        assert!((null.mean - 2.0 / 3.0).abs() < 1e-15);
        // A smaller overlap brings a value of the same size nearer to the mean.
        let overlap = array![[25.0, 25.0, 16.0], [25.0, 25.0, 25.0], [16.0, 25.0, 25.0]];
        let null = ShiftNull::new(&statistic, &overlap, &Array2::from_elem((3, 3), true)).unwrap();
        assert!((null.p - 1.0 / 9.0).abs() < 1e-15);
        assert!((null.scores[[0, 2]] / null.score - 4.0 / 5.0).abs() < 1e-12);
    }

    #[test]
    fn undefined_and_forbidden_shifts_do_not_count() {
        let statistic = array![[f64::NAN, 9.0, 1.0], [0.0, 2.0, 0.0], [1.0, 0.5, 0.0]];
        let mut allowed = Array2::from_elem((3, 3), true);
        allowed[[0, 1]] = false;
        let null = ShiftNull::new(&statistic, &Array2::from_elem((3, 3), 4.0), &allowed).unwrap();
        assert_eq!(null.shifts, 6);
        assert!((null.p - 1.0 / 7.0).abs() < 1e-15);
        assert!(null.scores[[0, 0]].is_nan() && null.scores[[0, 1]].is_nan());
    }

    #[test]
    fn nothing_to_tell_gives_no_null() {
        let even = Array2::from_elem((3, 3), 4.0);
        let all = Array2::from_elem((3, 3), true);
        assert!(ShiftNull::new(&even, &even, &all).is_none(), "a constant statistic");
        assert!(ShiftNull::new(&(&even * f64::NAN), &even, &all).is_none(), "undefined at no shift");
        let mut only = Array2::from_elem((3, 3), false);
        only[[1, 1]] = true;
        assert!(ShiftNull::new(&even, &even, &only).is_none(), "no other shift");
    }
}
