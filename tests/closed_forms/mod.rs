//! Fields of simple bodies in closed form, written here from the published formulas and used as expected values.
//!
//! x east, y north, z down, metres; the observer at z = 0 unless raised (negative z).
#![allow(dead_code, reason = "each test file uses a part of these")]

use std::path::PathBuf;

use ndarray::Array2;
use salband::grid::{Frame, Grid};

/// Newton's constant, m3/kg/s2 (CODATA 2018), times 1e5 mGal per m/s2.
pub const GRAVITY: f64 = 6.6743e-11 * 1e5;

/// mu0 / 4 pi times 1e9 nT per T.
pub const MAGNETIC: f64 = 1e-7 * 1e9;

/// Magnetisation of the reference prism, A/m: susceptibility x field / mu0 (tests/data/fields/README.md).
pub const MAGNETISATION: f64 = 0.02 * 57_000e-9 / (4e-7 * std::f64::consts::PI);

/// Density contrast of the reference prism, kg/m3 (tests/data/fields/README.md).
pub const DENSITY: f64 = 300.0;

/// A right rectangular prism by its faces, metres.
#[derive(Clone, Copy)]
pub struct Prism {
    pub x: [f64; 2],
    pub y: [f64; 2],
    pub z: [f64; 2],
}

/// The reference prism (tests/data/fields/README.md).
pub const PRISM: Prism = Prism { x: [13e3, 18e3], y: [14e3, 19e3], z: [800.0, 3000.0] };

/// ln(r + a) without cancellation for negative a; `rest` is r^2 - a^2.
fn logarithm(r: f64, a: f64, rest: f64) -> f64 {
    if a >= 0.0 { (r + a).ln() } else { rest.ln() - (r - a).ln() }
}

impl Prism {
    /// The sum over the eight corners, with alternating signs, of a term in corner minus observer.
    fn sum(&self, at: [f64; 3], term: impl Fn(f64, f64, f64, f64) -> f64) -> f64 {
        let mut sum = 0.0;
        for (i, x) in self.x.iter().enumerate() {
            for (j, y) in self.y.iter().enumerate() {
                for (k, z) in self.z.iter().enumerate() {
                    let (x, y, z) = (x - at[0], y - at[1], z - at[2]);
                    let sign = if (i + j + k) % 2 == 1 { 1.0 } else { -1.0 };
                    sum += sign * term(x, y, z, (x * x + y * y + z * z).sqrt());
                }
            }
        }
        sum
    }

    /// The gradient (east, north, down) of the integral of 1 / r over the body, m. Source: Nagy (1966), Geophysics 31,
    /// 362-371; Plouff (1976), Geophysics 41, 727-741; Blakely (1995), chapter 9.
    pub fn pull(&self, at: [f64; 3]) -> [f64; 3] {
        let part = |a: f64, b: f64, c: f64, r: f64| {
            b * logarithm(r, c, a * a + b * b) + c * logarithm(r, b, a * a + c * c) - a * (b * c / (a * r)).atan()
        };
        [
            -self.sum(at, part),
            -self.sum(at, |x, y, z, r| part(y, z, x, r)),
            -self.sum(at, |x, y, z, r| part(z, x, y, r)),
        ]
    }

    /// The second derivatives xx, xy, xz, yy, yz, zz of the same integral. Source: Plouff (1976); Blakely (1995), chapter 9.
    pub fn hessian(&self, at: [f64; 3]) -> [f64; 6] {
        [
            -self.sum(at, |x, y, z, r| (y * z / (x * r)).atan()),
            self.sum(at, |x, y, z, r| logarithm(r, z, x * x + y * y)),
            self.sum(at, |x, y, z, r| logarithm(r, y, x * x + z * z)),
            -self.sum(at, |x, y, z, r| (x * z / (y * r)).atan()),
            self.sum(at, |x, y, z, r| logarithm(r, x, y * y + z * z)),
            -self.sum(at, |x, y, z, r| (x * y / (z * r)).atan()),
        ]
    }

    /// The third derivatives xxz, xyz, xzz, yyz, yzz of the same integral, from the second ones by d/dx ln(r + y) =
    /// x / (r (r + y)) and d/dy ln(r + y) = 1 / r.
    pub fn third(&self, at: [f64; 3]) -> [f64; 5] {
        let inverse = |r: f64, a: f64| (r - a) / (r * r - a * a);
        [
            -self.sum(at, |x, y, _, r| x / r * inverse(r, y)),
            -self.sum(at, |_, _, _, r| 1.0 / r),
            -self.sum(at, |_, y, z, r| z / r * inverse(r, y)),
            -self.sum(at, |x, y, _, r| y / r * inverse(r, x)),
            -self.sum(at, |x, _, z, r| z / r * inverse(r, x)),
        ]
    }

