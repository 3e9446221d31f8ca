//! A check on the invention: do conductors keep to margins at the planted depths, and only there?

use crate::bodies::{CORNER, Margin, SIZE};
use crate::world::{PLANTED_DEPTHS, World};

/// Side of the cells on which the check counts, m.
const CELL: f64 = 500.0;
/// Share of the ground that counts as conductor at each depth.
const TOP: f64 = 0.15;
/// What counts as near, m.
const NEAR: f64 = 1000.0;

/// One line of the check.
#[derive(Debug)]
pub struct Line {
    /// Depth, m.
    pub depth: f64,
    /// Whether conductors were planted along margins at this depth.
    pub planted: bool,
    /// Share of conductor cells within 1 km of a true margin.
    pub conductors_near: f64,
    /// Share of ground within 1 km of a true margin.
    pub ground_near: f64,
    /// The first over the second, for true margins.
    pub by_margins: f64,
    /// The same ratio for crests of the horizontal gradient of gravity.
    pub by_crests: f64,
}

/// Counts at every depth. `crests` are places on the crests of the horizontal gradient of gravity.
pub fn check(world: &World, margins: &[Margin], crests: &[[f64; 2]]) -> Vec<Line> {
    let places = ground(world);
    let near_margin: Vec<bool> =
        places.iter().map(|place| margins.iter().any(|margin| margin.distance(*place) <= NEAR)).collect();
    let near_crest: Vec<bool> = places
        .iter()
        .map(|place| {
            let near = |crest: &[f64; 2]| (crest[0] - place[0]).powi(2) + (crest[1] - place[1]).powi(2) <= NEAR * NEAR;
            crests.iter().any(near)
        })
        .collect();
    world
        .slices
        .iter()
        .map(|slice| {
            let values: Vec<f64> = places.iter().map(|place| slice.log10.at(*place)).collect();
            let mut sorted = values.clone();
            sorted.sort_by(f64::total_cmp);
            let threshold = sorted[(TOP * sorted.len() as f64) as usize];
            let shares = |near: &[bool]| {
                let pairs = || near.iter().zip(&values).filter(|(_, value)| **value < threshold);
                let conductors = pairs().filter(|(near, _)| **near).count() as f64 / pairs().count() as f64;
                let all = near.iter().filter(|near| **near).count() as f64 / near.len() as f64;
                (conductors, all)
            };
            let ((conductors_near, ground_near), (at_crests, crest_ground)) =
                (shares(&near_margin), shares(&near_crest));
            Line {
                depth: slice.depth,
                planted: PLANTED_DEPTHS.contains(&slice.depth),
                conductors_near,
                ground_near,
                by_margins: conductors_near / ground_near,
                by_crests: at_crests / crest_ground,
            }
        })
        .collect()
}

/// Centres of the cells where the resistivity model has data.
fn ground(world: &World) -> Vec<[f64; 2]> {
    let [cols, rows] = SIZE.map(|side| (side / CELL) as usize);
    let place = |i: usize, j: usize| [CORNER[0] + (j as f64 + 0.5) * CELL, CORNER[1] + (i as f64 + 0.5) * CELL];
    (0..rows).flat_map(|i| (0..cols).map(move |j| place(i, j))).filter(|place| world.footprint.holds(*place)).collect()
}

/// Places of cells on crests of the horizontal gradient: higher than both neighbours in two or more of four directions
/// (the test of Blakely & Simpson 1986), and among the steeper 30 % of cells.
///
/// `values` are gravity in rows from north to south, `cols` to a row; `place` gives the centre of a cell.
pub fn crests(values: &[f64], cols: usize, cell: f64, place: impl Fn(usize, usize) -> [f64; 2]) -> Vec<[f64; 2]> {
    let rows = values.len() / cols;
    let at = |i: usize, j: usize| values[i * cols + j];
    let mut steepness = vec![0.0; values.len()];
    for i in 1..rows - 1 {
        for j in 1..cols - 1 {
            let (east, north) = (at(i, j + 1) - at(i, j - 1), at(i - 1, j) - at(i + 1, j));
            steepness[i * cols + j] = east.hypot(north) / (2.0 * cell);
        }
    }
    let mut sorted = steepness.clone();
    sorted.sort_by(f64::total_cmp);
    let threshold = sorted[(0.7 * sorted.len() as f64) as usize];
    let mut found = Vec::new();
    for i in 2..rows - 2 {
        for j in 2..cols - 2 {
            let middle = i * cols + j;
            let steps = [1, cols - 1, cols, cols + 1];
            let passed = steps.iter().filter(|step| {
                steepness[middle] > steepness[middle - *step] && steepness[middle] > steepness[middle + *step]
            });
            if steepness[middle] > threshold && passed.count() >= 2 {
                found.push(place(i, j));
            }
        }
    }
    found
}
