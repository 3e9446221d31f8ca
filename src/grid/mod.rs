//! Grids on a common frame, and how files come onto it.

mod attribute;
mod bend;
mod clip;
mod crs;
mod describe;
mod describe_layers;
mod distance;
mod files;
mod fill;
mod frame;
mod lines;
mod mask;
mod place;
mod plane;
mod raster;
mod reason;
mod rings;
mod source;
mod units;
mod vector;
mod volume;
mod warp;
mod write;

pub use attribute::AttributeFilter;
pub use crs::{carry, ground_scale, true_north};
pub use describe_layers::describe_layers;
pub use distance::distance_to_lines;
pub use files::files_of_vector;
pub use frame::{Crs, Frame};
pub use lines::read_lines;
pub use mask::Mask;
pub use place::{Placed, Resampler};
pub use plane::Plane;
pub use raster::Grid;

pub use source::{Extent, Raster, Source};
pub use units::{Units, read_units};
pub use vector::VectorSource;
pub use volume::Volume;
pub use write::write_raster;
