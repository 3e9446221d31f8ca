//! A quick approximate solution of Laplace's equation on the missing cells of a layer: multigrid.

use ndarray::Array2;
use rayon::prelude::*;

/// Marks what is not an unknown: a vector has one more place than there are unknowns, which stays zero.
pub(super) type Index = u32;

/// Share of each Jacobi correction that is taken, the usual choice for five points.
const RELAXATION: f64 = 0.8;

/// Sweeps before and after each visit to the coarser level, and sweeps on the coarsest.
const SWEEPS: usize = 1;
const COARSEST_SWEEPS: usize = 40;

/// With no more unknowns than this a level is not made coarser.
const FEW: usize = 50;

/// What a correction that is constant within a block makes up for its stiffness.
const OVERCORRECTION: f64 = 1.8;

/// Unknowns that a thread takes at a time.
const LEAST_WORK: usize = 4096;

/// One level: sum over the four sides of weight x (value - neighbour), where a side that is no unknown counts as zero.
struct Level {
    neighbours: Vec<[Index; 4]>,
    weights: Vec<[f64; 4]>,
    diagonal: Vec<f64>,
    /// The four unknowns of the finer level in each unknown of this one.
    children: Vec<[Index; 4]>,
    /// The unknown of the next coarser level that holds each of this one.
    parents: Vec<Index>,
}

/// Levels of the five-point equations, each half as fine as the one before.
pub(super) struct Membrane(Vec<Level>);

impl Membrane {
    /// The equations of `unknowns`, cells (row, col) in row order of an array of `shape`, all others held at zero; no flow
    /// across the edges of the array.
    pub fn new(unknowns: &[(usize, usize)], shape: (usize, usize)) -> Self {
        let place = places(unknowns, shape);
        let none = unknowns.len() as Index;
        let mut finest = Level {
            neighbours: vec![[none; 4]; unknowns.len()],
            weights: vec![[0.0; 4]; unknowns.len()],
            diagonal: vec![0.0; unknowns.len()],
            children: Vec::new(),
            parents: Vec::new(),
        };
        for (at, &(row, col)) in unknowns.iter().enumerate() {
            for (side, next) in sides((row, col)).into_iter().enumerate() {
                if let Some(&index) = place.get(next) {
                    finest.diagonal[at] += 1.0;
                    if index != none {
                        finest.neighbours[at][side] = index;
                        finest.weights[at][side] = 1.0;
                    }
                }
            }
        }
        let mut levels = vec![finest];
        let (mut cells, mut shape) = (unknowns.to_vec(), shape);
        while cells.len() > FEW && shape.0.max(shape.1) > 2 {
            shape = (shape.0.div_ceil(2), shape.1.div_ceil(2));
            let last = levels.len() - 1;
            let (coarse, held) = levels[last].halved(&cells, shape);
            levels.push(coarse);
            cells = held;
        }
        Self(levels)
    }

    /// One V-cycle from zero for the right side `wanted`, which has a zero place at its end: a symmetric positive operator
    /// near the inverse of the equations.
    ///
    /// The unknowns of 2 x 2 cells are joined to one, and the joined equations divided by 1.8, which makes up for the
    /// stiffness of a correction that is constant within a block (Braess 1995, Computing 55, 379-393).
    pub fn cycle(&self, wanted: &[f64]) -> Vec<f64> {
        self.visit(0, wanted)
    }

    fn visit(&self, at: usize, wanted: &[f64]) -> Vec<f64> {
        let level = &self.0[at];
        let mut values = vec![0.0; wanted.len()];
        let Some(coarse) = self.0.get(at + 1) else {
            (0..COARSEST_SWEEPS).for_each(|_| level.sweep(&mut values, wanted));
            return values;
        };
        (0..SWEEPS).for_each(|_| level.sweep(&mut values, wanted));
        let rest = level.for_each(&values, |at, applied| wanted[at] - applied);
        let mut joined: Vec<f64> = coarse
            .children
            .par_iter()
            .with_min_len(LEAST_WORK)
            .map(|children| children.iter().map(|child| rest[*child as usize]).sum())
            .collect();
        joined.push(0.0);
        let correction = self.visit(at + 1, &joined);
        let pairs = values.par_iter_mut().zip(&level.parents).with_min_len(LEAST_WORK);
        pairs.for_each(|(value, parent)| *value += correction[*parent as usize]);
        (0..SWEEPS).for_each(|_| level.sweep(&mut values, wanted));
        values
    }
}

