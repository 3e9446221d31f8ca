//! Worlds of rectangular prisms whose fields are known in closed form.
//!
//! Gravity: Nagy (1966), Geophysics 31, 362-371; Plouff (1976), Geophysics 41, 727-741. Its gradients follow by
//! differentiation; magnetics from them by Poisson's relation (Blakely 1995, chapters 5 and 9), for magnetisation along
//! the inducing field. Coordinates in metres: x east, y north, z down.

use ndarray::Array2;
use salband::field::{Direction, MagneticDirections};
use salband::grid::{Frame, Grid};

pub const SIDE: usize = 128;
pub const CELL: f64 = 250.0;
pub const HEIGHT: f64 = 1000.0;

/// Newton's constant, m3/kg/s2 (CODATA 2018).
const NEWTON: f64 = 6.6743e-11;
/// Inclination and declination, degrees, and strength, nT, of the inducing field.
const INCLINATION: f64 = -60.0;
const DECLINATION: f64 = 5.0;
const INDUCING: f64 = 57_000.0;

pub fn inducing() -> MagneticDirections {
    MagneticDirections::induced(Direction::new(INCLINATION, DECLINATION).unwrap())
}

/// One body: west, east, south, north, top, bottom in metres; density contrast in kg/m3; susceptibility (SI).
pub struct Prism {
    edges: [[f64; 2]; 3],
    density: f64,
    susceptibility: f64,
}

/// The exact fields: mGal, mGal/m and nT.
pub struct Fields {
    pub gravity: Grid,
    pub raised: Array2<f64>,
    pub east: Array2<f64>,
    pub north: Array2<f64>,
    pub down: Array2<f64>,
    pub magnetic: Grid,
    pub reduced: Array2<f64>,
}

/// Sums over the corners of a prism: gz / (G rho) and the gradients xx, yy, zz, xy, xz, yz of the attraction.
fn corners(prism: &Prism, x: f64, y: f64, z: f64) -> [f64; 7] {
    let mut sums = [0.0; 7];
    for corner in 0..8_usize {
        let (i, j, k) = (corner & 1, corner >> 1 & 1, corner >> 2);
        let (dx, dy, dz) = (prism.edges[0][i] - x, prism.edges[1][j] - y, prism.edges[2][k] - z);
        let sign = if (i + j + k) % 2 == 1 { 1.0 } else { -1.0 };
        let far = (dx * dx + dy * dy + dz * dz).sqrt();
        let parts = [
            dz * (dx * dy).atan2(dz * far) - dx * (far + dy).ln() - dy * (far + dx).ln(),
            -(dy * dz).atan2(dx * far),
            -(dx * dz).atan2(dy * far),
            -(dx * dy).atan2(dz * far),
            (far + dz).ln(),
            (far + dy).ln(),
            (far + dx).ln(),
        ];
        for (sum, part) in sums.iter_mut().zip(parts) {
            *sum += sign * part;
        }
    }
    sums
}

impl Fields {
    pub fn of(prisms: &[Prism]) -> Self {
        let frame = Frame::local(CELL, SIDE, SIDE).unwrap();
        let (dip, bearing) = (INCLINATION.to_radians(), DECLINATION.to_radians());
        let along = [dip.cos() * bearing.sin(), dip.cos() * bearing.cos(), dip.sin()];
        let over = |height: f64, number: &dyn Fn(&Prism, [f64; 7]) -> f64| {
            Array2::from_shape_fn((SIDE, SIDE), |(row, col)| {
                let (x, y) = frame.position(row as f64, col as f64);
                prisms.iter().map(|prism| number(prism, corners(prism, x, y, -height))).sum()
            })
        };
        let heavy = |prism: &Prism| NEWTON * prism.density * 1e5;
        let magnetic = |prism: &Prism| prism.susceptibility * INDUCING / (4.0 * std::f64::consts::PI);
        let total = |c: [f64; 7]| {
            let [x, y, z] = along;
            x * x * c[1] + y * y * c[2] + z * z * c[3] + 2.0 * (x * y * c[4] + x * z * c[5] + y * z * c[6])
        };
        Self {
            gravity: Grid::new(frame.clone(), over(0.0, &|prism, c| heavy(prism) * c[0])).unwrap(),
            raised: over(HEIGHT, &|prism, c| heavy(prism) * c[0]),
            east: over(0.0, &|prism, c| heavy(prism) * c[5]),
            north: over(0.0, &|prism, c| heavy(prism) * c[6]),
            down: over(0.0, &|prism, c| heavy(prism) * c[3]),
            magnetic: Grid::new(frame.clone(), over(0.0, &|prism, c| magnetic(prism) * total(c))).unwrap(),
            reduced: over(0.0, &|prism, c| magnetic(prism) * c[3]),
        }
    }
}

/// Numbers in [low, high) from a seed: SplitMix64 (Steele, Lea & Flood 2014), so that a world is the same everywhere.
struct Numbers(u64);

impl Numbers {
    fn between(&mut self, low: f64, high: f64) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = self.0;
        mixed = (mixed ^ mixed >> 30).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ mixed >> 27).wrapping_mul(0x94d0_49bb_1331_11eb);
        mixed ^= mixed >> 31;
        low + (high - low) * (mixed >> 11) as f64 / (1_u64 << 53) as f64
    }
}

/// Six bodies, of which the first `cut` stand astride an edge of the frame and the others inside it.
pub fn six_bodies(seed: u64, cut: usize) -> Vec<Prism> {
    let mut numbers = Numbers(seed);
    let side = SIDE as f64 * CELL;
    (0..6)
        .map(|number| {
            let half = [numbers.between(1000.0, 3500.0), numbers.between(1000.0, 3500.0)];
            let mut middle = half.map(|half| numbers.between(half + 500.0, side - half - 500.0));
            if number < cut {
                let edge = numbers.between(0.0, 4.0) as usize;
                middle[edge % 2] = if edge < 2 { 0.0 } else { side } + numbers.between(-1000.0, 1000.0);
            }
            let top = numbers.between(700.0, 1800.0);
            let bottom = top + numbers.between(800.0, 3000.0);
            let sign = if numbers.between(0.0, 3.0) < 1.0 { -1.0 } else { 1.0 };
            Prism {
                edges: [
                    [middle[0] - half[0], middle[0] + half[0]],
                    [middle[1] - half[1], middle[1] + half[1]],
                    [top, bottom],
                ],
                density: sign * numbers.between(150.0, 400.0),
                susceptibility: numbers.between(0.01, 0.04),
            }
        })
        .collect()
}

/// True in about a tenth of the cells, in round blobs of 2 to 7 cells' radius anywhere on the frame.
pub fn blobs(seed: u64) -> Array2<bool> {
    let mut numbers = Numbers(seed);
    let mut missing = Array2::from_elem((SIDE, SIDE), false);
    while missing.iter().filter(|missing| **missing).count() < SIDE * SIDE / 10 {
        let radius = numbers.between(2.0, 7.0);
        let (r, c) = (numbers.between(0.0, SIDE as f64), numbers.between(0.0, SIDE as f64));
        for ((row, col), missing) in missing.indexed_iter_mut() {
            *missing |= (row as f64 - r).hypot(col as f64 - c) < radius;
        }
    }
    missing
}
