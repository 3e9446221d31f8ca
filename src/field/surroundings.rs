//! The field of the sources around a layer, made periodic as a transform wants it.

use std::f64::consts::PI;

use ndarray::Array2;
use rayon::prelude::*;

use super::padding::Axis;
use super::sources::Sources;

/// Nodes of the smooth surface between two sources; the sources lie deeper than their spacing, so that is fine enough.
const NODES: f64 = 2.0;

/// A smooth periodic surface over the padded layer: the field of the sources, in the padding blended with that of the
/// next copy of the layer, so that no jump stands where the copies meet.
#[derive(Debug, Clone)]
pub(super) struct Surroundings {
    down: Axis,
    across: Axis,
    /// The surface at its nodes; `None` if there is no source.
    surface: Option<Surface>,
}

#[derive(Debug, Clone)]
struct Surface {
    nodes: Array2<f64>,
    rows: Vec<Knot>,
    cols: Vec<Knot>,
}

impl Surroundings {
    /// The surroundings of a layer of `shape` (rows, columns).
    pub fn new(shape: (usize, usize), sources: &Sources) -> Self {
        let (down, across) = (Axis::new(shape.0), Axis::new(shape.1));
        let surface = (!sources.is_empty()).then(|| {
            let count = |axis: Axis| ((NODES * axis.padded as f64 / sources.spacing()).ceil() as usize).max(4);
            let (rows, cols) = (count(down), count(across));
            let (blended_rows, blended_cols) = (blends(down, rows), blends(across, cols));
            let values: Vec<f64> = (0..rows * cols)
                .into_par_iter()
                .map(|at| {
                    let (row, col) = (&blended_rows[at / cols], &blended_cols[at % cols]);
                    let mut sum = 0.0;
                    for (r, down) in row {
                        for (c, across) in col {
                            sum += down * across * sources.at(*r, *c);
                        }
                    }
                    sum
                })
                .collect();
            let nodes = Array2::from_shape_fn((rows, cols), |(row, col)| values[row * cols + col]);
            Surface { nodes, rows: knots(down, rows), cols: knots(across, cols) }
        });
        Self { down, across, surface }
    }

    /// The axes of the padded layer, down and across.
    pub fn axes(&self) -> (Axis, Axis) {
        (self.down, self.across)
    }

    /// Takes the surface off a layer without padding.
    pub fn take_off(&self, layer: &mut Array2<f64>) {
        let (top, left) = (self.down.before, self.across.before);
        layer
            .outer_iter_mut()
            .into_par_iter()
            .enumerate()
            .for_each(|(row, line)| self.add(row + top, left, line, -1.0));
    }

    /// Adds the surface, times `factor`, to part of a padded row, from column `first` on.
    pub fn add<'a>(&self, row: usize, first: usize, into: impl IntoIterator<Item = &'a mut f64>, factor: f64) {
        let Some(surface) = &self.surface else { return };
        let knot = &surface.rows[row];
        let nodes = surface.nodes.ncols();
        // The four nodes of a place stand side by side: the first three are repeated at the end.
        let line: Vec<f64> = (0..nodes + 3)
            .map(|col| {
                let down = (0..4).map(|at| surface.nodes[[(knot.first + at) % surface.nodes.nrows(), col % nodes]]);
                factor * knot.weights.iter().zip(down).map(|(weight, value)| weight * value).sum::<f64>()
            })
            .collect();
        for (value, knot) in into.into_iter().zip(&surface.cols[first..]) {
            if let [a, b, c, d] = line[knot.first..knot.first + 4] {
                let [p, q, r, s] = knot.weights;
                *value += (a * p + b * q) + (c * r + d * s);
            }
        }
    }
}

/// The first of the four nodes in a row that a place takes part of, and how much of each.
#[derive(Debug, Clone)]
struct Knot {
    first: usize,
    weights: [f64; 4],
}

/// Uniform cubic B-splines on a periodic axis (de Boor 1978): smooth to the second derivative. The surface passes near
/// its nodes rather than through them, which costs nothing, as what it leaves stays in the layer.
fn knots(axis: Axis, count: usize) -> Vec<Knot> {
    (0..axis.padded)
        .map(|place| {
            let at = place as f64 * count as f64 / axis.padded as f64;
            let first = at.floor();
            let t = at - first;
            Knot {
                first: (first as usize + count - 1) % count,
                weights: [
                    (1.0 - t).powi(3) / 6.0,
                    (3.0 * t.powi(3) - 6.0 * t * t + 4.0) / 6.0,
                    (-3.0 * t.powi(3) + 3.0 * t * t + 3.0 * t + 1.0) / 6.0,
                    t.powi(3) / 6.0,
                ],
            }
        })
        .collect()
}

/// For each node of an axis the places, counted from the layer's first cell, whose fields it blends, and their weights.
fn blends(axis: Axis, count: usize) -> Vec<Vec<(f64, f64)>> {
    let (last, padded) = ((axis.length - 1) as f64, axis.padded as f64);
    (0..count)
        .map(|node| {
            let place = node as f64 * padded / count as f64 - axis.before as f64;
            let (outside, partner) =
                if place < 0.0 { (-place, place + padded) } else { ((place - last).max(0.0), place - padded) };
            if outside == 0.0 {
                return vec![(place, 1.0)];
            }
            let weight = 0.5 * (1.0 + (PI * outside / (padded - last)).cos());
            vec![(place, weight), (partner, 1.0 - weight)]
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::super::sources::fit;
    use super::*;
    use crate::grid::Plane;

    fn surroundings() -> (Sources, Surroundings) {
        let values = Array2::from_shape_fn((40, 60), |(row, col)| {
            100.0 / (1.0 + (row as f64 - 12.0).powi(2) / 50.0 + (col as f64 - 55.0).powi(2) / 90.0)
        });
        let (_, sources) = fit(&values, Plane::flat(0.0));
        let around = Surroundings::new((40, 60), &sources);
        (sources, around)
    }

    #[test]
    fn the_surface_is_the_field_of_the_sources_on_the_layer_and_periodic_around_it() {
        let (sources, around) = surroundings();
        let (down, across) = around.axes();
        let mut whole = Array2::<f64>::zeros((down.padded, across.padded));
        for (row, mut line) in whole.outer_iter_mut().enumerate() {
            around.add(row, 0, &mut line, 1.0);
        }
        let largest = whole.iter().fold(0.0_f64, |a, b| a.max(b.abs()));
        let off = whole[[down.before + 20, across.before + 30]] - sources.at(20.0, 30.0);
        assert!(off.abs() < 0.05 * largest, "{off} of {largest}");
        for ((row, col), value) in whole.indexed_iter() {
            // A field of sources 5.6 cells deep and more cannot fall by a fifth of its height within a cell.
            let (below, beside) = (whole[[(row + 1) % down.padded, col]], whole[[row, (col + 1) % across.padded]]);
            assert!((value - below).abs() < 0.2 * largest && (value - beside).abs() < 0.2 * largest, "{row} {col}");
        }
        let mut layer =
            whole.slice(ndarray::s![down.before..down.before + 40, across.before..across.before + 60]).to_owned();
        around.take_off(&mut layer);
        assert!(layer.iter().all(|rest| rest.abs() < 1e-12 * largest));
    }
}
