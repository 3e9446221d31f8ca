//! Potential-field transforms: gaps and padding, the spectrum, derivatives, continuation, filters by wavelength, magnetic
//! reductions, edge strengths, fabric and regional.
//!
//! [`PreparedField`] does the costly part once; each product is then one inverse transform. [`derive()`] makes one product of
//! one layer from a [`Transform`], which is all that a command needs.

mod catalogue;
mod chance;
mod check;
mod dense;
mod direction;
mod downward;
mod edge_noise;
mod gaps;
mod given;
mod gradient;
mod gradient_noise;
mod membrane;
mod noise;
mod padding;
mod plane;
mod plate;
mod pole;
mod polynomial;
mod prepare;
mod reference_field;
mod regional;
mod resolving;
mod second;
mod sources;
mod spectrum;
mod structure;
mod surroundings;
mod transform;
mod wavelength;

pub use catalogue::{Listed, Parameter};
pub use direction::{Direction, MagneticDirections};
pub use downward::Regularisation;
pub use edge_noise::EdgeNoise;
pub use gaps::fill_gaps;
pub use gradient::Gradient;
pub use gradient_noise::GradientNoise;
pub use noise::{NoiseEstimate, estimate_noise};
pub use pole::LEAST_EXACT_INCLINATION;
pub use prepare::{
    LEAST_SIDE, PreparedField, horizontal_gradient_magnitude, tilt_derivative, upward_continuation, vertical_derivative,
};
pub use reference_field::{ReferenceField, reference_field};
pub use regional::{Regional, regional};
pub use resolving::GradientPower;
pub use second::SecondDerivatives;
pub use structure::Fabric;
pub use transform::{Toward, Transform, derive};
