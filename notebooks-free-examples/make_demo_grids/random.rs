//! Random numbers and smooth random fields, all from the one seed.

use crate::canvas::Canvas;
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

/// The generator behind every draw.
pub type Dice = Xoshiro256PlusPlus;

/// What a stream of random numbers is for. Each purpose has its own, so that one can change and leave the rest alone.
#[derive(Debug, Clone, Copy)]
pub enum Purpose {
    /// Noise on the gravity grid.
    GravityNoise = 1,
    /// Noise on the magnetic grid.
    MagneticNoise,
    /// Background resistivity.
    Background,
    /// Thickness of the cover.
    Cover,
    /// Conductors planted along margins.
    Planted,
    /// Conductors planted anywhere.
    Decoys,
    /// Ragged edge and holes of the resistivity model.
    Footprint,
    /// Known deposits.
    Deposits,
    /// Widths of the planted conductors at each depth.
    PodWidths,
    /// Bodies, and which of their margins have conductors.
    Bodies,
}

/// A fresh stream for a purpose.
pub fn dice(seed: u64, purpose: Purpose) -> Dice {
    Dice::seed_from_u64(seed.wrapping_mul(1000).wrapping_add(purpose as u64))
}

/// A uniform number between two bounds.
pub fn between(dice: &mut Dice, low: f64, high: f64) -> f64 {
    low + (high - low) * dice.r#gen::<f64>()
}

/// A standard normal number (Box & Muller 1958).
pub fn normal(dice: &mut Dice) -> f64 {
    let radius = (-2.0 * (1.0 - dice.r#gen::<f64>()).ln()).sqrt();
    radius * (std::f64::consts::TAU * dice.r#gen::<f64>()).cos()
}

/// White noise smoothed by a Gaussian of `sigma` metres and brought to mean 0 and standard deviation 1.
pub fn smooth_field(like: &Canvas, sigma: f64, dice: &mut Dice) -> Canvas {
    let mut field = like.map(|_| normal(dice)).smoothed(sigma);
    let count = field.values.len() as f64;
    let mean = field.values.sum() / count;
    let deviation = (field.values.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / count).sqrt();
    field.values.mapv_inplace(|value| (value - mean) / deviation);
    field
}
