//! A sparse sheet of sources below a layer: what a survey tells of the ground beyond its edge.

use ndarray::Array2;
use rayon::prelude::*;

use super::dense::product_with_transpose;
use crate::grid::Plane;

/// Sources along the longer side of the layer, besides those beyond its edges.
const ALONG: f64 = 16.0;

/// Rows and columns of sources beyond each edge of the layer.
const BEYOND: usize = 2;

/// Depth of the sources, in spacings.
const DEPTH: f64 = 1.5;

/// Weight of the strengths against the misfit, as a share of the mean square of a source's own column.
const DAMPING: f64 = 1e-2;

/// Rounds of reweighting.
const ROUNDS: usize = 8;

/// The least strength, as a share of the root mean square one, that a weight still tells apart.
const LEAST_STRENGTH: f64 = 0.01;

/// Blocks of cells between two sources: what the sources are fitted to are means over blocks.
const BLOCKS: f64 = 2.0;

/// Point masses on a regular sheet below the layer and a little beyond it; rows, columns and depth in cells.
#[derive(Debug, Clone)]
pub(super) struct Sources {
    spacing: f64,
    /// (row, column, strength), where the strength is that of the anomaly right above a source, in units of the field.
    points: Vec<(f64, f64, f64)>,
}

impl Sources {
    /// No source: the ground beyond the edge is taken to hold none.
    #[cfg(test)]
    pub fn none() -> Self {
        Self { spacing: 1.0, points: Vec::new() }
    }

    /// True if there is no source.
    pub fn is_empty(&self) -> bool {
        self.points.is_empty()
    }

    /// The distance between two sources, cells.
    pub fn spacing(&self) -> f64 {
        self.spacing
    }

    /// The field of the sources at a place, which may lie beyond the layer.
    pub fn at(&self, row: f64, col: f64) -> f64 {
        let depth = DEPTH * self.spacing;
        self.points.iter().map(|(r, c, strength)| strength * attraction(row - r, col - c, depth)).sum()
    }
}

/// The vertical attraction of a point mass, 1 right above it.
fn attraction(down: f64, across: f64, depth: f64) -> f64 {
    let share = depth * depth / (down * down + across * across + depth * depth);
    share * share.sqrt()
}

/// Finds the plane and the fewest sources that together explain a layer; NaN is missing. `start` is a plane that fits
/// roughly, so that large levels do not cost digits.
///
/// Why: a transform needs a level, a slope and some ground beyond the edge. A plane fitted by itself takes the outer
/// reach of the bodies for a regional level. Any field of sources below can be made by a sheet of point masses (Dampney
/// 1969); asked for few strong ones rather than many weak ones, as bodies stand apart, the fit tells the bodies from the
/// plane, and their fields then run out beyond the edge as attraction does, by the inverse square.
///
/// Steps: means over blocks of cells; least squares for the plane (free) and the strengths (damped), solved nine times
/// with the damping of each source inversely as its last strength (iteratively reweighted least squares for a sum of
/// absolute strengths, Daubechies et al. 2010). Nothing is asked of the fit but to be smooth: what it does not explain
/// stays in the layer. At most 400 sources and 1,024 blocks, whatever the size of the layer.
pub(super) fn fit(values: &Array2<f64>, start: Plane) -> (Plane, Sources) {
    let (rows, cols) = values.dim();
    let longest = rows.max(cols) as f64;
    let spacing = (longest / ALONG).max(2.0);
    let none = (start, Sources { spacing, points: Vec::new() });
    let blocks = block_means(values, start, spacing / BLOCKS);
    let scale = (blocks.iter().map(|block| block.share * block.value * block.value).sum::<f64>()
        / blocks.iter().map(|block| block.share).sum::<f64>())
    .sqrt();
    // What is left of a plane is rounding, and no source.
    let level = start.level.abs() + start.down.abs() * rows as f64 + start.right.abs() * cols as f64;
    if scale.is_nan() || scale <= 1e-12 * level {
        return none;
    }
    let places = sheet(rows, cols, spacing);
    let (count, depth) = (places.len(), DEPTH * spacing);
    let middle = ((rows - 1) as f64 / 2.0, (cols - 1) as f64 / 2.0);
    let equations: Vec<Vec<f64>> = blocks
        .par_iter()
        .map(|block| {
            let weight = block.share.sqrt();
            let attractions = places.iter().map(|place| attraction(block.row - place.0, block.col - place.1, depth));
            let plane = [1.0, (block.row - middle.0) / longest, (block.col - middle.1) / longest];
            attractions.chain(plane).chain([block.value]).map(|value| value * weight).collect()
        })
        .collect();
    let normal = product_with_transpose(&equations);
    let square = (0..count).map(|at| normal.at(at, at)).sum::<f64>() / count as f64;
    let mut weights = vec![1.0; count];
    let mut solution = Vec::new();
    for _ in 0..=ROUNDS {
        let mut damped = normal.clone();
        for (at, weight) in weights.iter().enumerate() {
            damped.raise(at, DAMPING * square * weight);
        }
        for at in count..count + 3 {
            // Enough to leave alone a slope that the cells cannot tell, too little to be seen otherwise.
            damped.raise(at, 1e-9 * blocks.len() as f64);
        }
        let Some(found) = damped.solved() else { return none };
        let strength = found[..count].iter().map(|value| value * value).sum::<f64>() / count as f64;
        if strength.is_nan() || strength <= 0.0 {
            return none;
        }
        for (weight, value) in weights.iter_mut().zip(&found) {
            *weight = 1.0 / (value.abs() / strength.sqrt() + LEAST_STRENGTH);
        }
        solution = found;
    }
    let mut plane = Plane::flat(0.0);
    plane.down = start.down + solution[count + 1] / longest;
    plane.right = start.right + solution[count + 2] / longest;
    plane.level =
        start.at(0, 0) + solution[count] - (solution[count + 1] * middle.0 + solution[count + 2] * middle.1) / longest;
    let points = places.iter().zip(&solution).map(|(place, strength)| (place.0, place.1, *strength)).collect();
    (plane, Sources { spacing, points })
}

