//! Gaussian noise that is the same for the same seed.

use ndarray::Array2;

/// White Gaussian noise of unit variance, the same for the same seed: SplitMix64 (Steele, Lea & Flood 2014) under the
/// transform of Box & Muller (1958).
pub(crate) fn gaussian(shape: (usize, usize), seed: u64) -> Array2<f64> {
    // Not a multiple of the step below, which would give each seed the sequence of another, shifted.
    let mut state = (seed + 1).wrapping_mul(0xD134_2543_DE82_EF95).rotate_left(29);
    let mut uniform = || {
        state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut mixed = state;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((mixed ^ (mixed >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
    };
    Array2::from_shape_simple_fn(shape, || {
        let radius = (-2.0 * (1.0 - uniform()).ln()).sqrt();
        radius * (std::f64::consts::TAU * uniform()).cos()
    })
}
