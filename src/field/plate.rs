//! The bending of a thin plate over the missing cells of a layer.

use ndarray::Array2;
use rayon::prelude::*;

use super::membrane::{Index, Membrane, places};

/// A little tension beside the stiffness, per square cell: it decides where the known cells alone leave the slope open, and
/// does nothing else.
const TENSION: f64 = 1e-6;

/// The solution is done when the norm of what is left has come down to this share.
const TOLERANCE: f64 = 3e-6;

/// The most steps. The gaps of benches/fields.rs took up to 89; single known cells far apart can take over 400, and the plate
/// is then left as it stands: every step lowers its energy, so it is never worse than the first guess.
const MOST_STEPS: usize = 150;

/// Nothing is gained below this share of what was left at first, squared.
const ROUNDING: f64 = 1e-24;

/// Numbers summed by one thread: sums run in an order that does not depend on how many threads there are.
const STRETCH: usize = 4096;

/// Brings the `unknowns`, cells (row, col) in row order, from a first guess to where the whole has the least energy of
/// bending: the sum of u_xx^2 + 2 u_xy^2 + u_yy^2 over the differences that lie within the array, which leaves its edges
/// free. Every other cell stays as it is.
///
/// Source: the energy of a thin plate as in Briggs (1974), Geophysics 39, 39-48, with the mixed term, without which a free
/// edge would take any harmonic shape. Solved by conjugate gradients (Hestenes & Stiefel 1952) prepared by two
/// membranes in turn, as bending is nearly the square of tension.
pub(super) fn bend(values: &mut Array2<f64>, unknowns: &[(usize, usize)]) {
    let plate = Plate::new(unknowns, values.dim());
    let membrane = Membrane::new(unknowns, values.dim());
    let prepared = |rest: &[f64]| membrane.cycle(&membrane.cycle(rest));
    let mut rest: Vec<f64> = unknowns.par_iter().map(|cell| -pull(values, *cell)).chain([0.0]).collect();
    let mut towards = prepared(&rest);
    let mut direction = towards.clone();
    let mut found = vec![0.0; rest.len()];
    let mut left = dot(&rest, &towards);
    // The scale of the problem is the pull on gaps that are held level.
    let mut bare = values.clone();
    let level = values.sum() / values.len() as f64;
    unknowns.iter().for_each(|cell| bare[*cell] = level);
    let alone: Vec<f64> = unknowns.par_iter().map(|cell| -pull(&bare, *cell)).chain([0.0]).collect();
    // That scale is nothing where every known cell has one value; rounding in the first guess is then the floor.
    let enough = (TOLERANCE * TOLERANCE * dot(&alone, &prepared(&alone))).max(ROUNDING * left);
    for _ in 0..MOST_STEPS {
        if left <= enough {
            break;
        }
        let applied = plate.apply(&direction);
        let curvature = dot(&direction, &applied);
        // Also false where it is not a number: what is found so far stands.
        let descends = curvature > 0.0;
        if !descends {
            break;
        }
        let step = left / curvature;
        add(&mut found, step, &direction);
        add(&mut rest, -step, &applied);
        towards = prepared(&rest);
        let next = dot(&rest, &towards);
        let share = next / left;
        left = next;
        let pairs = direction.par_iter_mut().zip(&towards).with_min_len(STRETCH);
        pairs.for_each(|(direction, towards)| *direction = towards + share * *direction);
    }
    for (cell, more) in unknowns.iter().zip(found) {
        values[*cell] += more;
    }
}

/// Half the derivative of the energy by one cell's value.
fn pull(values: &Array2<f64>, (row, col): (usize, usize)) -> f64 {
    let at = |down: isize, across: isize| {
        values.get((row.wrapping_add_signed(down), col.wrapping_add_signed(across))).copied()
    };
    let middle = values[[row, col]];
    let second = |place: [Option<f64>; 3]| match place {
        [Some(a), Some(b), Some(c)] => a - 2.0 * b + c,
        _ => 0.0,
    };
    let line = |step: &dyn Fn(isize) -> Option<f64>| {
        second([step(-2), step(-1), step(0)]) - 2.0 * second([step(-1), step(0), step(1)])
            + second([step(0), step(1), step(2)])
    };
    let mixed = |down: isize, across: isize| match (at(down, 0), at(0, across), at(down, across)) {
        (Some(a), Some(b), Some(c)) => middle - a - b + c,
        _ => 0.0,
    };
    let sides = [at(-1, 0), at(1, 0), at(0, -1), at(0, 1)];
    let tension: f64 = sides.into_iter().flatten().map(|side| middle - side).sum();
    line(&|step| at(0, step))
        + line(&|step| at(step, 0))
        + 2.0 * (mixed(1, 1) + mixed(1, -1) + mixed(-1, 1) + mixed(-1, -1))
        + TENSION * tension
}

/// The energy's second derivative, for shifts of the unknowns alone.
struct Plate {
    /// For each cell that an unknown's differences are centred on or begin at: itself, and what lies left, right, up, down,
    /// up and left, down and right of it, as numbers in a vector of unknowns.
    cells: Vec<[Index; 7]>,
    /// Which differences of a cell lie within the array: along the row, along the column, mixed.
    within: Vec<[bool; 3]>,
    /// For each unknown its own, left, right, up, down, up and left cell in `cells`, the length of it for none.
    around: Vec<[Index; 6]>,
    /// How many sides each unknown has, and those that are unknown.
    sides: Vec<(f64, [Index; 4])>,
}