    /// Vertical gravity, mGal.
    pub fn gravity(&self, at: [f64; 3]) -> f64 {
        GRAVITY * DENSITY * self.pull(at)[2]
    }

    /// The total-field anomaly, nT, along `field` of a body magnetised along `magnetisation` with [`MAGNETISATION`].
    /// Source: Plouff (1976); Blakely (1995), chapter 9.
    pub fn anomaly(&self, at: [f64; 3], field: [f64; 3], magnetisation: [f64; 3]) -> f64 {
        let [xx, xy, xz, yy, yz, zz] = self.hessian(at);
        let [a, b, c] = magnetisation;
        let stray = [xx * a + xy * b + xz * c, xy * a + yy * b + yz * c, xz * a + yz * b + zz * c];
        MAGNETIC * MAGNETISATION * stray.iter().zip(field).map(|(part, along)| part * along).sum::<f64>()
    }

    /// The scalar magnetic potential, nT m: - mu0 / 4 pi M . grad of the integral of 1 / r (Blakely 1995, chapter 5).
    pub fn potential(&self, at: [f64; 3], magnetisation: [f64; 3]) -> f64 {
        let along: f64 = self.pull(at).iter().zip(magnetisation).map(|(part, along)| part * along).sum();
        -MAGNETIC * MAGNETISATION * along
    }
}

/// Direction cosines (east, north, down) of an inclination and a declination in degrees.
pub fn cosines(inclination: f64, declination: f64) -> [f64; 3] {
    let (dip, bearing) = (f64::to_radians(inclination), f64::to_radians(declination));
    [dip.cos() * bearing.sin(), dip.cos() * bearing.cos(), dip.sin()]
}

/// The frame of the reference files: 128 x 128 cells of 250 m.
pub fn frame() -> Frame {
    Frame::local(250.0, 128, 128).unwrap()
}

/// A layer on a frame, from a function of the place (east, north, down), `height` metres up.
pub fn layer(frame: &Frame, height: f64, of: impl Fn([f64; 3]) -> f64) -> Grid {
    let values = Array2::from_shape_fn(frame.shape(), |(row, col)| {
        let (x, y) = frame.position(row as f64, col as f64);
        of([x, y, -height])
    });
    Grid::new(frame.clone(), values).unwrap()
}

/// One of the reference files.
pub fn file(name: &str) -> Grid {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(format!("tests/data/fields/A_single_{name}.asc"));
    let text = std::fs::read_to_string(path).unwrap();
    let numbers: Vec<f64> =
        text.lines().skip(6).flat_map(str::split_whitespace).map(|word| word.parse().unwrap()).collect();
    Grid::new(frame(), Array2::from_shape_vec((128, 128), numbers).unwrap()).unwrap()
}

/// Root mean square difference over the interior (a tenth of the width from the edge) over the range of the exact answer.
pub fn error(found: &Array2<f64>, exact: &Array2<f64>) -> f64 {
    misfit(found, exact, false)
}

/// The same after the mean difference is taken out: for products whose level is not defined.
pub fn error_but_for_level(found: &Array2<f64>, exact: &Array2<f64>) -> f64 {
    misfit(found, exact, true)
}

fn misfit(found: &Array2<f64>, exact: &Array2<f64>, levelled: bool) -> f64 {
    let (rows, cols) = exact.dim();
    let (down, across) = (rows / 10, cols / 10);
    let inner = ndarray::s![down..rows - down, across..cols - across];
    let (low, high) = exact.iter().fold((f64::MAX, f64::MIN), |(low, high), &value| (low.min(value), high.max(value)));
    let difference = &found.slice(inner) - &exact.slice(inner);
    let mean = if levelled { difference.mean().unwrap() } else { 0.0 };
    difference.mapv(|value| (value - mean).powi(2)).mean().unwrap().sqrt() / (high - low)
}

/// White Gaussian noise of standard deviation 1: splitmix64 (Steele, Lea & Flood 2014) and Box & Muller (1958).
pub fn noise(shape: (usize, usize), seed: u64) -> Array2<f64> {
    let mut state = seed;
    let mut uniform = move || {
        state = state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = state;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((mixed ^ (mixed >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
    };
    Array2::from_shape_simple_fn(shape, || {
        (-2.0 * (1.0 - uniform()).ln()).sqrt() * (std::f64::consts::TAU * uniform()).cos()
    })
}
