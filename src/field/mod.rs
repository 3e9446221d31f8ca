//! Potential-field transforms: gaps and padding, the spectrum, derivatives, continuation, pole reduction, pseudo-gravity.
//!
//! [`PreparedField`] does the costly part once; each product is then one inverse transform.

mod gaps;
mod gradient;
mod padding;
mod plane;
mod pole;
mod prepare;
mod spectrum;

pub use gaps::fill_gaps;
pub use gradient::Gradient;
pub use pole::InducingField;
pub use prepare::{
    PreparedField, horizontal_gradient_magnitude, tilt_derivative, upward_continuation, vertical_derivative,
};
