//! The comparison written out from its definitions with plain loops, to check the engine against.

mod definitions;
mod layers;

pub use definitions::{naive_compare, pearson, sums_at};
pub use layers::{Case, SHAPE, case};