/// Where the sources stand: (row, column), cells.
fn sheet(rows: usize, cols: usize, spacing: f64) -> Vec<(f64, f64)> {
    let axis = |length: usize| {
        let count = (length as f64 / spacing).ceil() as usize + 2 * BEYOND;
        let first = (length - 1) as f64 / 2.0 - (count - 1) as f64 / 2.0 * spacing;
        (0..count).map(move |at| first + at as f64 * spacing)
    };
    axis(rows).flat_map(|row| axis(cols).map(move |col| (row, col))).collect()
}

/// The mean over the known cells of a block.
struct Block {
    row: f64,
    col: f64,
    value: f64,
    /// The share of the block's cells that are known.
    share: f64,
}

/// The blocks of about `side` x `side` cells that hold a known cell, less a plane.
fn block_means(values: &Array2<f64>, plane: Plane, side: f64) -> Vec<Block> {
    let (rows, cols) = values.dim();
    let (down, across) = ((rows as f64 / side).ceil() as usize, (cols as f64 / side).ceil() as usize);
    (0..down * across)
        .into_par_iter()
        .filter_map(|at| {
            let (r, c) = (at / across, at % across);
            let (top, bottom) = (r * rows / down, (r + 1) * rows / down);
            let (left, right) = (c * cols / across, (c + 1) * cols / across);
            let (mut count, mut block) = (0.0, Block { row: 0.0, col: 0.0, value: 0.0, share: 0.0 });
            for row in top..bottom {
                for col in left..right {
                    if values[[row, col]].is_finite() {
                        count += 1.0;
                        block.row += row as f64;
                        block.col += col as f64;
                        block.value += values[[row, col]] - plane.at(row, col);
                    }
                }
            }
            block.row /= count;
            block.col /= count;
            block.value /= count;
            block.share = count / ((bottom - top) * (right - left)) as f64;
            (count > 0.0).then_some(block)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The attraction of two masses over a sloping plane; closed form of a point mass.
    fn two_masses(row: f64, col: f64) -> f64 {
        let mass = |r: f64, c: f64, depth: f64| {
            depth.powi(3) / ((row - r).powi(2) + (col - c).powi(2) + depth * depth).powf(1.5)
        };
        10.0 * mass(30.0, 20.0, 9.0) - 6.0 * mass(50.0, 63.0, 7.0)
    }

    #[test]
    fn the_plane_is_told_from_the_bodies_and_the_field_runs_on() {
        let values = Array2::from_shape_fn((64, 64), |(row, col)| {
            two_masses(row as f64, col as f64) + 980_000.0 + 0.2 * row as f64 - 0.1 * col as f64
        });
        let start = super::super::plane::regional_plane(&values);
        let (plane, sources) = fit(&values, start);
        let rim = start.at(32, 32) - (980_000.0 + 0.1 * 32.0);
        let off = plane.at(32, 32) - (980_000.0 + 0.1 * 32.0);
        println!("level off by {off:.4}, that of the rim by {rim:.4}");
        assert!(off.abs() < 0.1 && off.abs() < 0.5 * rim.abs(), "{off} {rim}");
        assert!((plane.down - 0.2).abs() < 3e-3 && (plane.right + 0.1).abs() < 3e-3, "{plane:?}");
        // Beyond the edge, past the mass that stands on it; its own field there is 2.1, 0.3 and 0.1.
        for (col, most) in [(70.0, 0.5), (80.0, 0.2), (90.0, 0.1)] {
            let off = sources.at(50.0, col) - two_masses(50.0, col);
            assert!(off.abs() < most, "{off} at column {col}");
        }
    }

    #[test]
    fn a_plane_has_no_source_and_gaps_do_no_harm() {
        let slope = Array2::from_shape_fn((20, 31), |(row, col)| 9.0 - row as f64 + 0.25 * col as f64);
        let start = super::super::plane::regional_plane(&slope);
        let (plane, _) = fit(&slope, start);
        assert!((plane.at(7, 9) - slope[[7, 9]]).abs() < 1e-9);
        let mut single = Array2::from_elem((20, 31), f64::NAN);
        single[[4, 4]] = 5.0;
        single[[4, 5]] = 6.0;
        let start = super::super::plane::regional_plane(&single);
        let (plane, sources) = fit(&single, start);
        assert!((plane.at(4, 4) + sources.at(4.0, 4.0) - 5.0).abs() < 0.5);
        assert!(sources.at(15.0, 25.0).abs() < 1.0);
    }
}