impl Level {
    /// What `make` makes of each unknown's number and its equation applied to `values`, and a zero place.
    fn for_each(&self, values: &[f64], make: impl Fn(usize, f64) -> f64 + Sync) -> Vec<f64> {
        let mut made: Vec<f64> = (0..self.diagonal.len())
            .into_par_iter()
            .with_min_len(LEAST_WORK)
            .map(|at| {
                let around = self.neighbours[at].iter().zip(&self.weights[at]);
                let sum: f64 = around.map(|(next, weight)| weight * values[*next as usize]).sum();
                make(at, self.diagonal[at] * values[at] - sum)
            })
            .collect();
        made.push(0.0);
        made
    }

    fn sweep(&self, values: &mut Vec<f64>, wanted: &[f64]) {
        *values =
            self.for_each(values, |at, applied| values[at] + RELAXATION * (wanted[at] - applied) / self.diagonal[at]);
    }

    /// The next coarser level, whose array has `shape`, and its cells; notes the parents here.
    fn halved(&mut self, cells: &[(usize, usize)], shape: (usize, usize)) -> (Self, Vec<(usize, usize)>) {
        let mut held: Vec<(usize, usize)> = cells.iter().map(|(row, col)| (row / 2, col / 2)).collect();
        held.sort_unstable();
        held.dedup();
        let place = places(&held, shape);
        let none = cells.len() as Index;
        let mut coarse = Self {
            neighbours: vec![[held.len() as Index; 4]; held.len()],
            weights: vec![[0.0; 4]; held.len()],
            diagonal: vec![0.0; held.len()],
            children: vec![[none; 4]; held.len()],
            parents: Vec::new(),
        };
        self.parents = cells.iter().map(|(row, col)| place[[row / 2, col / 2]]).collect();
        for (at, (row, col)) in cells.iter().enumerate() {
            let parent = self.parents[at] as usize;
            coarse.children[parent][2 * (row % 2) + col % 2] = at as Index;
            coarse.diagonal[parent] += self.diagonal[at] / OVERCORRECTION;
            for (side, (&next, weight)) in self.neighbours[at].iter().zip(&self.weights[at]).enumerate() {
                if next != none {
                    let other = self.parents[next as usize];
                    if other as usize == parent {
                        coarse.diagonal[parent] -= weight / OVERCORRECTION;
                    } else {
                        coarse.neighbours[parent][side] = other;
                        coarse.weights[parent][side] += weight / OVERCORRECTION;
                    }
                }
            }
        }
        (coarse, held)
    }
}

/// The four sides of a cell, some of which may lie outside the array.
fn sides((row, col): (usize, usize)) -> [(usize, usize); 4] {
    [(row.wrapping_sub(1), col), (row + 1, col), (row, col.wrapping_sub(1)), (row, col + 1)]
}

/// The number of each cell in a list, and the length of the list in all others.
pub(super) fn places(cells: &[(usize, usize)], shape: (usize, usize)) -> Array2<Index> {
    let mut place = Array2::from_elem(shape, cells.len() as Index);
    for (at, &cell) in cells.iter().enumerate() {
        place[cell] = at as Index;
    }
    place
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cycles_bring_the_rest_down_and_are_symmetric() {
        let shape = (40, 56);
        let hole = |row: usize, col: usize| (4..37).contains(&row) && (col > 6 || row.is_multiple_of(5));
        let cells: Vec<_> = (0..shape.0).flat_map(|row| (0..shape.1).map(move |col| (row, col))).collect();
        let unknowns: Vec<_> = cells.into_iter().filter(|(row, col)| hole(*row, *col)).collect();
        let membrane = Membrane::new(&unknowns, shape);
        let some = |seed: usize| {
            let mut numbers: Vec<f64> = (0..unknowns.len()).map(|at| ((at * seed) % 17) as f64 - 8.0).collect();
            numbers.push(0.0);
            numbers
        };
        let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| a * b).sum::<f64>();
        let (a, b) = (some(7919), some(104_729));
        let (ab, ba) = (dot(&a, &membrane.cycle(&b)), dot(&b, &membrane.cycle(&a)));
        assert!((ab - ba).abs() < 1e-9 * dot(&a, &membrane.cycle(&a)), "{ab} {ba}");
        // Half steps, as the correction overshoots for some shapes.
        let mut values = vec![0.0; a.len()];
        for _ in 0..60 {
            let rest = membrane.0[0].for_each(&values, |at, applied| a[at] - applied);
            for (value, more) in values.iter_mut().zip(membrane.cycle(&rest)) {
                *value += 0.5 * more;
            }
        }
        let rest = membrane.0[0].for_each(&values, |at, applied| a[at] - applied);
        assert!(dot(&rest, &rest) < 1e-8 * dot(&a, &a), "{}", dot(&rest, &rest) / dot(&a, &a));
    }
}
