//! Small random layers on footprints of every kind.

use ndarray::Array2;
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use salband::coincidence::{Reference, Subject};

/// Rows and columns of every small layer.
pub const SHAPE: (usize, usize) = (24, 31);

/// Subjects and a reference.
pub struct Case {
    pub subjects: Vec<Subject>,
    pub reference: Reference,
}

/// Draws a case: `kind` 0 has rectangular footprints, 1 bent ones, 2 ones with holes; the two differ in every case.
pub fn case(seed: u64, kind: usize, slices: usize) -> Case {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let (rows, cols) = SHAPE;
    let mut footprint = |reference: bool| {
        let shift = usize::from(reference);
        Array2::from_shape_fn(SHAPE, |(row, col)| match kind {
            0 => row >= 2 * shift && row < rows - 1 + shift && col >= 1 - shift && col < cols - 3 * shift,
            1 => row >= rows / 2 - 2 * shift || col < cols / 3 + 4 * shift,
            _ => random.r#gen::<f64>() > 0.1 && !(8..12 + shift).contains(&row) | !(9..15).contains(&col),
        })
    };
    let (moving, staying) = (footprint(false), footprint(true));
    let mut smooth = |tilt: f64| {
        let noise = Array2::from_shape_fn((rows + 2, cols + 2), |_| random.gen_range(-1.0..1.0));
        Array2::from_shape_fn(SHAPE, |(row, col)| {
            noise.slice(ndarray::s![row..row + 3, col..col + 3]).sum() + tilt * (row as f64 - col as f64)
        })
    };
    let gravity = smooth(0.03);
    let lines = gravity.mapv(|value| value.abs() < 0.25);
    let distance = Array2::from_shape_fn(SHAPE, |(row, col)| {
        let away = |(r, c): (usize, usize)| (r as f64 - row as f64).hypot(c as f64 - col as f64);
        lines.indexed_iter().filter(|(_, line)| **line).map(|(at, _)| away(at)).fold(99.0, f64::min)
    });
    let subjects = (0..slices).map(|_| {
        let slice = smooth(-0.02);
        let members = slice.mapv(|value| value > 1.0);
        Subject { footprint: moving.clone(), members: Some(members), strength: Some(slice) }
    });
    Case {
        subjects: subjects.collect(),
        reference: Reference {
            footprint: staying,
            distance: Some(distance),
            strength: Some(gravity),
            ..Reference::default()
        },
    }
}