impl Plate {
    fn new(unknowns: &[(usize, usize)], shape: (usize, usize)) -> Self {
        let place = places(unknowns, shape);
        let none = unknowns.len() as Index;
        let get = |place: &Array2<Index>, (row, col): (usize, usize), down: isize, across: isize| {
            place.get((row.wrapping_add_signed(down), col.wrapping_add_signed(across))).copied()
        };
        let mut touched = Array2::from_elem(shape, false);
        for &(row, col) in unknowns {
            for r in row.saturating_sub(1)..(row + 2).min(shape.0) {
                for c in col.saturating_sub(1)..(col + 2).min(shape.1) {
                    touched[[r, c]] = true;
                }
            }
        }
        let centres: Vec<(usize, usize)> =
            touched.indexed_iter().filter(|(_, touched)| **touched).map(|(cell, _)| cell).collect();
        let centre_place = places(&centres, shape);
        let outside = centres.len() as Index;
        let steps = [(0, 0), (0, -1), (0, 1), (-1, 0), (1, 0), (-1, -1), (1, 1)];
        let cells = centres
            .par_iter()
            .map(|&cell| steps.map(|(down, across)| get(&place, cell, down, across).unwrap_or(none)))
            .collect();
        let within = centres
            .iter()
            .map(|&(row, col)| {
                let (last_row, last_col) = (row + 1 == shape.0, col + 1 == shape.1);
                [col > 0 && !last_col, row > 0 && !last_row, !last_row && !last_col]
            })
            .collect();
        let around = unknowns
            .par_iter()
            .map(|&cell| {
                [0, 1, 2, 3, 4, 5].map(|at: usize| {
                    let (down, across) = steps[at];
                    get(&centre_place, cell, down, across).unwrap_or(outside)
                })
            })
            .collect();
        let sides = unknowns
            .par_iter()
            .map(|&cell| {
                let found = [1, 2, 3, 4].map(|at: usize| get(&place, cell, steps[at].0, steps[at].1));
                (found.iter().flatten().count() as f64, found.map(|side| side.unwrap_or(none)))
            })
            .collect();
        Self { cells, within, around, sides }
    }

    fn apply(&self, values: &[f64]) -> Vec<f64> {
        let at = |index: Index| values[index as usize];
        let mut differences: Vec<[f64; 3]> = self
            .cells
            .par_iter()
            .zip(&self.within)
            .with_min_len(STRETCH)
            .map(|(&[own, left, right, up, down, _, diagonal], within)| {
                let all = [
                    at(left) - 2.0 * at(own) + at(right),
                    at(up) - 2.0 * at(own) + at(down),
                    at(own) - at(right) - at(down) + at(diagonal),
                ];
                [0, 1, 2].map(|which| if within[which] { all[which] } else { 0.0 })
            })
            .collect();
        differences.push([0.0; 3]);
        let difference = |index: Index, which: usize| differences[index as usize][which];
        let mut applied: Vec<f64> = self
            .around
            .par_iter()
            .zip(&self.sides)
            .enumerate()
            .with_min_len(STRETCH)
            .map(|(index, (&[own, left, right, up, down, diagonal], (count, sides)))| {
                let across = difference(left, 0) - 2.0 * difference(own, 0) + difference(right, 0);
                let along = difference(up, 1) - 2.0 * difference(own, 1) + difference(down, 1);
                let mixed = difference(own, 2) - difference(left, 2) - difference(up, 2) + difference(diagonal, 2);
                let tension = count * values[index] - sides.iter().map(|side| at(*side)).sum::<f64>();
                across + along + 2.0 * mixed + TENSION * tension
            })
            .collect();
        applied.push(0.0);
        applied
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    let sums: Vec<f64> = a
        .par_chunks(STRETCH)
        .zip(b.par_chunks(STRETCH))
        .map(|(a, b)| a.iter().zip(b).map(|(a, b)| a * b).sum())
        .collect();
    sums.iter().sum()
}

fn add(to: &mut [f64], factor: f64, what: &[f64]) {
    to.par_iter_mut().zip(what).with_min_len(STRETCH).for_each(|(to, what)| *to += factor * what);
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_shifts_obey_the_derivative_of_the_energy() {
        // Both are the same linear map by construction: from the whole array, and from the unknowns alone.
        let unknowns: Vec<(usize, usize)> = (0..9)
            .flat_map(|row| (0..7).map(move |col| (row, col)))
            .filter(|(row, col)| (row * col) % 4 != 1)
            .collect();
        let mut values = Array2::zeros((9, 8));
        let mut numbers: Vec<f64> = (0..unknowns.len()).map(|at| ((at * 7919) % 23) as f64 - 11.0).collect();
        unknowns.iter().zip(&numbers).for_each(|(cell, number)| values[*cell] = *number);
        numbers.push(0.0);
        let applied = Plate::new(&unknowns, (9, 8)).apply(&numbers);
        for (cell, applied) in unknowns.iter().zip(applied) {
            assert!((applied - pull(&values, *cell)).abs() < 1e-9, "{cell:?}");
        }
    }
}
