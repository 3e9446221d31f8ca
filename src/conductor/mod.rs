//! Conductors and resistors: thresholds, bodies in a slice of log10 resistivity, their axes and outlines.

mod axis;
mod body;
mod label;
mod mixture;
mod outline;
mod quantity;
mod threshold;

pub use body::{Bodies, Body, find_bodies};
pub use outline::outlines;
pub use quantity::Quantity;
pub use threshold::{Side, Threshold};
