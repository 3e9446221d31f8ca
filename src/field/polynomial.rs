//! Polynomials over the cells of a layer, and their least-squares equations.

use ndarray::{Array2, Axis};
use rayon::prelude::*;

/// The highest degree; above it a polynomial follows bodies, not the regional.
pub(super) const HIGHEST_DEGREE: usize = 3;

/// The number of coefficients of a polynomial of the highest degree in two coordinates.
const MOST_TERMS: usize = 10;

/// A pivot of the normalised normal equations below this means that the cells cannot tell the coefficients apart.
const LEAST_PIVOT: f64 = 1e-9;

/// A stretch of cells, scaled to -1 to 1.
struct Span {
    middle: f64,
    half: f64,
}

impl Span {
    fn new(first: usize, last: usize) -> Self {
        Self { middle: (first + last) as f64 / 2.0, half: ((last - first) as f64 / 2.0).max(0.5) }
    }

    /// Legendre polynomials of degree 0 to 3.
    fn legendre(&self, at: usize) -> [f64; HIGHEST_DEGREE + 1] {
        let x = (at as f64 - self.middle) / self.half;
        [1.0, x, 1.5 * x * x - 0.5, (2.5 * x * x - 1.5) * x]
    }
}

/// Products of Legendre polynomials up to a total degree.
pub(super) struct Basis {
    degree: usize,
    rows: Span,
    cols: Span,
}

/// One number for each coefficient; those beyond the degree stay zero.
pub(super) type Terms = [f64; MOST_TERMS];
/// A product for each pair of coefficients.
pub(super) type Products = [Terms; MOST_TERMS];

impl Basis {
    /// The basis up to `degree` over the cells from the first to the last row and column.
    pub fn new(degree: usize, rows: (usize, usize), cols: (usize, usize)) -> Self {
        Self { degree, rows: Span::new(rows.0, rows.1), cols: Span::new(cols.0, cols.1) }
    }

    fn at(&self, down: &[f64; HIGHEST_DEGREE + 1], across: &[f64; HIGHEST_DEGREE + 1]) -> Terms {
        let mut terms = [0.0; MOST_TERMS];
        let mut next = 0;
        for (power, down) in down.iter().enumerate().take(self.degree + 1) {
            for across in across.iter().take(self.degree + 1 - power) {
                terms[next] = down * across;
                next += 1;
            }
        }
        terms
    }

    /// Sums over the known cells, made row by row in parallel and joined in order.
    fn summed<T: Send>(
        &self,
        values: &Array2<f64>,
        zero: impl Fn() -> T + Sync,
        add: impl Fn(&mut T, &Terms, f64) + Sync,
    ) -> Vec<T> {
        let across: Vec<_> = (0..values.ncols()).map(|col| self.cols.legendre(col)).collect();
        values
            .axis_iter(Axis(0))
            .into_par_iter()
            .enumerate()
            .map(|(row, line)| {
                let down = self.rows.legendre(row);
                let mut sum = zero();
                for (col, &value) in line.iter().enumerate() {
                    if value.is_finite() {
                        add(&mut sum, &self.at(&down, &across[col]), value);
                    }
                }
                sum
            })
            .collect()
    }

    /// The matrix of the normal equations.
    pub fn products(&self, values: &Array2<f64>) -> Products {
        let zero = || [[0.0; MOST_TERMS]; MOST_TERMS];
        let by_row = self.summed(values, zero, |sum, terms, _| {
            for (line, first) in sum.iter_mut().zip(terms) {
                for (sum, second) in line.iter_mut().zip(terms) {
                    *sum += first * second;
                }
            }
        });
        by_row.iter().flat_map(|row| row.iter().enumerate()).fold(zero(), |mut total, (index, line)| {
            for (sum, value) in total[index].iter_mut().zip(line) {
                *sum += value;
            }
            total
        })
    }

    /// The right side of the normal equations.
    pub fn moments(&self, values: &Array2<f64>) -> Terms {
        let by_row = self.summed(
            values,
            || [0.0; MOST_TERMS],
            |sum, terms, value| {
                for (sum, term) in sum.iter_mut().zip(terms) {
                    *sum += term * value;
                }
            },
        );
        by_row.iter().fold([0.0; MOST_TERMS], |mut total, row| {
            for (sum, value) in total.iter_mut().zip(row) {
                *sum += value;
            }
            total
        })
    }

    /// The polynomial with these coefficients, over an array.
    pub fn surface(&self, coefficients: &Terms, shape: (usize, usize)) -> Array2<f64> {
        let across: Vec<_> = (0..shape.1).map(|col| self.cols.legendre(col)).collect();
        let mut surface = Array2::zeros(shape);
        surface.axis_iter_mut(Axis(0)).into_par_iter().enumerate().for_each(|(row, mut line)| {
            let down = self.rows.legendre(row);
            for (value, across) in line.iter_mut().zip(&across) {
                *value = self.at(&down, across).iter().zip(coefficients).map(|(term, by)| term * by).sum();
            }
        });
        surface
    }
}

/// The lower triangle of the scaled normal equations, and the scales.
pub(super) struct Factor {
    terms: usize,
    lower: Products,
    scale: Terms,
}

impl Factor {
    /// Factors the first `terms` equations, or `None` where they do not determine their unknowns.
    pub fn new(mut matrix: Products, terms: usize) -> Option<Self> {
        let mut scale = [0.0; MOST_TERMS];
        for (index, scale) in scale.iter_mut().enumerate().take(terms) {
            *scale = matrix[index][index].sqrt().recip();
        }
        for row in 0..terms {
            for col in 0..=row {
                let known: f64 = (0..col).map(|inner| matrix[row][inner] * matrix[col][inner]).sum();
                let sum = matrix[row][col] * scale[row] * scale[col] - known;
                matrix[row][col] = if row > col {
                    sum / matrix[col][col]
                } else if sum > LEAST_PIVOT {
                    sum.sqrt()
                } else {
                    return None;
                };
            }
        }
        Some(Self { terms, lower: matrix, scale })
    }

    /// The coefficients that go with a right side.
    pub fn solve(&self, right: Terms) -> Terms {
        let mut answer = [0.0; MOST_TERMS];
        for row in 0..self.terms {
            let known: f64 = (0..row).map(|col| self.lower[row][col] * answer[col]).sum();
            answer[row] = (right[row] * self.scale[row] - known) / self.lower[row][row];
        }
        for row in (0..self.terms).rev() {
            let known: f64 = (row + 1..self.terms).map(|col| self.lower[col][row] * answer[col]).sum();
            answer[row] = (answer[row] - known) / self.lower[row][row];
        }
        for (value, scale) in answer.iter_mut().zip(&self.scale) {
            *value *= scale;
        }
        answer
    }
}
